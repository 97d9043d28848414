"""The covariance of sea level: its laws, its scales by latitude and the drift of its pattern."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.covariance import (
    LARGE_MERIDIONAL_KM,
    LARGE_TIME_DAYS,
    LARGE_ZONAL_KM,
    Covariance,
    CovarianceModel,
    built_in_scales,
    correlation,
    long_wave_drift,
)

MESOSCALE = Covariance(0.01, 0.0, 160.0, 140.0, 15.0, -3.0)
BOTH = Covariance(0.01, 0.004, 160.0, 140.0, 15.0, -3.0)
LARGE = Covariance(0.0, 0.004, 160.0, 140.0, 15.0, -3.0)

quickly = settings(deadline=None, derandomize=True, max_examples=100)
kilometres = st.floats(-3000.0, 3000.0)
days = st.floats(-60.0, 60.0)


def test_correlation_at_no_lag_is_one():
    assert correlation(0.0, 0.0) == 1.0


def test_correlation_broadcasts():
    assert correlation(np.ones((3, 1)), np.ones(4)).shape == (3, 4)


@pytest.mark.parametrize("covariance", [MESOSCALE, BOTH, LARGE])
def test_covariance_at_no_lag_is_the_prior_variance(covariance):
    assert covariance(0.0, 0.0, 0.0) == pytest.approx(covariance.prior_variance, rel=1e-15)


def test_prior_variance_is_the_sum_of_both_parts():
    assert BOTH.prior_variance == pytest.approx(0.014, rel=1e-15)


@quickly
@given(x=kilometres, y=kilometres, t=days)
def test_covariance_is_symmetric(x, y, t):
    assert BOTH(x, y, t) == BOTH(-x, -y, -t)


@quickly
@given(x=kilometres, y=kilometres, t=days)
def test_covariance_is_never_above_the_variance(x, y, t):
    assert abs(BOTH(x, y, t)) <= BOTH.prior_variance


@quickly
@given(x=kilometres, y=kilometres, t=days)
def test_north_and_south_are_alike(x, y, t):
    assert BOTH(x, y, t) == BOTH(x, -y, t)


@quickly
@given(x=kilometres, y=kilometres, t=days)
def test_drift_carries_the_mesoscale_pattern(x, y, t):
    faded = MESOSCALE(x, y, 0.0) * np.exp(-((t / 15.0) ** 2))
    np.testing.assert_allclose(MESOSCALE(x - 3.0 * t, y, t), faded, rtol=1e-9, atol=1e-15)


def test_westward_drift_puts_the_later_maximum_in_the_west():
    x = np.arange(-100.0, 101.0, 5.0)
    later = MESOSCALE(x, np.zeros_like(x), np.full_like(x, 10.0))
    assert x[np.argmax(later)] == -30.0


def test_the_large_scale_does_not_drift():
    assert LARGE(500.0, 0.0, 10.0) == LARGE(-500.0, 0.0, 10.0)


@pytest.mark.parametrize("lag", [(LARGE_ZONAL_KM, 0, 0), (0, LARGE_MERIDIONAL_KM, 0), (0, 0, LARGE_TIME_DAYS)])
def test_the_large_scale_falls_to_one_over_e(lag):
    assert LARGE(*lag) == pytest.approx(0.004 / np.e)


@pytest.mark.parametrize(("x", "y"), [(160.0, 0.0), (0.0, 140.0)])
def test_mesoscale_crosses_zero_at_its_scale(x, y):
    # 3.34 is the root to three digits: the slope there is -0.13 per scaled unit, so the value is below 1e-3
    assert abs(MESOSCALE(x, y, 0.0)) < 1e-3 * MESOSCALE.variance
    assert MESOSCALE(0.99 * x, 0.99 * y, 0.0) > 0.0
    assert MESOSCALE(1.01 * x, 1.01 * y, 0.0) < 0.0


def test_scaled_coordinates_give_the_covariance_between_places():
    rng = np.random.default_rng(1)
    x, y, t = rng.normal(0.0, [[150.0], [150.0], [8.0]], (3, 40))
    scaled = BOTH.scaled(x, y, t)
    lag = scaled[:, :, None] - scaled[:, None, :]
    mesoscale = 0.01 * correlation(lag[0] ** 2 + lag[1] ** 2, lag[2] ** 2)
    large = 0.004 * np.exp(-(lag[3] ** 2) - lag[4] ** 2 - lag[5] ** 2)
    direct = BOTH(x[:, None] - x, y[:, None] - y, t[:, None] - t)
    np.testing.assert_allclose(mesoscale + large, direct, rtol=1e-9, atol=1e-16)


def test_model_takes_its_scales_from_the_table_or_from_the_caller():
    built_in = CovarianceModel(0.1, 15.0).at(20.0)
    assert (built_in.zonal_scale, built_in.meridional_scale) == (230.0, 210.0)
    chosen = CovarianceModel(0.1, 15.0, zonal_scale=120.0, meridional_scale=110.0, zonal_drift=0.0).at(20.0)
    assert (chosen.zonal_scale, chosen.meridional_scale, chosen.zonal_drift) == (120.0, 110.0, 0.0)


def test_model_squares_its_deviations():
    model = CovarianceModel(0.3, 15.0, 0.4)
    assert model.prior_standard_deviation == pytest.approx(0.5)
    assert model.at(10.0).prior_variance == pytest.approx(0.25)


@quickly
@given(latitude=st.floats(0.0, 90.0))
def test_hemispheres_are_alike(latitude):
    model = CovarianceModel(0.1, 15.0)
    assert model.at(latitude) == model.at(-latitude)


def test_scales_shrink_poleward_and_are_longer_along_the_equator():
    zonal, meridional = built_in_scales(np.arange(0.0, 90.1, 0.5))
    assert np.all(np.diff(zonal) < 0.0)
    assert np.all(np.diff(meridional) < 0.0)
    assert np.all(zonal >= meridional)


def test_drift_is_westward_everywhere_but_at_the_poles_and_bounded():
    drift = long_wave_drift(np.arange(-89.0, 89.1, 0.5))
    assert np.all(drift < 0.0)
    assert drift.min() == pytest.approx(-0.15 * 86.4)
    assert long_wave_drift(90.0) == pytest.approx(0.0, abs=1e-9)


def test_drift_slows_poleward_of_its_bound():
    drift = long_wave_drift(np.arange(15.0, 90.1, 0.5))
    assert np.all(np.diff(drift) > 0.0)


@pytest.mark.parametrize("latitude", [30.0, 45.0, 60.0])
def test_drift_at_mid_latitudes_is_the_long_rossby_wave(latitude):
    rotation, radius = 7.292115e-5, 6.371e6
    phi = np.deg2rad(latitude)
    beta, f = 2.0 * rotation * np.cos(phi) / radius, 2.0 * rotation * np.sin(phi)
    # the term that joins it to the equatorial speed takes off 3 beta c / f^2: 2.8 % at 30 degrees, less beyond
    assert long_wave_drift(latitude) == pytest.approx(-beta * 2.5**2 / f**2 * 86.4, rel=0.035)
