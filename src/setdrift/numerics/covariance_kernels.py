"""Compiled loops that fill covariance matrices: the part of the mapping that plain numpy is too slow for.

Signatures are fixed, so that the kernels are compiled once, when the project is set up.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]


@njit("f8(f8[:, ::1], i8, f8[:, ::1], i8, f8, f8)", cache=True, inline="always")
def _covariance(a: Floats, i: int, b: Floats, j: int, variance: float, large_variance: float) -> float:
    east, north, time = a[0, i] - b[0, j], a[1, i] - b[1, j], a[2, i] - b[2, j]
    s_squared = east * east + north * north
    s = math.sqrt(s_squared)
    value: float = variance * (1.0 + s + s_squared * (1.0 - s) / 6.0) * math.exp(-s - time * time)
    if large_variance > 0.0:
        east, north, time = a[3, i] - b[3, j], a[4, i] - b[4, j], a[5, i] - b[5, j]
        value += large_variance * math.exp(-east * east - north * north - time * time)
    return value


@njit("f8[:, ::1](f8[:, ::1], f8, f8, f8[::1], i8[::1], i8[::1], f8, f8)", cache=True)
def fill_observation_covariance(
    places: Floats,
    variance: float,
    large_variance: float,
    noise_variance: Floats,
    altimeter: Integers,
    pass_number: Integers,
    long_wave_variance: float,
    bias_variance: float,
) -> Floats:
    """Covariance of observations with one another, signal and error.

    Parameters
    ----------
    places : (6, n) array
        Scaled coordinates (`Covariance.scaled`).
    variance, large_variance : float
        Signal variance of the mesoscale and the large-scale part, m2.
    noise_variance : (n,) array
        White noise, m2.
    altimeter, pass_number : (n,) integer array
        Observations of one altimeter share its bias; those of one pass its long-wave error too.
    long_wave_variance, bias_variance : float
        Their variances, m2.

    Returns
    -------
    (n, n) array
        m2; only the upper triangle is filled, the rest is undefined.
    """
    n = places.shape[1]
    matrix = np.empty((n, n))
    for i in range(n):
        for j in range(i, n):
            value = _covariance(places, i, places, j, variance, large_variance)
            if altimeter[i] == altimeter[j]:
                value += bias_variance
                if pass_number[i] == pass_number[j]:
                    value += long_wave_variance
            matrix[i, j] = value
        matrix[i, i] += noise_variance[i]
    return matrix


@njit("f8[:, ::1](f8[:, ::1], f8[:, ::1], f8, f8, f8[::1])", cache=True)
def fill_cross_covariance(
    places: Floats, points: Floats, variance: float, large_variance: float, value: Floats
) -> Floats:
    """Covariance of the sea level at points with the observations, and the observed values as a last row.

    Parameters
    ----------
    places : (6, n) array
        Scaled coordinates of the observations.
    points : (6, m) array
        Scaled coordinates of the points.
    variance, large_variance : float
        Signal variance of the mesoscale and the large-scale part, m2.
    value : (n,) array
        Observed values, m.

    Returns
    -------
    (m + 1, n) array
        m2 in the first m rows, m in the last.
    """
    m, n = points.shape[1], places.shape[1]
    rows = np.empty((m + 1, n))
    for i in range(m):
        for j in range(n):
            rows[i, j] = _covariance(points, i, places, j, variance, large_variance)
    rows[m] = value
    return rows
