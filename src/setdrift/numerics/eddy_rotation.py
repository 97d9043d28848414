"""How fast an eddy turns: velocity along its contours, and the contour that turns fastest."""

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
_FLOW = types.NamedTuple([_PLANE, _PLANE, _LINE, _LINE, _LINE, _LINE], Flow)  # type: ignore[no-untyped-call]
_PAIR = types.UniTuple(types.float64, 2)  # type: ignore[no-untyped-call]


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
def velocity_along(points: FloatArray, n: int, flow: Flow) -> Any:
    """Mean velocity along a closed contour, and the contour's length.

    Parameters
    ----------
    points : (2, m) array
        Fractional columns and rows, on sides of grid cells.
    n : int
        How many of the points to use.
    flow : Flow
        Velocity and metric.

    Returns
    -------
    velocity : float
        m s-1, positive the way the points run: the mean over the part of the contour where it is known; NaN if
        that is less than half.
    length : float
        m.
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
    if known == 0.0 or known < 0.5 * length:
        return np.nan, length
    return total / known, length


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
    velocity, _ = velocity_along(points, n, flow)
    return -np.inf if np.isnan(velocity) else sense * velocity


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
    """Level of the contour with the highest mean velocity along it, from the outer contour to the peak.

    Tries evenly spaced levels, then closes in round the best by golden section.

    Parameters
    ----------
    field : (y, x) array
        m; NaN where there is no data.
    outer_level : float
        m.
    sense : float
        1 if anticlockwise velocity counts as positive, -1 if clockwise does.
    row, column : int
        Grid point of the maximum.
    periodic : bool
        The last column neighbours the first.
    flow : Flow
        Velocity and metric.
    points, crossings : array
        Buffers, see `contour_buffers`.

    Returns
    -------
    level : float
        m.
    velocity : float
        m s-1; minus infinity if it is known along no contour.

    References
    ----------
    Kiefer (1953), Sequential minimax search for a maximum.
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
