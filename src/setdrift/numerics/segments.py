"""Segments: stretches of an altimeter's track without a gap."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Booleans = NDArray[np.bool_]

BREAK_STEPS = 5.0
"""A step in time above so many usual (median) ones is a gap: common practice, no source."""


def usual_step(step: Floats) -> float:
    """Return the median of the steps in time above zero.

    Parameters
    ----------
    step : (n,) array
        Seconds.

    Returns
    -------
    float
        Seconds; infinite where no step is above zero, so that nothing is a gap.
    """
    moving = step[step > 0.0]
    return float(np.median(moving)) if moving.size else np.inf


def in_short_segments(time: Floats, fewest: int, cuts: Floats) -> Booleans:
    """Find the points of segments that have few points and end in gaps on both sides.

    A segment that begins or ends where the record was cut (at the end of a day, at the edge of the area) may be
    the end of a longer one, and is not short.

    Parameters
    ----------
    time : (n,) array
        Seconds, not descending.
    fewest : int
        Segments of fewer points are short.
    cuts : (m,) array
        Times, ascending, at which points are missing only because the record was cut there.

    Returns
    -------
    (n,) array of bool
        Which points are in short segments.

    Raises
    ------
    ValueError
        Times or cuts descend or are not finite.
    """
    for name, values in (("time", time), ("cuts", cuts)):
        if not (np.all(np.isfinite(values)) and np.all(np.diff(values) >= 0.0)):
            raise ValueError(f"{name}: must be finite and not descend")
    if time.size == 0:
        return np.zeros(0, dtype=bool)
    step = np.diff(time)
    gap = BREAK_STEPS * usual_step(step)
    first = np.flatnonzero(np.concatenate([[True], step > gap]))
    count = np.diff(np.append(first, time.size))
    cut = _any_within(cuts, time[first] - gap, time[first + count - 1] + gap)
    return np.repeat((count < fewest) & ~cut, count)


def _any_within(cuts: Floats, low: Floats, high: Floats) -> Booleans:
    return np.asarray(np.searchsorted(cuts, high, side="right") > np.searchsorted(cuts, low, side="left"))
