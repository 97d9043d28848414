"""Editing: which observations are used, and why each of the others is not."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from setdrift.data.alongtrack import DAY_S, AlongTrack
from setdrift.data.ancillary import LandMask
from setdrift.data.bathymetry import SeaFloor
from setdrift.data.configuration import Editing
from setdrift.data.grids import Area
from setdrift.numerics.passes import infer_passes
from setdrift.numerics.segments import in_short_segments
from setdrift.numerics.spikes import find_spikes

REASONS = (
    "bad_time",
    "bad_position",
    "not_finite",
    "flagged",
    "outside_area",
    "land",
    "shallow",
    "implausible",
    "spike",
    "duplicate",
    "short_segment",
)
"""Why observations are dropped, in the order of the tests: each counts once, by the first test it fails."""

CYCLE_STRIDE = 10_000  # more than the passes of any repeat cycle
SAME_TIME_S = 1e-3  # times closer than rounding to this are one observation delivered twice


@dataclass(frozen=True)
class Edited:
    """The observations of one altimeter that passed every test, ascending in time.

    Attributes
    ----------
    track : AlongTrack
        Observations; `pass_number` is unique within the altimeter over all time.
    received : int
        Observations before editing.
    dropped : dict
        Number dropped by reason; with those kept they add up to those received.
    """

    track: AlongTrack
    received: int
    dropped: dict[str, int]


def edit(track: AlongTrack, settings: Editing, land: LandMask, area: Area, floor: SeaFloor | None = None) -> Edited:
    """Drop the observations that fail a test.

    The passes are those of the observations given, so one that is cut (by midnight, say) counts as two where
    the file does not number them. A segment that midnight or the area's edge cuts is never too short.

    Parameters
    ----------
    track : AlongTrack
        Observations of one altimeter in any order; of two at one time, the earlier in this order stays.
    settings : Editing
        Limits of the tests.
    land : LandMask
        Where land is.
    area : Area
        Where observations are used.
    floor : SeaFloor, optional
        How deep the sea is; left out, none is too shallow.

    Returns
    -------
    Edited
        Those kept, and counts of the others by reason.
    """
    received = len(track)
    dropped = dict.fromkeys(REASONS, 0)

    def drop(reason: str, failing: Callable[[AlongTrack], NDArray[Any]]) -> None:
        nonlocal track
        fails = failing(track)
        dropped[reason] = int(np.count_nonzero(fails))
        track = track.select(~fails) if dropped[reason] else track

    drop("bad_time", lambda t: np.isnan(t.time))
    drop("bad_position", lambda t: np.isnan(t.latitude) | np.isnan(t.longitude))
    track = _with_passes(track.select(np.argsort(track.time, kind="stable")), settings.pass_gap_s)
    drop("not_finite", lambda t: ~np.isfinite(t.sea_level_anomaly))
    drop("flagged", lambda t: t.flagged)
    cuts = _cuts(track, area)
    drop("outside_area", lambda t: ~area.holds(t.longitude, t.latitude))
    drop("land", lambda t: land.is_land(t.longitude, t.latitude))
    if floor is not None:
        drop("shallow", lambda t: floor.is_shallow(t.longitude, t.latitude, settings.least_depth_m))
    drop("implausible", lambda t: abs(t.sea_level_anomaly) > settings.largest_anomaly_m)
    drop("spike", lambda t: _spikes(t, settings))
    drop("duplicate", lambda t: np.diff(np.rint(t.time / SAME_TIME_S), prepend=-np.inf) == 0)
    drop("short_segment", lambda t: in_short_segments(t.time, settings.shortest_segment, cuts))
    return Edited(track, received, dropped)


def number_passes(track: AlongTrack, gap_s: float) -> NDArray[np.int64]:
    """Return a number for each observation's pass that no other pass of the altimeter ever has.

    Parameters
    ----------
    track : AlongTrack
        Observations with times and positions, ascending in time.
    gap_s : float
        A longer gap in time starts a new pass, where passes are inferred.

    Returns
    -------
    (n,) array of int64
        10000 times the cycle's number plus the pass's, if the files give both; else the pass's first
        second among these observations, counted from 1970.
    """
    if track.pass_number is not None and track.cycle_number is not None:
        return track.cycle_number * CYCLE_STRIDE + track.pass_number
    passes = infer_passes(track.time, track.latitude, gap_s)
    start = np.flatnonzero(np.diff(passes, prepend=-1))
    order = np.arange(start.size)
    # two passes never start in one second, but stray positions might make it seem so
    seconds = np.maximum.accumulate(np.floor(track.time[start]).astype(np.int64) - order) + order
    return np.asarray(seconds[passes], dtype=np.int64)


def _with_passes(track: AlongTrack, gap_s: float) -> AlongTrack:
    return dataclasses.replace(track, pass_number=number_passes(track, gap_s), cycle_number=None)


def _cuts(track: AlongTrack, area: Area) -> NDArray[np.float64]:
    """Return the times, ascending, of points outside the area and of the midnights round all points."""
    if len(track) == 0:
        return track.time
    outside = track.time[~area.holds(track.longitude, track.latitude)]
    midnights = np.arange(track.time[0] // DAY_S, track.time[-1] // DAY_S + 2) * DAY_S
    return np.sort(np.concatenate([outside, midnights]))


def _spikes(track: AlongTrack, settings: Editing) -> NDArray[np.bool_]:
    assert track.pass_number is not None
    return find_spikes(
        track.time,
        track.sea_level_anomaly,
        track.pass_number,
        settings.spike_window,
        settings.spike_limit,
        settings.spike_floor_m,
    )
