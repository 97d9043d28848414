"""Spikes: values that depart from the running median along their pass."""

from __future__ import annotations

import itertools

import numpy as np
from numpy.typing import NDArray

from setdrift.numerics.segments import BREAK_STEPS, usual_step

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]
Booleans = NDArray[np.bool_]

NORMAL_SCALE = 1.4826
"""Standard deviation of a normal law over its median absolute deviation."""


def find_spikes(
    time: Floats, values: Floats, passes: Integers, window: int, limit: float, floor: float
) -> NDArray[np.bool_]:
    """Find the values that depart from the running median of their pass.

    The departure is measured against the robust scale (median absolute deviation) of the whole pass. Near the
    ends of a stretch, where a centred window does not fit and a slope alone would show as a departure, a value
    must also depart from the line drawn through the running medians further in. Where a whole pass has hardly
    more points than a spike, nothing can be told.

    Parameters
    ----------
    time : (n,) array
        Seconds, not descending within a pass.
    values : (n,) array
        Finite.
    passes : (n,) array of int
        Number of the pass; those of one pass stand together.
    window : int
        Points of the running median; even ones count one more.
    limit : float
        Robust standard deviations that a spike departs by.
    floor : float
        Departures up to this are never spikes, in the units of the values.

    Returns
    -------
    (n,) array of bool
        Which values are spikes.

    Raises
    ------
    ValueError
        Sizes differ, or a value is not finite.
    """
    if not time.shape == values.shape == passes.shape:
        raise ValueError("values: must have one value for each time and pass")
    if not np.all(np.isfinite(values)):
        raise ValueError("values: must be finite")
    if values.size == 0:
        return np.zeros(0, dtype=bool)
    half = window // 2
    first, last = _windows(time, passes, half)
    middle = _running_median(values, first, last, half)
    departure = _departure(values, middle, first, last, half)
    scale = np.empty_like(values)
    for start, stop in _pieces(passes):
        scale[start:stop] = NORMAL_SCALE * np.median(departure[start:stop])
    return np.asarray(departure > np.maximum(limit * scale, floor))


def _windows(time: Floats, passes: Integers, half: int) -> tuple[Integers, Integers]:
    """Return for each point the first and last index that its window may reach to."""
    # a gap (islands, flagged stretches) breaks the window, unless it cuts off too few points for a median of their own
    step = np.diff(time)
    new_pass = np.diff(passes) != 0
    broken = step > BREAK_STEPS * usual_step(step[~new_pass])
    first, last = _bounds(np.concatenate([[True], new_pass | broken]))
    pass_first, pass_last = _bounds(np.concatenate([[True], new_pass]))
    short = last - first < half
    return np.where(short, pass_first, first), np.where(short, pass_last, last)


def _pieces(labels: Integers) -> list[tuple[int, int]]:
    bounds = [0, *(np.flatnonzero(np.diff(labels) != 0) + 1).tolist(), labels.size]
    return list(itertools.pairwise(bounds))


def _bounds(starts: Booleans) -> tuple[Integers, Integers]:
    """Return for each point the first and last index of its stretch."""
    begin = np.flatnonzero(starts)
    end = np.append(begin[1:], starts.size) - 1
    number = np.cumsum(starts) - 1
    return begin[number].astype(np.int64), end[number].astype(np.int64)


def _running_median(values: Floats, first: Integers, last: Integers, half: int) -> Floats:
    """Return the median of up to 2 half + 1 points round each, none outside its stretch."""
    index = np.arange(values.size)[:, None] + np.arange(-half, half + 1)
    inside = (index >= first[:, None]) & (index <= last[:, None])
    ordered = np.sort(np.where(inside, values[np.clip(index, 0, values.size - 1)], np.inf), axis=1)
    count = inside.sum(axis=1)[:, None]
    pair = np.take_along_axis(ordered, np.concatenate([(count - 1) // 2, count // 2], axis=1), axis=1)
    return np.asarray(pair.mean(axis=1))


def _departure(values: Floats, middle: Floats, first: Integers, last: Integers, half: int) -> Floats:
    """Return how far values lie from the running median, near ends from the nearer of it and the line inwards."""
    departure = abs(values - middle)
    here = np.arange(values.size)
    for end, inward in ((first, 1), (last, -1)):
        near = np.flatnonzero((abs(here - end) < half) & (last - first >= 3 * half))
        anchor = end[near] + inward * half
        slope = (middle[anchor + inward * half] - middle[anchor]) / half
        line = middle[anchor] - slope * abs(here[near] - anchor)
        departure[near] = np.minimum(departure[near], abs(values[near] - line))
    return np.asarray(departure)
