"""The compiled covariance loops against the same sums in plain numpy."""

from __future__ import annotations

import numpy as np
import pytest

from setdrift.numerics.covariance import Covariance
from setdrift.numerics.covariance_kernels import fill_cross_covariance, fill_observation_covariance

COUNT = 60
RNG = np.random.default_rng(7)
PLACES = RNG.normal(0.0, [[150.0], [150.0], [8.0]], (3, COUNT))
POINTS = RNG.normal(0.0, [[50.0], [50.0], [0.0]], (3, 9))
NOISE = RNG.uniform(1e-4, 9e-4, COUNT)
ALTIMETER = RNG.integers(0, 3, COUNT)
PASS_NUMBER = RNG.integers(0, 4, COUNT)
COVARIANCES = [Covariance(0.01, 0.0, 160.0, 140.0, 15.0, -3.0), Covariance(0.01, 0.004, 160.0, 140.0, 15.0, -3.0)]


def scaled(covariance, places):
    return np.ascontiguousarray(covariance.scaled(*places))


def filled(covariance, noise=NOISE, long_wave=0.0, bias=0.0):
    variances = covariance.variance, covariance.large_variance
    places = scaled(covariance, PLACES)
    upper = np.triu(fill_observation_covariance(places, *variances, noise, ALTIMETER, PASS_NUMBER, long_wave, bias))
    return upper + np.triu(upper, 1).T


def signal(covariance, a, b):
    return covariance(*(a[:, :, None] - b[:, None, :]))


@pytest.mark.parametrize("covariance", COVARIANCES)
def test_signal_and_noise(covariance):
    expected = signal(covariance, PLACES, PLACES) + np.diag(NOISE)
    np.testing.assert_allclose(filled(covariance), expected, rtol=1e-10, atol=1e-16)


def test_bias_is_shared_by_an_altimeter():
    added = filled(COVARIANCES[0], bias=4e-4) - filled(COVARIANCES[0])
    np.testing.assert_allclose(added, 4e-4 * (ALTIMETER[:, None] == ALTIMETER), atol=1e-16)


def test_long_wave_error_is_shared_by_a_pass_of_one_altimeter_only():
    added = filled(COVARIANCES[0], long_wave=4e-4) - filled(COVARIANCES[0])
    same = (ALTIMETER[:, None] == ALTIMETER) & (PASS_NUMBER[:, None] == PASS_NUMBER)
    assert 0 < np.triu(same, 1).sum() < np.triu(PASS_NUMBER[:, None] == PASS_NUMBER, 1).sum()
    np.testing.assert_allclose(added, 4e-4 * same, atol=1e-16)


@pytest.mark.parametrize("covariance", COVARIANCES)
def test_matrix_is_positive_definite(covariance):
    eigenvalues = np.linalg.eigvalsh(filled(covariance, long_wave=4e-4, bias=4e-4))
    assert eigenvalues.min() >= NOISE.min() * (1.0 - 1e-9)


@pytest.mark.parametrize("covariance", COVARIANCES)
def test_cross_covariance_and_values(covariance):
    value = RNG.normal(size=COUNT)
    variances = covariance.variance, covariance.large_variance
    rows = fill_cross_covariance(scaled(covariance, PLACES), scaled(covariance, POINTS), *variances, value)
    np.testing.assert_allclose(rows[:-1], signal(covariance, POINTS, PLACES), rtol=1e-10, atol=1e-16)
    np.testing.assert_array_equal(rows[-1], value)


def test_no_observations_make_empty_matrices():
    nothing = np.zeros((6, 0))
    none = np.zeros(0, dtype=np.int64)
    assert fill_observation_covariance(nothing, 1.0, 0.0, np.zeros(0), none, none, 0.0, 0.0).shape == (0, 0)
    assert fill_cross_covariance(nothing, np.zeros((6, 4)), 1.0, 0.0, np.zeros(0)).shape == (5, 0)
