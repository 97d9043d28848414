"""Where the closed contour round each maximum of a field stops growing: one sorted flood.

Grid points are taken from the highest down and joined to their neighbours (a component tree: Salembier,
Oliveras and Garrido 1998). Each component is known by its highest point. It is settled, for good, at the level
at which it meets another component that stands out as well, the edge of the grid, or a missing value: below
that level no closed contour holds this maximum alone.
"""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]
BoolArray = NDArray[np.bool_]


class Maxima(NamedTuple):
    """Maxima that stand out, in the order of their grid points.

    Attributes
    ----------
    row, column : (n,) int array
        Grid point of each maximum.
    closing_level : (n,) array
        Lowest level whose contour holds this maximum alone, in the units of the field.
    """

    row: IntArray
    column: IntArray
    closing_level: FloatArray


def find_maxima(field: FloatArray, minimum_prominence: float, *, periodic: bool = False) -> Maxima:
    """Maxima of a field and the level at which the contour round each of them stops being closed.

    Two grid points that touch by an edge are connected above the lower of them; two that touch by a corner,
    also above the lower of them or the mean of the four points of that cell, whichever is lower, as the contour is
    drawn there.

    Parameters
    ----------
    field : (y, x) array
        Any field; NaN where there is no data.
    minimum_prominence : float
        A maximum that stands out from the saddle towards a higher one by no more than this is ignored, in the
        units of the field.
    periodic : bool
        The last column neighbours the first.

    Returns
    -------
    Maxima
        One entry for each maximum that stands out.

    References
    ----------
    Salembier, Oliveras and Garrido (1998), Antiextensive connected operators for image and sequence processing.
    """
    size = field.size
    corners, joints = _saddle_cells(field, periodic)
    values = np.concatenate([np.ascontiguousarray(field, dtype=np.float64).ravel(), joints])
    elements = np.flatnonzero(np.isfinite(values))
    order = elements[np.argsort(-values[elements], kind="stable")]
    settled = ~_surrounded(field, periodic).ravel()
    closing = np.full(size, np.nan)
    _flood(values, order, corners, settled, field.shape[1], periodic, minimum_prominence, closing)
    points = np.flatnonzero(np.isfinite(closing))
    row, column = np.divmod(points, field.shape[1])
    return Maxima(row, column, closing[points])


def _surrounded(field: FloatArray, periodic: bool) -> BoolArray:
    """Whether a point and its eight neighbours all hold data; (y, x)."""
    present = np.pad(np.isfinite(field), ((1, 1), (0, 0)))
    present = np.pad(present, ((0, 0), (1, 1)), mode="wrap") if periodic else np.pad(present, ((0, 0), (1, 1)))
    zonal = present[:, :-2] & present[:, 1:-1] & present[:, 2:]
    surrounded: BoolArray = zonal[:-2] & zonal[1:-1] & zonal[2:]
    return surrounded


def _saddle_cells(field: FloatArray, periodic: bool) -> tuple[IntArray, FloatArray]:
    """Corners (n, 4) of cells with one diagonal above the other, and the level that joins that diagonal."""
    points = np.arange(field.size).reshape(field.shape)
    if periodic:
        field, points = (np.concatenate([a, a[:, :1]], axis=1) for a in (field, points))
    south_west, south_east, north_west, north_east = field[:-1, :-1], field[:-1, 1:], field[1:, :-1], field[1:, 1:]
    lower, upper = np.minimum(south_west, north_east), np.maximum(south_west, north_east)
    other = np.minimum(south_east, north_west)
    ambiguous = (lower > np.maximum(south_east, north_west)) | (upper < other)
    row, column = np.nonzero(ambiguous)
    # the sum in pairs of diagonals, as in the contour kernel: equal to the last bit, and under reflection too
    mean = 0.25 * ((south_west + north_east) + (south_east + north_west))
    corners = [points[row, column], points[row, column + 1], points[row + 1, column + 1], points[row + 1, column]]
    joint = np.minimum(mean, np.maximum(lower, other))
    return np.stack(corners, axis=1).astype(np.int64), joint[row, column]


@njit("i8(i8[::1], i8)", cache=True)
def _root(parent: IntArray, point: int) -> Any:
    """Highest point of the component that holds `point`."""
    while parent[point] != point:
        parent[point] = parent[parent[point]]
        point = parent[point]
    return point


@njit("void(i8, i8, f8, f8[::1], i8[::1], b1[::1], f8, f8[::1])", cache=True)
def _join(
    first: int,
    second: int,
    level: float,
    values: FloatArray,
    parent: IntArray,
    settled: BoolArray,
    minimum_prominence: float,
    closing: FloatArray,
) -> None:
    """Join the components of two points at a level; settle both unless one is a mere bump on the other."""
    higher, lower = _root(parent, first), _root(parent, second)
    if higher == lower:
        return
    if values[lower] > values[higher] or (values[lower] == values[higher] and lower < higher):
        higher, lower = lower, higher
    if settled[higher] or settled[lower] or values[lower] - level > minimum_prominence:
        for point in (higher, lower):
            if not settled[point] and values[point] - level > minimum_prominence:
                closing[point] = level
        settled[higher] = True
    parent[lower] = higher


@njit("void(f8[::1], i8[::1], i8[:, ::1], b1[::1], i8, b1, f8, f8[::1])", cache=True)
def _flood(
    values: FloatArray,
    order: IntArray,
    corners: IntArray,
    settled: BoolArray,
    columns: int,
    periodic: bool,
    minimum_prominence: float,
    closing: FloatArray,
) -> None:
    """Add points (and saddle cells, numbered after them) from the highest down; fills `closing` at the maxima."""
    size = closing.size
    parent = np.full(size, -1, np.int64)
    for element in order:
        level = values[element]
        if element >= size:
            corner = corners[element - size]
            for k in range(1, 4):
                if parent[corner[0]] >= 0 and parent[corner[k]] >= 0:
                    _join(corner[0], corner[k], level, values, parent, settled, minimum_prominence, closing)
            if parent[corner[1]] >= 0 and parent[corner[3]] >= 0:
                _join(corner[1], corner[3], level, values, parent, settled, minimum_prominence, closing)
            continue
        parent[element] = element
        column = element % columns
        west = element - 1 if column > 0 else (element + columns - 1 if periodic else -1)
        east = element + 1 if column < columns - 1 else (element - columns + 1 if periodic else -1)
        for neighbour in (west, east, element - columns, element + columns):
            if 0 <= neighbour < size and parent[neighbour] >= 0:
                _join(element, neighbour, level, values, parent, settled, minimum_prominence, closing)
