"""Truth: what the ocean really does, on grids and in tables, to compare results with."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
from netCDF4 import Dataset

from synthetic_tracks.earth import Array
from synthetic_tracks.eddies import Eddies
from synthetic_tracks.files import add_variable, new_dataset
from synthetic_tracks.ocean import Ocean
from synthetic_tracks.scenario import Box, Scenario, day_number

_HEIGHT, _GRID = "sea_surface_height_above", ("latitude", "longitude")
_CURRENT = "surface_geostrophic_{}_sea_water_velocity"
_ANOMALY = _CURRENT + "_assuming_mean_sea_level_for_geoid"
FIELDS = {
    "sea_level_anomaly": ("m", f"{_HEIGHT}_mean_sea_level"),
    "dynamic_topography": ("m", f"{_HEIGHT}_geoid"),
    "eastward_velocity": ("m s-1", _CURRENT.format("eastward")),
    "northward_velocity": ("m s-1", _CURRENT.format("northward")),
    "eastward_velocity_anomaly": ("m s-1", _ANOMALY.format("eastward")),
    "northward_velocity_anomaly": ("m s-1", _ANOMALY.format("northward")),
}
_NOON = 0.5
_TOPOGRAPHY_SPACING, _LAND_SPACING = 1 / 6, 1 / 12
_SMALLEST_EDDY = 0.01


def write_truth(path: Path, scenario: Scenario, ocean: Ocean) -> None:
    """Write the daily fields at 12:00 UTC of the analysed period.

    Parameters
    ----------
    path : Path
        The file.
    scenario : Scenario
        Gives the days and the grid.
    ocean : Ocean
        The moving ocean.
    """
    lon, lat = axes(scenario.truth_box, scenario.truth["spacing"])
    with new_dataset(path, "True sea level and currents of the Tarn Sea") as dataset:
        _add_axes(dataset, lon, lat)
        _add_days(dataset, "time", scenario.analysed_days)
        for name, (units, standard_name) in FIELDS.items():
            variable = dataset.createVariable(
                name, "f4", ("time", *_GRID), zlib=True, complevel=4, fill_value=np.float32(np.nan)
            )
            variable.setncatts({"units": units, "standard_name": standard_name, "cell_methods": "time: point"})
        for index, day in enumerate(scenario.analysed_days):
            for name, values in fields_at_noon(ocean, lon, lat, day).items():
                dataset[name][index] = values


def fields_at_noon(ocean: Ocean, lon: Array, lat: Array, day: date) -> dict[str, Array]:
    """Evaluate the true fields at 12:00 UTC of a day: name to (latitude, longitude) array, NaN on land."""
    x, y = (axis.ravel() for axis in np.meshgrid(lon, lat))
    time = np.full(x.size, day_number(day) + _NOON)
    level = ocean.sea_level_anomaly(x, y, time)
    u, v = ocean.velocity_anomaly(x, y, time)
    mean_u, mean_v = ocean.mean_velocity(x, y)
    values = (level, level + ocean.mean_dynamic_topography(x, y), u + mean_u, v + mean_v, u, v)
    sea = ~ocean.land.is_land(x, y)
    shape = (lat.size, lon.size)
    return {name: np.where(sea, v, np.nan).reshape(shape) for name, v in zip(FIELDS, values, strict=True)}


def write_eddies(path: Path, scenario: Scenario, ocean: Ocean) -> None:
    """Write the true eddies at 12:00 UTC of each analysed day that are inside the truth's box and a centimetre high."""
    tables = [eddies_at_noon(ocean.eddies, scenario.truth_box, day) for day in scenario.analysed_days]
    columns = {name: np.concatenate([table[name] for table in tables]) for name in tables[0]}
    described = {
        "time": _days_attributes(),
        "eddy": {"long_name": "identifier of the eddy", "units": "1"},
        "longitude": {"standard_name": "longitude", "units": "degrees_east"},
        "latitude": {"standard_name": "latitude", "units": "degrees_north"},
        "amplitude": {"long_name": "height of the centre, negative for a hollow", "units": "m"},
        "radius": {"long_name": "radius of fastest rotation, L in exp(-r^2 / 2 L^2)", "units": "m"},
    }
    with new_dataset(path, "True eddies of the Tarn Sea") as dataset:
        dataset.createDimension("eddy_observation", columns["time"].size)
        for name, attributes in described.items():
            add_variable(dataset, name, ("eddy_observation",), columns[name], **attributes)


