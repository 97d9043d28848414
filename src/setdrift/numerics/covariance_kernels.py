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


@njit("f8(f8, f8)", cache=True, inline="always")
def _correlation(distance_squared: float, time_squared: float) -> float:
    s = math.sqrt(distance_squared)
    shape = 1.0 + s + distance_squared * (1.0 - s) / 6.0
    return shape * math.exp(-s - time_squared)


@njit("f8[:, ::1](f8[::1], f8[::1], f8[::1], f8, f8[::1], i8[::1], i8[::1], f8, f8)", cache=True)
def fill_observation_covariance(
    east: Floats,
    north: Floats,
    time: Floats,
    variance: float,
    noise_variance: Floats,
    altimeter: Integers,
    pass_number: Integers,
    long_wave_variance: float,
    bias_variance: float,
) -> Floats:
    """Covariance of observations with one another, signal and error.

    Parameters
    ----------
    east, north, time : (n,) array
        Scaled coordinates (`Covariance.scaled`).
    variance : float
        Signal variance, m2.
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
    n = east.size
    matrix = np.empty((n, n))
    for i in range(n):
        for j in range(i, n):
            de, dn, dt = east[i] - east[j], north[i] - north[j], time[i] - time[j]
            value = variance * _correlation(de * de + dn * dn, dt * dt)
            if altimeter[i] == altimeter[j]:
                value += bias_variance
                if pass_number[i] == pass_number[j]:
                    value += long_wave_variance
            matrix[i, j] = value
        matrix[i, i] += noise_variance[i]
    return matrix


@njit("f8[:, ::1](f8[::1], f8[::1], f8[::1], f8[::1], f8[::1], f8[::1], f8, f8[::1])", cache=True)
def fill_cross_covariance(
    east: Floats,
    north: Floats,
    time: Floats,
    point_east: Floats,
    point_north: Floats,
    point_time: Floats,
    variance: float,
    value: Floats,
) -> Floats:
    """Covariance of the sea level at points with the observations, and the observed values as a last row.

    Parameters
    ----------
    east, north, time : (n,) array
        Scaled coordinates of the observations.
    point_east, point_north, point_time : (m,) array
        Scaled coordinates of the points.
    variance : float
        Signal variance, m2.
    value : (n,) array
        Observed values, m.

    Returns
    -------
    (m + 1, n) array
        m2 in the first m rows, m in the last.
    """
    m, n = point_east.size, east.size
    rows = np.empty((m + 1, n))
    for i in range(m):
        for j in range(n):
            de, dn, dt = point_east[i] - east[j], point_north[i] - north[j], point_time[i] - time[j]
            rows[i, j] = variance * _correlation(de * de + dn * dn, dt * dt)
    rows[m] = value
    return rows
