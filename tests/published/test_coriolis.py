"""Coriolis parameter and its meridional gradient."""

from __future__ import annotations

import gsw
import numpy as np
import pytest
from pyproj import Geod

from setdrift.numerics.earth import EARTH_ROTATION_RATE, beta_parameter, coriolis_parameter

LATITUDE = np.linspace(-90.0, 90.0, 721)


@pytest.mark.source("IERS Conventions (2010), Table 1.2; WGS 84, NGA.STND.0036 (2014), Table 3.1")
def test_rotation_rate():
    assert EARTH_ROTATION_RATE == 7.292115e-5


@pytest.mark.source("TEOS-10 (IOC et al. 2010), eq. 3.20.1: gsw.f")
def test_coriolis_parameter_at_all_latitudes():
    # the same formula and rotation rate: only rounding may differ
    np.testing.assert_allclose(coriolis_parameter(LATITUDE), gsw.f(LATITUDE), rtol=1e-6, atol=1e-22)


@pytest.mark.source("Gill (1982), section 7.4: f changes sign across the equator")
def test_sign_across_the_equator():
    np.testing.assert_array_equal(np.sign(coriolis_parameter(LATITUDE)), np.sign(LATITUDE))
    np.testing.assert_allclose(coriolis_parameter(-LATITUDE), -coriolis_parameter(LATITUDE), rtol=1e-15)


@pytest.mark.source("TEOS-10 eq. 3.20.1 differentiated along the WGS 84 meridian by pyproj.Geod")
def test_beta_along_the_meridian():
    latitude = np.arange(-89.0, 89.1, 1.0)
    step = 0.05
    zero = np.zeros_like(latitude)
    _, _, length = Geod(ellps="WGS84").inv(zero, latitude - step, zero, latitude + step)
    gradient = (gsw.f(latitude + step) - gsw.f(latitude - step)) / length
    # centred differences over 0.1 degree are good to step^2 / 6 = 1e-7 of beta
    np.testing.assert_allclose(beta_parameter(latitude), gradient, rtol=1e-6)


@pytest.mark.source("Gill (1982), section 11.4: beta = 2.3e-11 m-1 s-1 on the equator (from memory)")
def test_beta_on_the_equator():
    assert beta_parameter(0.0) == pytest.approx(2.3e-11, rel=0.01)
