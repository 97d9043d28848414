"""Eddies linked from day to day."""

from __future__ import annotations

import datetime as dt
import itertools
from collections.abc import Callable

import xarray as xr

from setdrift.data.algorithms import settings_digest
from setdrift.data.configuration import Configuration
from setdrift.data.configuration import Eddies as EddySettings
from setdrift.data.day_store import DayStore, refresh_days
from setdrift.data.days import ONE_DAY, day_number
from setdrift.data.digests import digest
from setdrift.data.receipts import analysed_period, contents_between
from setdrift.data.records import write_record
from setdrift.numerics.eddy_trajectories import (
    TrackingSettings,
    TrajectoryState,
    advance,
    arrays_to_state,
    no_trajectories,
    state_to_arrays,
)

STATE = "state_"
"""Prefix of the variables that hold the state after a day: linking goes on from there."""


def link_trajectories(configuration: Configuration, announce: Callable[[str], None]) -> None:
    """Link the eddies of all analysed days, from the first day that changed.

    Each day keeps the trajectories' state after it. A day depends on its own eddies and, through a chain of digests,
    on those of all days before it: so a changed day is linked again with all that follow, and none before.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    announce : callable
        Told of each day, for the log.
    """
    first, last = analysed_period(configuration)
    detected = contents_between(configuration, "eddies", first, last)
    common = settings_digest(configuration, "trajectories")
    chain = dict(zip(detected, itertools.accumulate(detected.values(), digest, initial=common), strict=False))
    eddies, store = DayStore(configuration.work / "eddies"), DayStore(configuration.work / "trajectories")
    settings = tracking_settings(configuration.eddies)

    def made_from(day: dt.date) -> str:
        return digest(chain[day], detected[day])

    def make(day: dt.date) -> xr.Dataset:
        state = _state_after(store, day - ONE_DAY) if day > first else no_trajectories()
        found = eddies.load(day)
        state, identifiers = advance(
            state,
            day_number(day),
            found["longitude"].values,
            found["latitude"].values,
            found["polarity"].values,
            found["amplitude"].values,
            found["equal_area_radius"].values,
            settings,
        )
        kept = {STATE + name: ("active", values) for name, values in state_to_arrays(state).items()}
        return xr.Dataset({"trajectory": ("eddy", identifiers)} | kept)

    contents = refresh_days(store, detected, made_from, make, announce)
    write_record(configuration.work / "trajectories" / "links.json", {"stage": "trajectories", "days": contents})


def _state_after(store: DayStore, day: dt.date) -> TrajectoryState:
    data = store.load(day)
    names = (str(name) for name in data.data_vars if str(name).startswith(STATE))
    return arrays_to_state({name.removeprefix(STATE): data[name].values for name in names})


def tracking_settings(settings: EddySettings) -> TrackingSettings:
    """Return the settings of the linking from the configuration's."""
    return TrackingSettings(gate=settings.gate_km * 1000.0, gap_days=settings.gap_days)
