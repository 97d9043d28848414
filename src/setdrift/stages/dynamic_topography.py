"""Daily dynamic topography: sea level anomaly plus the mean."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from typing import Any

import xarray as xr

from setdrift.data.algorithms import settings_digest
from setdrift.data.configuration import Configuration
from setdrift.data.day_store import DayStore
from setdrift.data.days import Block
from setdrift.data.digests import digest
from setdrift.data.fixed import fixed_digest, load_fixed_fields
from setdrift.data.receipts import analysed_days, contents_between, refresh_block


def add_mean_block(configuration: Configuration, block: Block, announce: Callable[[str], None]) -> dict[str, Any]:
    """Add the mean dynamic topography to the maps of a block.

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
    mapped = contents_between(configuration, "maps", days[0], days[-1])
    common = digest(
        settings_digest(configuration, "dynamic_topography"), fixed_digest(configuration, "mean_dynamic_topography")
    )
    maps = DayStore(configuration.work / "maps")
    mean = load_fixed_fields(configuration)["mean_dynamic_topography"]

    def made_from(day: dt.date) -> str:
        return digest(common, mapped[day])

    def make(day: dt.date) -> xr.Dataset:
        anomaly = maps.load(day)["sea_level_anomaly"]
        return xr.Dataset({"dynamic_topography": (anomaly.dims, anomaly.values + mean.values)}, coords=anomaly.coords)

    return refresh_block(configuration, "dynamic_topography", block, days, made_from, make, announce)
