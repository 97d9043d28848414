"""How fast an eddy turns: velocity along its contours, and the contour that turns fastest."""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numba import njit, types
from numpy.typing import NDArray

from setdrift.numerics.eddy_contours import outer_contour, value_on_side
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
    periodic : bool
        The last column neighbours the first.
    """

    eastward: FloatArray
    northward: FloatArray
    longitude: FloatArray
    latitude: FloatArray
    east_metres: FloatArray
    north_metres: FloatArray
    periodic: bool


_PLANE, _LINE = types.float64[:, ::1], types.float64[::1]
_FLOW = types.NamedTuple([_PLANE, _PLANE, _LINE, _LINE, _LINE, _LINE, types.boolean], Flow)  # type: ignore[no-untyped-call]
_PAIR = types.UniTuple(types.float64, 2)  # type: ignore[no-untyped-call]


@njit(_PAIR(_PLANE, types.int64, types.int64, _FLOW), cache=True)
def _step(points: FloatArray, start: int, end: int, flow: Flow) -> Any:
    """Eastward and northward distance from one point of a contour to another, m."""
    x, y = points[0, start], points[1, start]
    end_x, end_y = points[0, end], points[1, end]
    east = interpolate_axis(flow.longitude, end_x, 360.0) - interpolate_axis(flow.longitude, x, 360.0)
    north = interpolate_axis(flow.latitude, end_y, 0.0) - interpolate_axis(flow.latitude, y, 0.0)
    middle = 0.5 * (y + end_y)
    return (
        east * interpolate_axis(flow.east_metres, middle, 0.0),
        north * interpolate_axis(flow.north_metres, middle, 0.0),
    )


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
    east, north = _step(points, n - 1, 0, flow)
    for k in range(n):
        next_east, next_north = _step(points, k, (k + 1) % n, flow)
        before, after = np.hypot(east, north), np.hypot(next_east, next_north)
        # direction of the parabola through three points at the middle one; a plain chord would lean to one side
        x = after**2 * east + before**2 * next_east
        y = after**2 * north + before**2 * next_north
        u = value_on_side(flow.eastward, flow.periodic, points[0, k], points[1, k])
        v = value_on_side(flow.northward, flow.periodic, points[0, k], points[1, k])
        along = (u * x + v * y) / max(np.hypot(x, y), 1e-30)
        weight = 0.5 * (before + after)
        east, north = next_east, next_north
        length += weight
        if not np.isnan(along):
            known += weight
            total += weight * along
    if known == 0.0 or known < 0.5 * length:
        return np.nan, length
    return total / known, length


@njit(
    types.float64(
        _PLANE, types.float64, types.float64, types.int64, types.int64, _FLOW, _PLANE, types.int64[::1],
    ),
    cache=True,
)  # fmt: skip
def _mean_speed(
    field: FloatArray,
    level: float,
    sense: float,
    row: int,
    column: int,
    flow: Flow,
    points: FloatArray,
    crossings: IntArray,
) -> Any:
    """Mean velocity along the contour at a level, positive in the given sense; minus infinity if unknown."""
    n, _ = outer_contour(field, level, row, column, flow.periodic, points, crossings)
    velocity, _ = velocity_along(points, n, flow)
    return -np.inf if np.isnan(velocity) else sense * velocity


@njit(
    _PAIR(
        _PLANE, types.float64, types.float64, types.int64, types.int64, _FLOW, _PLANE, types.int64[::1],
    ),
    cache=True,
)  # fmt: skip
def fastest_level(
    field: FloatArray,
    outer_level: float,
    sense: float,
    row: int,
    column: int,
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
        speed = _mean_speed(field, level, sense, row, column, flow, points, crossings)
        if speed > best_speed:
            best_level, best_speed = level, speed
    ratio = 0.5 * (np.sqrt(5.0) - 1.0)
    low = max(best_level - step, outer_level)
    high = min(best_level + step, outer_level + (_LEVELS - 0.5) * step)
    for _ in range(_GOLDEN_STEPS):
        left, right = high - ratio * (high - low), low + ratio * (high - low)
        left_speed = _mean_speed(field, left, sense, row, column, flow, points, crossings)
        right_speed = _mean_speed(field, right, sense, row, column, flow, points, crossings)
        if left_speed >= right_speed:
            high, level, speed = right, left, left_speed
        else:
            low, level, speed = left, right, right_speed
        if speed > best_speed:
            best_level, best_speed = level, speed
    return best_level, best_speed
