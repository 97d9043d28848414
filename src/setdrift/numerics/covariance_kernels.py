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


_DEEPEST = -60.0  # exp(-60) is 1e-26: nothing, beside any covariance


@njit("f8(f8)", cache=True, inline="always")
def _exponential(x: float) -> float:
    """Exponential of a number that is not positive, without a call: the compiler can then do several at a time.

    A Taylor polynomial of a 128th of it, squared seven times: right to 2e-12 (measured).

    Parameters
    ----------
    x : float
        At most 0.

    Returns
    -------
    float
        exp(x); exp(-60) below that.
    """
    y = max(x, _DEEPEST) * (1.0 / 128.0)
    high = 1 / 5040 + y * (1 / 40320 + y * (1 / 362880 + y * (1 / 3628800 + y * (1 / 39916800 + y / 479001600))))
    value = 1.0 + y * (1.0 + y * (1 / 2 + y * (1 / 6 + y * (1 / 24 + y * (1 / 120 + y * (1 / 720 + y * high))))))
    # written out: a loop inside the loop over observations would keep the compiler from doing several at a time
    value *= value
    value *= value
    value *= value
    value *= value
    value *= value
    value *= value
    return value * value


@njit("f8(f8, f8, f8, f8)", cache=True, inline="always")
def _mesoscale(east: float, north: float, time: float, variance: float) -> float:
    s_squared = east * east + north * north
    s = math.sqrt(s_squared)
    return variance * (1.0 + s + s_squared * (1.0 - s) * (1 / 6)) * _exponential(-s - time * time)


@njit("f8(f8, f8, f8, f8)", cache=True, inline="always")
def _large_scale(east: float, north: float, time: float, variance: float) -> float:
    return variance * _exponential(-east * east - north * north - time * time)


@njit("f8[:, ::1](f8[:, ::1], f8, f8, f8[::1], i8[::1], i8[::1], f8, f8)", cache=True, error_model="numpy")
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
    at = places
    matrix = np.empty((n, n))
    for i in range(n):
        row = matrix[i]
        a, b, c, d, e, f = at[0, i], at[1, i], at[2, i], at[3, i], at[4, i], at[5, i]
        own_altimeter, own_pass = altimeter[i], pass_number[i]
        for j in range(i, n):
            value = _mesoscale(a - at[0, j], b - at[1, j], c - at[2, j], variance)
            value += _large_scale(d - at[3, j], e - at[4, j], f - at[5, j], large_variance)
            # products of truth values, not branches, keep the loop free of jumps
            shared = altimeter[j] == own_altimeter
            value += bias_variance * shared + long_wave_variance * (shared & (pass_number[j] == own_pass))
            row[j] = value
        row[i] += noise_variance[i]
    return matrix


@njit("f8[:, ::1](f8[:, ::1], f8[:, ::1], f8, f8, f8[::1])", cache=True, error_model="numpy")
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
    at = places
    rows = np.empty((m + 1, n))
    for i in range(m):
        row = rows[i]
        a, b, c, d, e, f = points[0, i], points[1, i], points[2, i], points[3, i], points[4, i], points[5, i]
        for j in range(n):
            near = _mesoscale(a - at[0, j], b - at[1, j], c - at[2, j], variance)
            row[j] = near + _large_scale(d - at[3, j], e - at[4, j], f - at[5, j], large_variance)
    rows[m] = value
    return rows
