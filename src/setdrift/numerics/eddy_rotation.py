"""How fast an eddy turns: circulation along its contours, and the contour that turns fastest."""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numba import njit, types
from numpy.typing import NDArray

from setdrift.numerics.eddy_contours import outer_contour
from setdrift.numerics.eddy_geometry import interpolate_axis

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_LEVELS = 16  # tried between the outer contour and the peak before the search closes in
_GOLDEN_STEPS = 10  # leaves 0.1 per cent of the amplitude between levels


class Flow(NamedTuple):
    """Velocity on a grid and the grid's metric; all float64 and contiguous.

    Attributes
    ----------
    eastward, northward : (y, x) array
        Velocity, m s-1; NaN where unknown.
    longitude, latitude : (x,), (y,) array
        Degrees.
    east_metres, north_metres : (y,) array
        Length of a degree of longitude and of latitude, m.
    """

    eastward: FloatArray
    northward: FloatArray
    longitude: FloatArray
    latitude: FloatArray
    east_metres: FloatArray
    north_metres: FloatArray


_PLANE, _LINE = types.float64[:, ::1], types.float64[::1]
_FLOW = types.NamedTuple([_PLANE, _PLANE, _LINE, _LINE, _LINE, _LINE], Flow)
_PAIR = types.UniTuple(types.float64, 2)


@njit(types.float64(_PLANE, types.float64, types.float64), cache=True)
def _on_side(values: FloatArray, x: float, y: float) -> Any:
    """Value at a point on a side of a grid cell, from the two ends of that side only."""
    columns = values.shape[1]
    j, i = int(np.floor(y)), int(np.floor(x))
    start = values[j, i % columns]
    if x > i:
        return start + (x - i) * (values[j, (i + 1) % columns] - start)
    if y > j:
        return start + (y - j) * (values[j + 1, i % columns] - start)
    return start


@njit(_PAIR(_PLANE, types.int64, _FLOW), cache=True)
def circulation(points: FloatArray, n: int, flow: Flow) -> Any:
    """Circulation (m2 s-1) along the closed contour of the first n points, and its length (m).

    Positive the way the points run. Where the velocity is unknown along less than half of the contour, both are
    of the part where it is known; otherwise NaN.
    """
    total, known, length = 0.0, 0.0, 0.0
    for k in range(n):
        x, y = points[0, k], points[1, k]
        next_x, next_y = points[0, (k + 1) % n], points[1, (k + 1) % n]
        middle = 0.5 * (y + next_y)
        east = interpolate_axis(flow.longitude, next_x, 360.0) - interpolate_axis(flow.longitude, x, 360.0)
        north = interpolate_axis(flow.latitude, next_y, 0.0) - interpolate_axis(flow.latitude, y, 0.0)
        east *= interpolate_axis(flow.east_metres, middle, 0.0)
        north *= interpolate_axis(flow.north_metres, middle, 0.0)
        u = 0.5 * (_on_side(flow.eastward, x, y) + _on_side(flow.eastward, next_x, next_y))
        v = 0.5 * (_on_side(flow.northward, x, y) + _on_side(flow.northward, next_x, next_y))
        step = np.hypot(east, north)
        length += step
        if not np.isnan(u + v):
            known += step
            total += u * east + v * north
    if known < 0.5 * length:
        return np.nan, np.nan
    return total, known


@njit(
    types.float64(
        _PLANE, types.float64, types.float64, types.int64, types.int64, types.boolean, _FLOW, _PLANE,
        types.int64[::1],
    ),
    cache=True,
)  # fmt: skip
def _mean_speed(
    field: FloatArray,
    level: float,
    sense: float,
    row: int,
    column: int,
    periodic: bool,
    flow: Flow,
    points: FloatArray,
    crossings: IntArray,
) -> Any:
    """Mean velocity along the contour at a level, positive in the given sense; minus infinity if unknown."""
    n, _ = outer_contour(field, level, row, column, periodic, points, crossings)
    total, length = circulation(points, n, flow)
    if not length > 0.0:
        return -np.inf
    return sense * total / length


@njit(
    _PAIR(
        _PLANE, types.float64, types.float64, types.int64, types.int64, types.boolean, _FLOW, _PLANE,
        types.int64[::1],
    ),
    cache=True,
)  # fmt: skip
def fastest_level(
    field: FloatArray,
    outer_level: float,
    sense: float,
    row: int,
    column: int,
    periodic: bool,
    flow: Flow,
    points: FloatArray,
    crossings: IntArray,
) -> Any:
    """Level of the contour with the highest mean velocity along it, and that velocity (m s-1).

    Searches from the outer contour to the maximum at (row, column): evenly spaced levels, then golden section
    round the best (Kiefer 1953, Sequential minimax search for a maximum). `sense` is 1 if anticlockwise counts
    as positive, else -1. The velocity is minus infinity if it is known along no contour.
    """
    step = (field[row, column] - outer_level) / _LEVELS
    best_level, best_speed = outer_level, -np.inf
    for k in range(_LEVELS):
        level = outer_level + k * step
        speed = _mean_speed(field, level, sense, row, column, periodic, flow, points, crossings)
        if speed > best_speed:
            best_level, best_speed = level, speed
    ratio = 0.5 * (np.sqrt(5.0) - 1.0)
    low = max(best_level - step, outer_level)
    high = min(best_level + step, outer_level + (_LEVELS - 0.5) * step)
    for _ in range(_GOLDEN_STEPS):
        left, right = high - ratio * (high - low), low + ratio * (high - low)
        left_speed = _mean_speed(field, left, sense, row, column, periodic, flow, points, crossings)
        right_speed = _mean_speed(field, right, sense, row, column, periodic, flow, points, crossings)
        if left_speed >= right_speed:
            high, level, speed = right, left, left_speed
        else:
            low, level, speed = left, right, right_speed
        if speed > best_speed:
            best_level, best_speed = level, speed
    return best_level, best_speed
