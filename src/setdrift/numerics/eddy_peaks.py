"""Where between the grid points an extreme lies, and how high it is."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


def fit_peaks(field: FloatArray, row: IntArray, column: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Place and value of maxima by a least-squares quadratic on 3 x 3 points.

    Parameters
    ----------
    field : (y, x) array
        Any field.
    row, column : (n,) int array
        Grid points of the maxima, not on the edge; the last column neighbours the first.

    Returns
    -------
    row, column : (n,) array
        Fractional indices of the peaks; the grid points where the quadratic has no maximum within a cell.
    value : (n,) array
        At the peaks, in the units of the field.
    """
    j, i = np.meshgrid([-1, 0, 1], [-1, 0, 1], indexing="ij")
    z = field[row[:, None, None] + j, (column[:, None, None] + i) % field.shape[1]]

    def moment(weight: IntArray) -> FloatArray:
        total: FloatArray = np.sum(weight * z, axis=(1, 2))
        return total

    mean = moment(np.ones_like(i)) / 9.0
    slope_x, slope_y, twist = moment(i) / 6.0, moment(j) / 6.0, moment(i * j) / 4.0
    bend_x, bend_y = moment(i * i) - 6.0 * mean, moment(j * j) - 6.0 * mean
    centre = 5.0 * mean - (moment(i * i) + moment(j * j)) / 3.0
    determinant = bend_x * bend_y - twist**2
    peaked = (bend_x < 0.0) & (determinant > 0.0)
    safe = np.where(peaked, determinant, 1.0)
    x = (twist * slope_y - bend_y * slope_x) / safe
    y = (twist * slope_x - bend_x * slope_y) / safe
    peaked &= (np.abs(x) <= 1.0) & (np.abs(y) <= 1.0)
    value = centre + 0.5 * (slope_x * x + slope_y * y)
    return (
        np.where(peaked, row + y, row),
        np.where(peaked, column + x, column),
        np.where(peaked, value, field[row, column]),
    )
