"""Depth of the sea: read whichever way it counts, and which positions are shallow."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest

from setdrift.data.bathymetry import DEPTH_NAMES, HEIGHT_NAMES, sea_floor
from setdrift.data.configuration import Configuration
from setdrift.errors import SetdriftError

Configure = Callable[..., Configuration]
LATITUDE, LONGITUDE = np.arange(8.0, 12.0), np.arange(-31.0, -25.0)
DEPTH = np.tile([-20.0, 30.0, 99.0, 101.0, 3000.0, np.nan], (4, 1))


def write_depth(path: Path, values: Any, **attributes: str) -> Path:
    with netCDF4.Dataset(path, "w") as file:
        for name, axis, units in (("y", LATITUDE, "degrees_north"), ("x", LONGITUDE, "degrees_east")):
            file.createDimension(name, axis.size)
            file.createVariable(name, "f8", (name,)).units = units
            file[name][:] = axis
        floor = file.createVariable("floor", "f8", ("y", "x"), fill_value=-9999.0)
        floor.setncatts({"units": "m"} | attributes)
        floor[:] = np.ma.masked_invalid(values)
    return path


@pytest.mark.parametrize(
    ("sign", "attributes"),
    [
        *((1.0, {"standard_name": name}) for name in DEPTH_NAMES),
        *((-1.0, {"standard_name": name}) for name in HEIGHT_NAMES),
        (1.0, {"positive": "down"}),
        (-1.0, {"positive": "Up", "long_name": "relief"}),
        (1.0, {"standard_name": DEPTH_NAMES[0], "positive": "down"}),
        (1e-3, {"positive": "down", "units": "km"}),
    ],
    ids=str,
)
def test_depths_and_heights_give_the_same_floor(
    tmp_path: Path, configure: Configure, sign: float, attributes: dict[str, str]
) -> None:
    write_depth(tmp_path / "depth.nc", sign * DEPTH, **attributes)
    floor = sea_floor(configure(depth={"file": "depth.nc"}))
    assert floor is not None
    np.testing.assert_allclose(floor.depth, DEPTH)
    # western cells are shallow; a missing depth, and places off the grid, are not known to be
    longitude = np.array([-31.0, 330.1, -28.6, -28.4, 333.0, -26.2, -20.0, -31.0])
    latitude = np.array([8.0, 9.0, 10.0, 11.0, 8.5, 9.0, 9.0, 13.0])
    expected = [True, True, True, False, False, False, False, False]
    assert floor.is_shallow(longitude, latitude, 100.0).tolist() == expected


def test_none_is_configured(configure: Configure) -> None:
    assert sea_floor(configure()) is None


@pytest.mark.parametrize(
    ("attributes", "message"),
    [
        ({}, "depths or heights"),
        ({"positive": "sideways"}, "depths or heights"),
        ({"standard_name": DEPTH_NAMES[0], "positive": "up"}, "counts down, but positive = up"),
        ({"positive": "down", "units": "kg"}, "units 'kg'"),
    ],
    ids=str,
)
def test_what_cannot_be_told_is_refused(
    tmp_path: Path, configure: Configure, attributes: dict[str, str], message: str
) -> None:
    write_depth(tmp_path / "depth.nc", DEPTH, **attributes)
    with pytest.raises(SetdriftError, match=message):
        sea_floor(configure(depth={"file": "depth.nc", "variable": "floor"}))
