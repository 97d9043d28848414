"""Daily surface currents in balance with the sea level."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from typing import Any

import xarray as xr

from setdrift.data.algorithms import settings_digest
from setdrift.data.configuration import Configuration, Currents
from setdrift.data.day_store import DayStore
from setdrift.data.days import Block
from setdrift.data.digests import digest
from setdrift.data.grids import working_grid
from setdrift.data.receipts import analysed_days, contents_between, refresh_block
from setdrift.numerics.derivatives import relative_vorticity
from setdrift.numerics.geostrophy import EquatorialBand, geostrophic_velocity, rossby_number


def currents_block(configuration: Configuration, block: Block, announce: Callable[[str], None]) -> dict[str, Any]:
    """Compute the currents of a block from its dynamic topography and sea level anomaly.

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
    added = contents_between(configuration, "dynamic_topography", days[0], days[-1])
    maps = DayStore(configuration.work / "maps")
    topographies = DayStore(configuration.work / "dynamic_topography")
    periodic = working_grid(configuration).periodic
    band = equatorial_band(configuration.currents)
    common = settings_digest(configuration, "currents")

    def made_from(day: dt.date) -> str:
        return digest(common, mapped[day], added[day])

    def make(day: dt.date) -> xr.Dataset:
        return currents(
            topographies.load(day)["dynamic_topography"], maps.load(day)["sea_level_anomaly"], band, periodic
        )

    return refresh_block(configuration, "currents", block, days, made_from, make, announce)


def currents(topography: xr.DataArray, anomaly: xr.DataArray, band: EquatorialBand, periodic: bool) -> xr.Dataset:
    """Compute velocity, its anomaly, vorticity and Rossby number of one day.

    Parameters
    ----------
    topography, anomaly : (latitude, longitude) DataArray
        Dynamic topography and sea level anomaly, m.
    band : EquatorialBand
        Latitudes of the beta-plane balance.
    periodic : bool
        Whether the grid goes once round the globe.

    Returns
    -------
    Dataset
        The currents, on the same grid.
    """
    latitude, longitude = topography["latitude"].values, topography["longitude"].values
    whole = geostrophic_velocity(topography.values, latitude, longitude, band=band, periodic=periodic)
    part = geostrophic_velocity(anomaly.values, latitude, longitude, band=band, periodic=periodic)
    vorticity = relative_vorticity(whole.eastward, whole.northward, latitude, longitude, periodic=periodic)
    fields = {
        "eastward_velocity": whole.eastward,
        "northward_velocity": whole.northward,
        "eastward_velocity_anomaly": part.eastward,
        "northward_velocity_anomaly": part.northward,
        "relative_vorticity": vorticity,
        "rossby_number": rossby_number(vorticity, latitude),
        "velocity_method": whole.method,
    }
    return xr.Dataset({name: (topography.dims, values) for name, values in fields.items()}, coords=topography.coords)


def equatorial_band(settings: Currents) -> EquatorialBand:
    """Return the equatorial band from the configuration's settings."""
    return EquatorialBand(
        half_width=settings.band_degrees, inner=settings.blend_from_degrees, outer=settings.blend_to_degrees
    )