def eddies_at_noon(eddies: Eddies, box: Box, day: date) -> dict[str, Any]:
    """Tabulate the eddies at 12:00 UTC of a day: one array per column."""
    time = day_number(day) + _NOON
    lon, lat = eddies.centre(time)
    height = eddies.height(time)
    inside = (lon >= box.west) & (lon <= box.east) & (lat >= box.south) & (lat <= box.north)
    which = np.flatnonzero(inside & (np.abs(height) >= _SMALLEST_EDDY))
    return {
        "time": np.full(which.size, time),
        "eddy": which.astype(np.int32),
        "longitude": lon[which],
        "latitude": lat[which],
        "amplitude": height[which],
        "radius": eddies.radius[which],
    }


def write_topography(path: Path, scenario: Scenario, ocean: Ocean) -> None:
    """Write the mean dynamic topography over the whole domain; no CF standard name exists for it."""
    lon, lat = axes(scenario.domain, _TOPOGRAPHY_SPACING)
    x, y = np.meshgrid(lon, lat)
    height = np.where(ocean.land.is_land(x, y), np.nan, ocean.mean_dynamic_topography(x, y))
    with new_dataset(path, "Mean dynamic topography of the Tarn Sea") as dataset:
        _add_axes(dataset, lon, lat)
        add_variable(
            dataset, "mean_dynamic_topography", _GRID, height.astype(np.float32), fill=np.float32(np.nan),
            units="m", long_name="mean dynamic topography: mean sea surface above the geoid",
        )  # fmt: skip


def write_land(path: Path, scenario: Scenario, ocean: Ocean) -> None:
    """Write the land mask over the whole domain."""
    lon, lat = axes(scenario.domain, _LAND_SPACING)
    land = ocean.land.is_land(*np.meshgrid(lon, lat)).astype(np.int8)
    with new_dataset(path, "Land of the Tarn Sea") as dataset:
        _add_axes(dataset, lon, lat)
        add_variable(
            dataset, "land", _GRID, land, standard_name="land_binary_mask", units="1",
            long_name="1 on land, 0 at sea", flag_values=np.array([0, 1], np.int8), flag_meanings="sea land",
        )  # fmt: skip


def write_errors(path: Path, scenario: Scenario) -> None:
    """Write the true size of each altimeter's errors."""
    altimeters = scenario.altimeters
    names = np.array([a.name for a in altimeters], dtype=object)
    described = {
        "bias": ("constant added to every sea level anomaly", [a.bias_m for a in altimeters]),
        "noise": ("standard deviation of the white noise", [a.noise_m for a in altimeters]),
        "long_wave": ("standard deviation of the long-wave error", [a.long_wave_m for a in altimeters]),
    }
    with new_dataset(path, "True errors of the invented altimeters") as dataset:
        dataset.createDimension("altimeter", names.size)
        dataset.createVariable("altimeter", str, ("altimeter",))[:] = names
        for name, (text, values) in described.items():
            add_variable(dataset, name, ("altimeter",), np.array(values), long_name=text, units="m")


def axes(box: Box, spacing: float) -> tuple[Array, Array]:
    """Longitudes and latitudes of the nodes of a grid, edges of the box included."""
    columns = round((box.east - box.west) / spacing) + 1
    rows = round((box.north - box.south) / spacing) + 1
    return np.linspace(box.west, box.east, columns), np.linspace(box.south, box.north, rows)


def _add_axes(dataset: Dataset, lon: Array, lat: Array) -> None:
    dataset.createDimension("latitude", lat.size)
    dataset.createDimension("longitude", lon.size)
    add_variable(dataset, "latitude", ("latitude",), lat, standard_name="latitude", units="degrees_north", axis="Y")
    add_variable(dataset, "longitude", ("longitude",), lon, standard_name="longitude", units="degrees_east", axis="X")


def _add_days(dataset: Dataset, name: str, days: list[date]) -> None:
    dataset.createDimension(name, len(days))
    noons = np.array([day_number(day) + _NOON for day in days])
    add_variable(dataset, name, (name,), noons, axis="T", **_days_attributes())


def _days_attributes() -> dict[str, str]:
    return {
        "standard_name": "time",
        "units": "days since 2000-01-01 00:00:00",
        "calendar": "standard",
        "units_metadata": "leap_seconds: none",
    }
