"""A few days of a small invented sea, seen by two altimeters that write different dialects."""

from __future__ import annotations

import datetime as dt
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
from altimeter_files import seconds, write

FIRST = dt.date(2031, 3, 4)
"""First analysed day. With blocks of four days, a block ends on the day after it."""
WINDOW = 2
DAYS = 4
KM_PER_DEGREE = 111.2
SOUTH, NORTH, WEST, EAST = 18.0, 37.0, -37.0, -16.0
"""Where the altimeters look: the box and more than its margin."""

CONFIGURATION: dict[str, Any] = {
    "analysis": "inlet",
    "output": "../results",
    "period": {"start": "2031-03-04", "end": "2031-03-07"},
    "grid": {"west": -31, "east": -22, "south": 23, "north": 32, "spacing": 0.5},
    "altimeters": {
        "heron": {"files": "../heron/*.nc", "noise_m": 0.01},
        "curlew": {
            "files": "../curlew/*.nc",
            "variables": {"time": "when", "latitude": "north", "longitude": "east", "sea_level_anomaly": "height"},
            "subtract": ["tide"],
            "good": {"variable": "bits", "mask": 5, "equals": 0},
            "noise_m": 0.02,
        },
    },
    "mean_dynamic_topography": {"file": "../mean.nc"},
    "land": {"file": "../land.nc"},
    "mapping": {
        "window_days": WINDOW,
        "signal_m": 0.15,
        "large_scale_m": 0,
        "zonal_scale_km": 220,
        "meridional_scale_km": 220,
        "zonal_drift_km_per_day": 0,
    },
    "block_days": 4,
}


def day_of_period(number: int) -> dt.date:
    """The analysed day of this number, counted from 0; days before the period are negative."""
    return FIRST + dt.timedelta(days=number)


def sea_level(longitude: Any, latitude: Any, day: dt.date) -> Any:
    """A high and a low that drift west, m."""
    moved = -6.0 * (day - FIRST).days
    total = np.zeros(np.shape(longitude))
    for east, north, height in ((-28.0, 28.5, 0.25), (-25.0, 26.0, -0.2)):
        x = (longitude - east) * KM_PER_DEGREE * np.cos(np.deg2rad(north)) - moved
        y = (latitude - north) * KM_PER_DEGREE
        total += height * np.exp(-(x**2 + y**2) / (2.0 * 90.0**2))
    return total


def passes(day: dt.date, offset: float) -> tuple[Any, Any, Any]:
    """Times (s since 1970), longitudes and latitudes of a day's passes, a degree apart."""
    north = np.linspace(SOUTH, NORTH, 120)
    tracks = np.arange(WEST + offset + 0.5 * (day.toordinal() % 2), EAST, 1.0)
    clock = seconds(day) + 600.0 + 3600.0 * np.arange(tracks.size)[:, np.newaxis] + 2.5 * np.arange(north.size)
    east = tracks[:, np.newaxis] + 0.1 * (north - SOUTH)
    return clock.ravel(), east.ravel(), np.tile(north, tracks.size)


def write_heron(folder: Path, day: dt.date) -> Path:
    """CF standard names, metres."""
    clock, east, north = passes(day, 0.0)
    return write(
        folder / "heron" / f"{day}.nc",
        {
            "clock": (clock, {"standard_name": "time", "units": "seconds since 1970-01-01"}),
            "y": (north, {"standard_name": "latitude", "units": "degrees_north"}),
            "x": (east, {"standard_name": "longitude", "units": "degrees_east"}),
            "level": (
                sea_level(east, north, day),
                {"standard_name": "sea_surface_height_above_mean_sea_level", "units": "m"},
            ),
        },
    )


def write_curlew(folder: Path, day: dt.date) -> Path:
    """No standard names, centimetres, 0 to 360 degrees, the tide still in; every 50th point is flagged and wrong."""
    clock, east, north = passes(day, 0.3)
    tide = 20.0 * np.sin(clock / 7000.0)
    bad = np.arange(clock.size) % 50 == 7
    height = 100.0 * sea_level(east, north, day) + tide + np.where(bad, 90.0, 0.0)
    return write(
        folder / "curlew" / f"{day}.nc",
        {
            "when": (clock - seconds(dt.date(2000, 1, 1)), {"units": "seconds since 2000-01-01"}),
            "north": (north, {"units": "degrees_north"}),
            "east": (east % 360.0, {"units": "degrees_east"}),
            "height": (height, {"units": "cm"}),
            "tide": (tide, {"units": "cm"}),
            "bits": (np.where(bad, 4, 2).astype(np.int16), {}),
        },
    )


def write_mean(path: Path, slope: float = 0.02) -> Path:
    """A mean dynamic topography that rises northward, m a degree."""
    return _write_grid(path, "mean", lambda _, latitude: slope * latitude, {"units": "m"})


def write_land(path: Path, west_of: float = -30.6) -> Path:
    """A land mask: land west of a meridian."""
    attributes = {"standard_name": "land_binary_mask", "units": "1"}
    return _write_grid(path, "land", lambda longitude, _: 1.0 * (longitude < west_of), attributes)


def _write_grid(path: Path, name: str, field: Any, attributes: dict[str, str]) -> Path:
    latitude, longitude = np.arange(12.0, 44.0, 0.5), np.arange(-44.0, -10.0, 0.5)
    with netCDF4.Dataset(path, "w") as file:
        for axis, values, units in (
            ("latitude", latitude, "degrees_north"),
            ("longitude", longitude, "degrees_east"),
        ):
            file.createDimension(axis, len(values))
            coordinate = file.createVariable(axis, "f8", (axis,))
            coordinate.setncatts({"standard_name": axis, "units": units})
            coordinate[:] = values
        variable = file.createVariable(name, "f8", ("latitude", "longitude"))
        variable.setncatts(attributes)
        variable[:] = field(*np.meshgrid(longitude, latitude))
    return path


def write_inputs(folder: Path) -> None:
    """Write all that the analysis needs, and the files of one more day."""
    for number in range(-WINDOW, DAYS + WINDOW + 1):
        write_heron(folder, day_of_period(number))
        write_curlew(folder, day_of_period(number))
    write_mean(folder / "mean.nc")
    write_land(folder / "land.nc")
