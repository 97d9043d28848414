"""Eddies of each day's map."""

from __future__ import annotations

import dataclasses
import datetime as dt
from collections.abc import Callable
from typing import Any

import numpy as np
import xarray as xr

from setdrift.data.algorithms import settings_digest
from setdrift.data.configuration import Configuration
from setdrift.data.configuration import Eddies as EddySettings
from setdrift.data.day_store import DayStore
from setdrift.data.days import Block
from setdrift.data.digests import digest
from setdrift.data.grids import Grid, analysis_grid, working_grid
from setdrift.data.receipts import analysed_days, contents_between, refresh_block
from setdrift.numerics.eddy_detection import EddyLimits, detect_eddies
from setdrift.numerics.eddy_table import Eddies

CONTOURS = ("outer", "fastest")


def eddies_block(configuration: Configuration, block: Block, announce: Callable[[str], None]) -> dict[str, Any]:
    """Detect the eddies of a block's days.

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
    settings = configuration.eddies
    source, suffix = ("maps", "_anomaly") if settings.field == "sea_level_anomaly" else ("dynamic_topography", "")
    heights = contents_between(configuration, source, days[0], days[-1])
    flows = contents_between(configuration, "currents", days[0], days[-1])
    height_store, flow_store = DayStore(configuration.work / source), DayStore(configuration.work / "currents")
    grid, inner, limits = working_grid(configuration), analysis_grid(configuration), eddy_limits(settings)
    common = settings_digest(configuration, "eddies")

    def made_from(day: dt.date) -> str:
        return digest(common, heights[day], flows[day])

    def make(day: dt.date) -> xr.Dataset:
        height, flow = height_store.load(day)[settings.field], flow_store.load(day)
        found = detect_eddies(
            height.values,
            grid.latitude,
            grid.longitude,
            flow[f"eastward_velocity{suffix}"].values,
            flow[f"northward_velocity{suffix}"].values,
            limits=limits,
            periodic=grid.periodic,
        )
        return eddy_dataset(found, _inside(found, inner))

    return refresh_block(configuration, "eddies", block, days, made_from, make, announce)


def _inside(found: Eddies, inner: Grid) -> np.ndarray[Any, np.dtype[np.bool_]]:
    """Return which eddies are centred in the analysis box: the padding is there only for the contours."""
    half = inner.spacing / 2.0
    south, north = inner.latitude[0] - half, inner.latitude[-1] + half
    inside = (found.latitude >= south) & (found.latitude < north)
    if inner.periodic:
        return np.asarray(inside)
    west, east = inner.longitude[0] - half, inner.longitude[-1] + half
    return np.asarray(inside & (found.longitude >= west) & (found.longitude < east))


def eddy_dataset(found: Eddies, keep: np.ndarray[Any, np.dtype[np.bool_]]) -> xr.Dataset:
    """Arrange the eddies of a day as a dataset.

    Parameters
    ----------
    found : Eddies
        Detected eddies.
    keep : (n,) boolean array
        Those to keep.

    Returns
    -------
    Dataset
        One column a property along `eddy`; contours along `outer_node` and `fastest_node`.
    """
    columns: dict[str, Any] = {}
    for field in dataclasses.fields(found):
        values = getattr(found, field.name)
        contour, _, part = field.name.partition("_")
        if contour in CONTOURS and part in {"longitude", "latitude"}:
            nodes = np.repeat(keep, getattr(found, f"{contour}_size"))
            columns[field.name] = (f"{contour}_node", values[nodes])
        else:
            columns[field.name] = ("eddy", values[keep])
    return xr.Dataset(columns)


def eddy_limits(settings: EddySettings) -> EddyLimits:
    """Return the limits of the detection from the configuration's settings."""
    return EddyLimits(
        minimum_amplitude=settings.minimum_amplitude_m,
        minimum_prominence=settings.minimum_prominence_m,
        minimum_radius=settings.minimum_radius_km * 1000.0,
        maximum_radius=settings.maximum_radius_km * 1000.0,
        maximum_circle_misfit=settings.maximum_circle_misfit,
        equatorial_exclusion=settings.equatorial_exclusion_degrees,
    )
