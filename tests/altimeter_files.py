"""Small along-track and gridded files for tests, in several dialects."""

from __future__ import annotations

import datetime as dt
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np

from setdrift.data.configuration import Altimeter

MARCH_FIRST = 1930089600.0  # 2031-03-01T00:00:00Z in seconds since 1970

PLAIN = Altimeter(files="*.nc")
PACKED = Altimeter(files="*.nc", good={"variable": "quality", "values": [0, 3]})
BARE = Altimeter(
    files="*.nc",
    variables={"time": "when", "latitude": "north", "longitude": "east", "sea_level_anomaly": "height"},
    subtract=["tide"],
    add=["bias"],
    good={"variable": "bits", "mask": 5, "equals": 0},
)


def seconds(day: dt.date) -> float:
    """Seconds from 1970 to the start of a day."""
    return (day - dt.date(1970, 1, 1)).days * 86400.0


def write(path: Path, columns: dict[str, tuple[Any, dict[str, Any]]], dimension: str = "sample") -> Path:
    """Write series of one length; a `_FillValue` among the attributes masks what is masked."""
    path.parent.mkdir(parents=True, exist_ok=True)
    with netCDF4.Dataset(path, "w") as file:
        for name, (values, attributes) in columns.items():
            if dimension not in file.dimensions:
                file.createDimension(dimension, len(values) or None)
            kind = np.ma.asarray(values).dtype
            variable = file.createVariable(name, kind, (dimension,), fill_value=attributes.get("_FillValue"))
            variable.set_auto_scale(False)
            variable.setncatts({k: v for k, v in attributes.items() if k != "_FillValue"})
            variable[:] = np.ma.filled(values, attributes.get("_FillValue"))
    return path


def plain_columns(count: int = 40, start: float = MARCH_FIRST + 3600.0) -> dict[str, tuple[Any, dict[str, Any]]]:
    """A northward pass in metres with CF standard names, one point a second."""
    step = np.arange(count, dtype=float)
    return {
        "clock": (start + step, {"standard_name": "time", "units": "seconds since 1970-01-01"}),
        "y": (8.0 + 0.05 * step, {"standard_name": "latitude", "units": "degrees_north"}),
        "x": (-28.0 - 0.02 * step, {"standard_name": "longitude", "units": "degrees_east"}),
        "level": (
            0.1 * np.sin(step / 9.0),
            {"standard_name": "sea_surface_height_above_mean_sea_level", "units": "m"},
        ),
    }


def write_plain(path: Path, count: int = 40, start: float = MARCH_FIRST + 3600.0, **replaced: Any) -> Path:
    """Write a pass of the plain dialect, the values of some columns replaced."""
    columns = plain_columns(count, start)
    for name, values in replaced.items():
        columns[name] = (np.asarray(values), columns[name][1])
    return write(path, columns)


def write_land(path: Path, west_of: float = -29.5) -> Path:
    """Write a land mask: land west of a meridian."""
    path.parent.mkdir(parents=True, exist_ok=True)
    with netCDF4.Dataset(path, "w") as file:
        _axes(file, np.arange(0.0, 20.0, 0.25), np.arange(-40.0, -18.0, 0.25))
        land = file.createVariable("land", "i1", ("latitude", "longitude"))
        land.setncatts({"standard_name": "land_binary_mask", "units": "1"})
        land[:] = np.broadcast_to(file["longitude"][:] < west_of, land.shape)
    return path


def write_mean(path: Path) -> Path:
    """Write a mean dynamic topography that is missing on its western half."""
    path.parent.mkdir(parents=True, exist_ok=True)
    with netCDF4.Dataset(path, "w") as file:
        _axes(file, np.arange(0.0, 20.0, 0.5), np.arange(-40.0, -18.0, 0.5))
        mean = file.createVariable("mean", "f4", ("latitude", "longitude"), fill_value=np.float32(-999))
        mean.units = "cm"
        values = np.full(mean.shape, 50.0)
        mean[:] = np.ma.masked_where(np.broadcast_to(file["longitude"][:] < -29.0, mean.shape), values)
    return path


def _axes(file: netCDF4.Dataset, latitude: Any, longitude: Any) -> None:
    for name, values, units in (("latitude", latitude, "degrees_north"), ("longitude", longitude, "degrees_east")):
        file.createDimension(name, len(values))
        axis = file.createVariable(name, "f8", (name,))
        axis.setncatts({"standard_name": name, "units": units})
        axis[:] = values
