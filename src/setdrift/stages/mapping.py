"""Daily maps of sea level anomaly from the observations of the days around."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from typing import Any

import numpy as np
import xarray as xr

from setdrift.data.algorithms import settings_digest
from setdrift.data.configuration import Configuration
from setdrift.data.conventions import UNOBSERVED_LIMIT, MapQuality
from setdrift.data.day_store import DayStore
from setdrift.data.days import Block, day_number, days_between
from setdrift.data.digests import digest
from setdrift.data.fixed import fixed_digest, is_sea, load_fixed_fields
from setdrift.data.grids import Grid, working_grid
from setdrift.data.receipts import analysed_days, contents_between, refresh_block
from setdrift.numerics.covariance import CovarianceModel
from setdrift.numerics.optimal_interpolation import MappingSettings, map_sea_level
from setdrift.numerics.superobservations import SeaLevelObservations

NOON = 0.5  # maps are snapshots at 12:00 UTC


def map_block(configuration: Configuration, block: Block, announce: Callable[[str], None]) -> dict[str, Any]:
    """Map the days of a block whose observations or settings changed.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    block : Block
        Days handled by this job.
    announce : callable
        Told of each day, for the log.

    Returns
    -------
    dict
        The job's receipt.
    """
    days = analysed_days(configuration, block)
    window = dt.timedelta(days=configuration.mapping.window_days)
    observed = contents_between(configuration, "observations", days[0] - window, days[-1] + window)
    grid = working_grid(configuration)
    common = digest(settings_digest(configuration, "maps"), fixed_digest(configuration, "land_fraction"))

    def made_from(day: dt.date) -> str:
        return digest(common, [observed[d] for d in days_between(day - window, day + window)])

    mapper = _Mapper(configuration, grid)
    return refresh_block(configuration, "maps", block, days, made_from, mapper.map_day, announce)


class _Mapper:
    """Maps days one after another, keeping the observation days that the next one needs."""

    def __init__(self, configuration: Configuration, grid: Grid) -> None:
        self._configuration = configuration
        self._grid = grid
        self._loaded: dict[dt.date, SeaLevelObservations] = {}
        self._settings = mapping_settings(configuration)
        self._sea: np.ndarray[Any, np.dtype[np.bool_]] | None = None

    def map_day(self, day: dt.date) -> xr.Dataset:
        if self._sea is None:
            self._sea = is_sea(load_fixed_fields(self._configuration)["land_fraction"])
        moment = day_number(day) + NOON
        mapped = map_sea_level(
            self._window(day), self._grid.latitude, self._grid.longitude, self._sea, moment, self._settings
        )
        unobserved = mapped.error > UNOBSERVED_LIMIT * self._settings.model.prior_standard_deviation
        quality = np.where(unobserved, MapQuality.UNOBSERVED, 0) + np.where(self._sea, 0, MapQuality.LAND)
        dims = ("latitude", "longitude")
        return xr.Dataset(
            {
                "sea_level_anomaly": (dims, mapped.estimate),
                "sea_level_anomaly_error": (dims, mapped.error),
                "observation_count": (dims, mapped.observation_count),
                "map_quality": (dims, quality.astype(np.int8)),
            },
            coords={"latitude": self._grid.latitude, "longitude": self._grid.longitude},
        )

    def _window(self, day: dt.date) -> SeaLevelObservations:
        window = dt.timedelta(days=self._configuration.mapping.window_days)
        wanted = days_between(day - window, day + window)
        self._loaded = {d: self._loaded.get(d) or load_observations(self._configuration, d) for d in wanted}
        return SeaLevelObservations.joined(list(self._loaded.values()))


def load_observations(configuration: Configuration, day: dt.date) -> SeaLevelObservations:
    """Return a gathered day's observations of all altimeters.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    day : date
        The day.

    Returns
    -------
    SeaLevelObservations
        Altimeters are numbered in the configuration's order.

    Raises
    ------
    SetdriftError
        There is no sound file for the day.
    """
    data = DayStore(configuration.work / "observations").load(day)
    names = data.attrs["altimeters"].split()
    noise = np.array([configuration.altimeters[name].noise_m for name in names])
    altimeter = data["altimeter"].values.astype(np.int64)
    return SeaLevelObservations(
        data["longitude"].values,
        data["latitude"].values,
        data["time"].values / 86400.0,
        data["sea_level_anomaly"].values,
        noise[altimeter] ** 2,
        altimeter,
        data["pass_number"].values.astype(np.int64),
        np.ones(altimeter.size, dtype=np.int64),
    )


def mapping_settings(configuration: Configuration) -> MappingSettings:
    """Return the settings of the mapping from the configuration's."""
    chosen = configuration.mapping
    model = CovarianceModel(
        chosen.signal_m,
        chosen.time_scale_days,
        chosen.large_scale_m,
        chosen.zonal_scale_km,
        chosen.meridional_scale_km,
        chosen.zonal_drift_km_per_day,
    )
    return MappingSettings(
        model, float(chosen.window_days), long_wave_variance=chosen.long_wave_m**2, bias_variance=chosen.bias_m**2
    )
