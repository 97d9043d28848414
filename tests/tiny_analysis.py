"""A few days of a small invented sea whose truth is a formula, and the whole chain run on them."""

from __future__ import annotations

import copy
import datetime as dt
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
from altimeter_files import seconds, write_plain

from setdrift.data.configuration import Configuration
from setdrift.data.day_store import DayStore
from setdrift.operations.inventory import take_inventory
from setdrift.stages.currents import currents_block
from setdrift.stages.dynamic_topography import add_mean_block
from setdrift.stages.eddies import eddies_block
from setdrift.stages.fixed_fields import prepare_fixed_fields
from setdrift.stages.mapping import map_block
from setdrift.stages.observations import gather_observations
from setdrift.stages.publish import publish_daily, publish_eddies
from setdrift.stages.trajectories import link_trajectories

Configure = Callable[..., Configuration]
FIRST = dt.date(2031, 3, 1)
NOW = dt.datetime(2031, 3, 21, 6, 0, tzinfo=dt.UTC)
STAGES = ("observations", "maps", "dynamic_topography", "currents", "eddies", "trajectories")
KM_PER_DEGREE = 111.2
GROUND_SPEED = 6.7  # km s-1

BOX: dict[str, Any] = {
    "grid": {"west": -32, "east": -24, "south": 24, "north": 31, "spacing": 0.5},
    "land": None,
    "mapping": {
        "window_days": 2,
        "signal_m": 0.15,
        "large_scale_m": 0,
        "zonal_scale_km": 200,
        "meridional_scale_km": 200,
        "long_wave_m": 0.001,
        "bias_m": 0.001,
        "zonal_drift_km_per_day": 0,
    },
    "altimeters": {"heron": {"files": "heron/*.nc", "noise_m": 0.005}},
    "block_days": 2,
}


@dataclass(frozen=True)
class Vortex:
    """A round hump or hollow that drifts west."""

    longitude: float
    latitude: float
    height: float = 0.25
    radius_km: float = 90.0
    drift_km_per_day: float = -6.0

    def centre(self, day: dt.date) -> float:
        """Longitude at 12:00 UTC of a day."""
        turn = self.drift_km_per_day / KM_PER_DEGREE / np.cos(np.deg2rad(self.latitude))
        return float(self.longitude + turn * (day - FIRST).days)

    def sea_level(self, longitude: Any, latitude: Any, day: dt.date) -> Any:
        """Sea level at places on a day, m."""
        east = (longitude - self.centre(day) + 180.0) % 360.0 - 180.0
        x = east * KM_PER_DEGREE * np.cos(np.deg2rad(self.latitude))
        y = (latitude - self.latitude) * KM_PER_DEGREE
        return self.height * np.exp(-(x**2 + y**2) / (2.0 * self.radius_km**2))


AREA = (-38.0, 20.0, 20.0, 35.0)
HIGH, LOW = Vortex(-29.6, 28.4), Vortex(-26.2, 26.6, height=-0.2)


def sea_level(vortices: Sequence[Vortex], longitude: Any, latitude: Any, day: dt.date) -> Any:
    """Sum the vortices' sea level; zero without any."""
    return sum((v.sea_level(longitude, latitude, day) for v in vortices), np.zeros(np.shape(longitude + latitude)))


def write_day(
    folder: Path,
    day: dt.date,
    vortices: Sequence[Vortex],
    area: tuple[float, float, float, float] = AREA,
    apart: float = 1.0,
    step: float = 0.15,
) -> None:
    """Write a day's northward passes over an area (west, width, south, north); those of the next day lie between."""
    west, width, south, north = area
    tracks = np.arange(apart / 2.0 * (day.toordinal() % 2), width, apart)
    along = np.linspace(south, north, round((north - south) / step))
    clock = seconds(day) + 600.0 + np.arange(tracks.size)[:, None] * (80000.0 / tracks.size)
    clock = clock + np.arange(along.size) * step * KM_PER_DEGREE / GROUND_SPEED
    longitude = (west + tracks[:, None] + (along - south) * 0.1).ravel()
    latitude = np.tile(along, tracks.size)
    write_plain(
        folder / f"{day}.nc",
        latitude.size,
        clock=clock.ravel(),
        y=latitude,
        x=(longitude + 180.0) % 360.0 - 180.0,
        level=sea_level(vortices, longitude, latitude, day),
    )


def write_mean(
    path: Path, longitude: Any, latitude: Any, land: Callable[[Any, Any], Any] | None = None, slope: float = 0.02
) -> None:
    """Write a mean dynamic topography that rises northward by `slope` m a degree; missing on land."""
    path.parent.mkdir(parents=True, exist_ok=True)
    with netCDF4.Dataset(path, "w") as file:
        for name, values, units in (("latitude", latitude, "degrees_north"), ("longitude", longitude, "degrees_east")):
            file.createDimension(name, len(values))
            axis = file.createVariable(name, "f8", (name,))
            axis.setncatts({"standard_name": name, "units": units})
            axis[:] = values
        mean = file.createVariable("mean", "f8", ("latitude", "longitude"), fill_value=-999.0)
        mean.units = "m"
        lon, lat = np.meshgrid(longitude, latitude)
        mean[:] = np.ma.masked_where(land(lon, lat) if land else np.zeros(lon.shape, bool), slope * lat)


def write_sea(
    folder: Path, days: int = 7, vortices: Sequence[Vortex] = (HIGH, LOW), land: Callable[[Any, Any], Any] | None = None
) -> None:
    """Write the input of the box: `days` days of observations round the three analysed ones, and the mean."""
    for n in range(days):
        write_day(folder / "heron", FIRST + dt.timedelta(days=n - 2), vortices)
    write_mean(folder / "mean.nc", np.arange(-45.0, -10.0, 0.5), np.arange(15.0, 40.0, 0.5), land)


def silent(_: str) -> None:
    """Tell nobody."""


def run_chain(configuration: Configuration, now: dt.datetime = NOW) -> dict[str, set[str]]:
    """Run every job of an analysis in order; return the days that each stage made."""
    before = day_marks(configuration)
    inventory = take_inventory(configuration, silent)
    for block in inventory.observation_blocks:
        gather_observations(configuration, block, silent)
    prepare_fixed_fields(configuration, silent)
    for stage in (map_block, add_mean_block, currents_block, eddies_block):
        for block in inventory.analysis_blocks:
            stage(configuration, block, silent)
    link_trajectories(configuration, silent)
    publish_daily(configuration, now, silent)
    publish_eddies(configuration, now, silent)
    after = day_marks(configuration)
    return {stage: {day for day, mark in after[stage].items() if before[stage].get(day) != mark} for stage in STAGES}


def day_marks(configuration: Configuration) -> dict[str, dict[str, int]]:
    """Return when each day's file of each stage was last written; every write makes a new file."""
    return {
        stage: {
            path.stem: path.stat().st_ino ^ path.stat().st_mtime_ns
            for path in (configuration.work / stage).glob("*.nc")
        }
        for stage in STAGES
    }


def tiny(configure: Configure, **changes: Any) -> Configuration:
    """Return the configuration of the box, some keys changed."""
    return configure(**copy.deepcopy(BOX) | changes)


def analysis_of(configuration: Configuration, stage: str, day: dt.date) -> Any:
    """Read a stage's day."""
    return DayStore(configuration.work / stage).load(day)
