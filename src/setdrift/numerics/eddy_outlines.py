"""The outermost contour round a maximum that is fit to bound an eddy."""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numba import njit, types
from numpy.typing import NDArray

from setdrift.numerics.eddy_contours import count_enclosed, outer_contour
from setdrift.numerics.eddy_geometry import area_and_misfit, project_points

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_LEVELS = 32  # tried inwards from the closing level before bisecting
_BISECTIONS = 6

TOO_SMALL, UNFIT, FIT = -1, 0, 1


class Bounds(NamedTuple):
    """What an outline must keep to, and the sphere it is measured on.

    Attributes
    ----------
    minimum_area, maximum_area : float
        m2.
    minimum_cells : float
        Grid points enclosed.
    maximum_misfit : float
        Of the outline to the circle of its area.
    dip : float
        How far below the outline's level a point inside may lie, m.
    radius : float
        Of the authalic sphere, m.
    """

    minimum_area: float
    maximum_area: float
    minimum_cells: float
    maximum_misfit: float
    dip: float
    radius: float


class Buffers(NamedTuple):
    """Room that the search writes to, made by `contour_buffers`.

    Attributes
    ----------
    points, plane : (2, m) array
        A contour in fractional (column, row) and in metres.
    crossings : (m,) int array
        Where it crosses rows of the grid.
    """

    points: FloatArray
    plane: FloatArray
    crossings: IntArray


_PLANE, _LINE = types.float64[:, ::1], types.float64[::1]
_BOUNDS = types.NamedUniTuple(types.float64, 6, Bounds)  # type: ignore[no-untyped-call]
_BUFFERS = types.NamedTuple([_PLANE, _PLANE, types.int64[::1]], Buffers)  # type: ignore[no-untyped-call]


@njit(
    types.int64(
        _PLANE, _LINE, _LINE, types.boolean, types.float64, types.int64, types.int64, _BOUNDS, _BUFFERS
    ),
    cache=True,
)  # fmt: skip
def _judge(
    field: FloatArray,
    longitude: FloatArray,
    authalic_latitude: FloatArray,
    periodic: bool,
    level: float,
    row: int,
    column: int,
    bounds: Bounds,
    buffers: Buffers,
) -> Any:
    """Whether a contour may bound an eddy: FIT, UNFIT (one further in may) or TOO_SMALL (none may)."""
    n, crossed = outer_contour(field, level, row, column, periodic, buffers.points, buffers.crossings)
    if n == 0:
        return UNFIT
    count = count_enclosed(field, buffers.crossings[:crossed], level - bounds.dip)
    if count == 0:
        return UNFIT
    if count < bounds.minimum_cells:
        return TOO_SMALL
    project_points(buffers.points, n, authalic_latitude, longitude, row, column, bounds.radius, buffers.plane)
    area, misfit = area_and_misfit(buffers.plane, n)
    if area < bounds.minimum_area:
        return TOO_SMALL
    return FIT if area <= bounds.maximum_area and misfit <= bounds.maximum_misfit else UNFIT


@njit(
    types.float64(
        _PLANE, _LINE, _LINE, types.boolean, types.float64, types.float64, types.int64, types.int64, _BOUNDS,
        _BUFFERS,
    ),
    cache=True,
)  # fmt: skip
def outermost_level(
    field: FloatArray,
    longitude: FloatArray,
    authalic_latitude: FloatArray,
    periodic: bool,
    closing_level: float,
    innermost_level: float,
    row: int,
    column: int,
    bounds: Bounds,
    buffers: Buffers,
) -> Any:
    """Level of the outermost contour round a maximum that is fit to bound an eddy.

    Steps inwards from the closing level to the innermost one, and bisects between the first fit level and the
    one outside it.

    Parameters
    ----------
    field : (y, x) array
        m; NaN where there is no data.
    longitude, authalic_latitude : (x,), (y,) array
        Degrees.
    periodic : bool
        The last column neighbours the first.
    closing_level, innermost_level : float
        m; where the search begins and ends.
    row, column : int
        Grid point of the maximum.
    bounds : Bounds
        What the outline must keep to.
    buffers : Buffers
        Room to work in.

    Returns
    -------
    float
        m; NaN if no contour is fit.
    """
    step = (innermost_level - closing_level) / _LEVELS
    for k in range(_LEVELS + 1):
        fit = closing_level + k * step
        verdict = _judge(field, longitude, authalic_latitude, periodic, fit, row, column, bounds, buffers)
        if verdict == TOO_SMALL:
            return np.nan
        if verdict == FIT:
            break
    if verdict != FIT:
        return np.nan
    if k == 0:
        return fit
    unfit = fit - step
    for _ in range(_BISECTIONS):
        level = 0.5 * (fit + unfit)
        verdict = _judge(field, longitude, authalic_latitude, periodic, level, row, column, bounds, buffers)
        if verdict == FIT:
            fit = level
        else:
            unfit = level
    return fit
