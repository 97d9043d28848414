"""Gridded files in any CF shape, and where land is."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
from altimeter_files import write_land, write_mean

from setdrift.data.ancillary import LandMask, land_mask, load_field, mean_dynamic_topography
from setdrift.data.configuration import Configuration
from setdrift.errors import SetdriftError

Fields = dict[str, tuple[tuple[str, ...], Any, dict[str, Any]]]
LATITUDE, LONGITUDE = np.arange(-4.0, 5.0, 2.0), np.arange(-30.0, -20.0, 2.5)


def write(path: Path, fields: Fields, latitude: Any = LATITUDE, longitude: Any = LONGITUDE) -> Path:
    with netCDF4.Dataset(path, "w") as file:
        for name, values, units in (("lat", latitude, "degrees_north"), ("lon", longitude, "degrees_east")):
            file.createDimension(name, len(values))
            file.createVariable(name, "f8", (name,)).units = units
            file[name][:] = values
        file.createDimension("time", 1)
        file.createDimension("depth", 2)
        for name, (dimensions, values, attributes) in fields.items():
            fill = attributes.pop("_FillValue", None)
            variable = file.createVariable(name, np.ma.asarray(values).dtype, dimensions, fill_value=fill)
            variable.set_auto_scale(False)
            variable.setncatts(attributes)
            variable[:] = np.ma.filled(values, fill)
    return path


def pattern(latitude: Any, longitude: Any) -> Any:
    return np.asarray(latitude)[:, None] + 0.01 * ((np.asarray(longitude) + 180.0) % 360.0 - 180.0)


@pytest.mark.parametrize("longitude", [LONGITUDE, LONGITUDE + 360.0, LONGITUDE[::-1]])
@pytest.mark.parametrize("latitude", [LATITUDE, LATITUDE[::-1]])
@pytest.mark.parametrize("form", ["plain", "time", "transposed", "centimetres", "packed"])
def test_all_shapes_give_the_same_field(tmp_path: Path, latitude: Any, longitude: Any, form: str) -> None:
    values = pattern(latitude, longitude)
    fields: Fields = {
        "plain": {"m": (("lat", "lon"), values, {"units": "m"})},
        "time": {"m": (("time", "lat", "lon"), values[None], {"units": "m"})},
        "transposed": {"m": (("lon", "lat"), values.T.copy(), {"units": "m"})},
        "centimetres": {"m": (("lat", "lon"), 100 * values, {"units": "cm"})},
        "packed": {
            "m": (
                ("lat", "lon"),
                np.rint((values - 1.0) / 0.001).astype(np.int16),
                {"units": "m", "scale_factor": 0.001, "add_offset": 1.0},
            )
        },
    }
    found = load_field(write(tmp_path / "a.nc", {form: fields[form]["m"]}, latitude, longitude), None, "mean", ())
    np.testing.assert_allclose(found.field, pattern(found.latitude, found.longitude), atol=6e-4)
    assert np.all(np.diff(found.latitude) > 0)
    assert np.all(np.diff(found.longitude) > 0)


def test_longitudes_that_jump_at_the_dateline(tmp_path: Path) -> None:
    longitude = np.array([170.0, 175.0, 180.0, -175.0, -170.0])
    values = np.arange(25.0).reshape(5, 5)
    path = write(tmp_path / "a.nc", {"m": (("lat", "lon"), values, {"units": "m"})}, longitude=longitude)
    found = load_field(path, None, "mean", ())
    np.testing.assert_array_equal(found.longitude, [170.0, 175.0, 180.0, 185.0, 190.0])
    np.testing.assert_array_equal(found.field, values)


def test_standard_name_chooses_and_missing_is_nan(tmp_path: Path) -> None:
    values = np.ma.masked_less(pattern(LATITUDE, LONGITUDE), -1.0)
    fields: Fields = {
        "other": (("lat", "lon"), values.filled(0.0), {"units": "m"}),
        "mean": (("lat", "lon"), values, {"units": "m", "standard_name": "chosen", "_FillValue": -9.0}),
    }
    path = write(tmp_path / "a.nc", fields)
    found = load_field(path, None, "mean", ("chosen",))
    np.testing.assert_array_equal(np.isnan(found.field), values.mask)
    assert not np.isnan(load_field(path, "other", "mean", ("chosen",)).field).any()


@pytest.mark.parametrize(
    ("fields", "given", "message"),
    [
        ({}, None, r"no field on latitude and longitude \(it holds lat, lon\)"),
        ({}, "mean", r"no variable mean for land \(it holds lat, lon\); correct land.variable"),
        ({"a": ("lat", "lon"), "b": ("lat", "lon")}, None, r"several fields \(a, b\); name the variable under land"),
        ({"a": ("depth", "lat", "lon")}, None, "varies along depth"),
        ({"a": ("depth", "lon")}, "a", "no one-dimensional latitude"),
    ],
)
def test_what_cannot_be_used_is_named(
    tmp_path: Path, fields: dict[str, tuple[str, ...]], given: str | None, message: str
) -> None:
    sizes = {"lat": LATITUDE.size, "lon": LONGITUDE.size, "depth": 2}
    made: Fields = {n: (d, np.zeros([sizes[k] for k in d]), {"units": "m"}) for n, d in fields.items()}
    with pytest.raises(SetdriftError, match=message):
        load_field(write(tmp_path / "a.nc", made), given, "land", ("land_binary_mask",))


def test_axis_that_wanders_is_refused(tmp_path: Path) -> None:
    field: Fields = {"a": (("lat", "lon"), np.zeros((3, 4)), {"units": "m"})}
    path = write(tmp_path / "a.nc", field, latitude=np.array([1.0, 3.0, 2.0]))
    with pytest.raises(SetdriftError, match="latitude has 3 values that neither rise nor fall"):
        load_field(path, None, "mean", ())


def test_land_is_the_nearest_cell() -> None:
    mask = LandMask(np.array([[True, False], [False, True]]), np.array([0.0, 1.0]), np.array([-30.0, -29.0]))
    longitude = np.array([-30.2, -29.6, -29.4, 330.0, 331.2, -30.6, -28.4, -30.0])
    latitude = np.array([0.2, -0.4, 0.4, 0.6, 1.4, 0.0, 1.0, -0.6])
    # the last three lie beyond the outermost cells: no land is known there
    expected = [True, True, False, False, True, False, False, False]
    np.testing.assert_array_equal(mask.is_land(longitude, latitude), expected)


def test_global_mask_has_no_seam() -> None:
    longitude = np.arange(0.5, 360.0, 1.0)
    land = np.zeros((180, 360), dtype=bool)
    land[:, longitude > 180.0] = True
    mask = LandMask(land, np.arange(-89.5, 90.0), longitude)
    where = np.array([-179.9, 179.9, -0.1, 0.1, 359.9, 360.1, 540.2, -360.3])
    expected = [True, False, True, False, True, False, True, True]
    np.testing.assert_array_equal(mask.is_land(where, np.full(8, 89.9)), expected)


@pytest.mark.parametrize(
    ("name", "units", "values", "expected"),
    [
        ("land_binary_mask", "1", [0, 1], [False, True]),
        ("land_area_fraction", "%", [49, 51], [False, True]),
        ("sea_area_fraction", "1", [0.4, 0.6], [True, False]),
        ("sea_binary_mask", None, [0, 1], [True, False]),
        ("land_area_fraction", "1", [0.2, np.nan], [False, False]),
        ("sea_area_fraction", "1", [0.2, np.nan], [True, True]),
    ],
)
def test_masks_of_land_and_of_sea(
    tmp_path: Path,
    configure: Callable[..., Configuration],
    name: str,
    units: str | None,
    values: list[float],
    expected: list[bool],
) -> None:
    attributes = {"standard_name": name} | ({"units": units} if units else {})
    field: Fields = {"mask": (("lat", "lon"), np.tile(np.array(values, float), (2, 1)), attributes)}
    write(tmp_path / "land.nc", field, latitude=[0.0, 1.0], longitude=[10.0, 11.0])
    np.testing.assert_array_equal(land_mask(configure()).land[0], expected)


def test_land_from_missing_mean(tmp_path: Path, configure: Callable[..., Configuration]) -> None:
    configuration = configure(land=None)
    write_mean(tmp_path / "mean.nc")
    np.testing.assert_allclose(np.nanmax(mean_dynamic_topography(configuration).field), 0.5)
    mask = land_mask(configuration)
    np.testing.assert_array_equal(mask.is_land(np.array([-35.0, -25.0]), np.array([5.0, 5.0])), [True, False])


def test_land_of_the_configured_file(tmp_path: Path, configure: Callable[..., Configuration]) -> None:
    write_land(tmp_path / "land.nc")
    mask = land_mask(configure())
    np.testing.assert_array_equal(mask.is_land(np.array([-29.7, -29.2]), np.array([9.0, 9.0])), [True, False])
