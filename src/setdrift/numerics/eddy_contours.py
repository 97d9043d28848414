"""Contours of a gridded field: followed from cell to cell, and what they enclose.

A contour is a chain of points where the field, linear along each side of a grid cell, equals the level. It is
followed with higher values on its left, so that it runs anticlockwise round a maximum. Where both diagonals of
a cell disagree, the mean of its four corners decides, as is common in contouring. Points are given as
fractional column (x) and row (y); columns run on beyond the seam of a periodic grid.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


def contour_buffers(shape: tuple[int, int]) -> tuple[FloatArray, IntArray]:
    """Room for the longest contour of a grid: points (2, m), and crossings of rows (m,).

    Parameters
    ----------
    shape : tuple of int
        Rows and columns of the grid.

    Returns
    -------
    points : (2, m) array
        For the x and y of a contour's points.
    crossings : (m,) int array
        For the places where a contour crosses rows of the grid.
    """
    longest = 2 * shape[0] * shape[1] + 2  # a contour passes through a cell at most twice
    return np.empty((2, longest)), np.empty(longest, dtype=np.int64)


@njit("i8(UniTuple(f8, 4), i8, f8, f8)", cache=True)
def _exit_side(corners: tuple[float, float, float, float], entry: int, mean: float, level: float) -> Any:
    """Side by which a contour leaves a cell that it entered by side `entry`, with higher values on its left."""
    # corners and sides go anticlockwise from the south-west and the south; side k joins corners k and k + 1
    before = corners[(entry + 3) % 4] > level
    opposite = corners[(entry + 2) % 4] > level
    if before:
        return (entry + 1) % 4 if opposite else (entry + 2) % 4
    if opposite and mean > level:
        return (entry + 1) % 4
    return (entry + 3) % 4


@njit("UniTuple(i8, 2)(f8[:, ::1], f8, i8, i8, b1, f8[:, ::1], i8[::1])", cache=True)
def follow_contour(
    field: FloatArray,
    level: float,
    row: int,
    column: int,
    periodic: bool,
    points: FloatArray,
    crossings: IntArray,
) -> Any:
    """Follow the contour that crosses a row just east of a point above the level.

    Parameters
    ----------
    field : (y, x) array
        Values; NaN where missing.
    level : float
        Value of the contour, in the units of the field.
    row, column : int
        The point; the one east of it is not above the level.
    periodic : bool
        The last column neighbours the first.
    points, crossings : array
        Buffers to fill, see `contour_buffers`. A crossing of a row is coded as
        ``4 columns row + columns + column``, the column being the one west of it.

    Returns
    -------
    n, crossed : int
        How many points and crossings; both 0 if the contour meets the edge of the grid or a missing value, or
        goes round a periodic grid.
    """
    rows, columns = field.shape
    j, i, side, crossed = row, column, 0, 0
    for n in range(points.shape[1]):
        if j < 0 or j >= rows - 1 or (not periodic and (i < 0 or i >= columns - 1)):
            return 0, 0
        if i < -columns or i >= 2 * columns:
            return 0, 0  # more than once round the globe
        west, east = i % columns, (i + 1) % columns
        corners = (field[j, west], field[j, east], field[j + 1, east], field[j + 1, west])
        mean = 0.25 * ((corners[0] + corners[2]) + (corners[1] + corners[3]))
        if np.isnan(mean):
            return 0, 0
        # always from the western or southern end, so that both cells of a side find the same point
        low, high = (side, (side + 1) % 4) if side < 2 else ((side + 1) % 4, side)
        part = (level - corners[low]) / (corners[high] - corners[low])
        if side % 2 == 0:
            points[0, n], points[1, n] = i + part, j + side // 2
            crossings[crossed] = 4 * columns * (j + side // 2) + columns + i
            crossed += 1
        else:
            points[0, n], points[1, n] = i + (3 - side) // 2, j + part
        leave = _exit_side(corners, side, mean, level)
        j += (leave == 2) - (leave == 0)
        i += (leave == 1) - (leave == 3)
        side = (leave + 2) % 4
        if side == 0 and j == row and (i - column) % columns == 0:
            return (n + 1, crossed) if i == column else (0, 0)
    return 0, 0


@njit("b1(i8[::1], i8, i8, i8)", cache=True)
def _encloses(crossings: IntArray, columns: int, row: int, column: int) -> Any:
    """Whether a closed contour holds a grid point: an odd number of crossings to its east."""
    first = 4 * columns * row + columns + column
    east = 0
    for crossing in crossings:
        east += first <= crossing < first - column + 3 * columns
    return east % 2 == 1


@njit("UniTuple(i8, 2)(f8[:, ::1], f8, i8, i8, b1, f8[:, ::1], i8[::1])", cache=True)
def outer_contour(
    field: FloatArray,
    level: float,
    row: int,
    column: int,
    periodic: bool,
    points: FloatArray,
    crossings: IntArray,
) -> Any:
    """Follow the contour round all that is connected to a point above the level.

    Goes east from the point and tries each contour met on the way, for the first may bound a dip inside.

    Parameters
    ----------
    field, level, row, column, periodic, points, crossings
        As in `follow_contour`; the point is above the level.

    Returns
    -------
    n, crossed : int
        As from `follow_contour`; both 0 if there is no closed contour round the point.
    """
    columns = field.shape[1]
    i = column
    for _ in range(columns):
        if not periodic and i >= columns - 1:
            return 0, 0
        here, following = field[row, i % columns], field[row, (i + 1) % columns]
        if here > level and not following > level:
            n, crossed = follow_contour(field, level, row, i, periodic, points, crossings)
            if n == 0 or _encloses(crossings[:crossed], columns, row, column):
                return n, crossed
        i += 1
    return 0, 0


@njit("i8(f8[:, ::1], i8[::1], f8)", cache=True)
def count_enclosed(field: FloatArray, crossings: IntArray, floor: float) -> Any:
    """Count the grid points inside a closed contour.

    Parameters
    ----------
    field : (y, x) array
        Values; NaN where missing.
    crossings : (m,) int array
        Of the contour, from `follow_contour`; sorted in place.
    floor : float
        Value that all points inside must exceed.

    Returns
    -------
    int
        Number of points; 0 if one of them is missing or not above the floor.
    """
    # along a row the sorted crossings lead in and out by turns
    columns = field.shape[1]
    crossings.sort()
    count = 0
    for k in range(0, crossings.size - 1, 2):
        row = crossings[k] // (4 * columns)
        before = crossings[k] % (4 * columns) - columns
        last = crossings[k + 1] % (4 * columns) - columns
        for i in range(before + 1, last + 1):
            if not field[row, i % columns] > floor:
                return 0
        count += last - before
    return count


@njit("f8(f8[:, ::1], b1, f8, f8)", cache=True)
def value_on_side(values: FloatArray, periodic: bool, x: float, y: float) -> Any:
    """Value at a point on a side of a grid cell: of the cubic through the four grid points in line with it.

    Parameters
    ----------
    values : (y, x) array
        On the grid; NaN where missing.
    periodic : bool
        The last column neighbours the first.
    x, y : float
        Fractional column and row, one of them whole.

    Returns
    -------
    float
        Linear between the ends of the side if one of the other two points is missing; NaN if an end is.
    """
    rows, columns = values.shape
    j, i = int(np.floor(y)), int(np.floor(x))
    east, north = (1, 0) if x > i else (0, 1)
    part = (x - i) + (y - j)
    start = values[j, i % columns]
    if part == 0.0:
        return start
    end = values[j + north, (i + east) % columns]
    linear = start + part * (end - start)
    if j < north or j + 2 * north >= rows or (not periodic and (i < east or i + 2 * east >= columns)):
        return linear
    before = values[j - north, (i - east) % columns]
    after = values[j + 2 * north, (i + 2 * east) % columns]
    bend = (2.0 - part) * (before - 2.0 * start + end) + (1.0 + part) * (start - 2.0 * end + after)
    return linear if np.isnan(bend) else linear - part * (1.0 - part) * bend / 6.0
