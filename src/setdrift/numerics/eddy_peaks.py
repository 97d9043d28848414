"""Where between the grid points an extreme lies, and how high it is."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


def fit_peaks(field: FloatArray, row: IntArray, column: IntArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Place and value of maxima between 3 x 3 points.

    The place is the vertex of the least-squares quadratic, which noise moves little; the value is that of the
    parabolas through the points, which flatten a sharp peak less than the quadratic.

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
    determinant = bend_x * bend_y - twist**2
    peaked = (bend_x < 0.0) & (determinant > 0.0)
    safe = np.where(peaked, determinant, 1.0)
    x = (twist * slope_y - bend_y * slope_x) / safe
    y = (twist * slope_x - bend_x * slope_y) / safe
    peaked &= (np.abs(x) <= 1.0) & (np.abs(y) <= 1.0)
    x, y = np.where(peaked, x, 0.0), np.where(peaked, y, 0.0)
    return row + y, column + x, np.einsum("nj,ni,nji->n", _parabola_weights(y), _parabola_weights(x), z)


def _parabola_weights(offset: FloatArray) -> FloatArray:
    """Weights (n, 3) of three points in a row for the parabola through them, at an offset from the middle one."""
    return np.stack([0.5 * offset * (offset - 1.0), 1.0 - offset**2, 0.5 * offset * (offset + 1.0)], axis=1)
