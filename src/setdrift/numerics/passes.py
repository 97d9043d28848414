"""Passes of a satellite: stretches of its track between turning latitudes or gaps in time."""

from __future__ import annotations

import itertools

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

TURN_DEGREES = 0.1
"""A turn counts once latitude has come back so far from its extreme: beyond any jitter of positions."""


def infer_passes(time: Floats, latitude: Floats, gap_s: float) -> Integers:
    """Find the pass that each observation belongs to.

    A new pass starts after a gap in time, and where the latitude turns back. Jitter, repeated latitudes and a
    single wrong position make no turn; the extreme itself belongs to the pass before.

    Parameters
    ----------
    time : (n,) array
        Seconds, not descending.
    latitude : (n,) array
        Degrees, finite.
    gap_s : float
        Seconds; a longer step in time starts a new pass.

    Returns
    -------
    (n,) array of int64
        Number of the pass, from 0, one more at each new pass.

    Raises
    ------
    ValueError
        Times descend, sizes differ, or a value is not finite.
    """
    if time.shape != latitude.shape or time.ndim != 1:
        raise ValueError("latitude: must have one value for each time")
    if not np.all(np.isfinite(latitude)):
        raise ValueError("latitude: must be finite")
    if not np.all(np.diff(time) >= 0.0):
        raise ValueError("time: must be finite and not descend")
    starts = np.zeros(time.size, dtype=np.int64)
    bounds = [0, *(np.flatnonzero(np.diff(time) > gap_s) + 1), time.size]
    for first, last in itertools.pairwise(bounds):
        starts[first:last][:1] = 1
        starts[[first + turn + 1 for turn in turning_points(latitude[first:last])]] = 1
    return np.cumsum(starts) - 1


def turning_points(latitude: Floats) -> list[int]:
    """Return where latitude, along one stretch of track, reaches an extreme and turns back.

    Parameters
    ----------
    latitude : (n,) array
        Degrees, in the order of time.

    Returns
    -------
    list of int
        Index of each extreme that latitude came back from by more than `TURN_DEGREES`.
    """
    turns: list[int] = []
    if latitude.size == 0:
        return turns
    smooth = _without_strays(latitude)
    direction, extreme, low, high = 0, 0, 0, 0
    for i in _local_extremes(smooth):
        if direction == 0:
            low = i if smooth[i] < smooth[low] else low
            high = i if smooth[i] > smooth[high] else high
            if smooth[high] - smooth[low] > TURN_DEGREES:
                direction, extreme = (1 if i == high else -1), i
        elif direction * (smooth[i] - smooth[extreme]) >= 0.0:
            extreme = i
        elif abs(smooth[i] - smooth[extreme]) > TURN_DEGREES:
            turns.append(extreme)
            direction, extreme = -direction, i
    return turns


def _without_strays(latitude: Floats) -> Floats:
    """Return the running median of three, which a single wrong position does not move."""
    if latitude.size < 3:
        return latitude
    smooth = latitude.copy()
    smooth[1:-1] = np.median([latitude[:-2], latitude[1:-1], latitude[2:]], axis=0)
    # a wrong first or last position has no neighbour beyond it
    smooth[0], smooth[-1] = smooth[1], smooth[-2]
    return smooth


def _local_extremes(latitude: Floats) -> list[int]:
    """Return the points between which latitude only rises or only falls, the first and last among them."""
    moving = np.flatnonzero(np.diff(latitude) != 0.0)
    direction = np.sign(np.diff(latitude)[moving])
    inner = moving[np.flatnonzero(direction[1:] != direction[:-1]) + 1]
    return [0, *inner.tolist(), latitude.size - 1]
