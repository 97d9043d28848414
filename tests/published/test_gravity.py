"""Normal gravity on the WGS 84 ellipsoid."""

from __future__ import annotations

import gsw
import numpy as np
import pytest

from setdrift.numerics.earth import WGS84, gravity

WGS84_TABLE = "WGS 84, NGA.STND.0036 (2014), Tables 3.5 and 3.6"


@pytest.mark.source(WGS84_TABLE)
@pytest.mark.parametrize(("latitude", "expected"), [(0.0, 9.7803253359), (90.0, 9.8321849379), (-90.0, 9.8321849379)])
def test_gravity_at_the_equator_and_the_poles(latitude, expected):
    # the published values have ten decimals
    assert gravity(latitude) == pytest.approx(expected, abs=1e-9)


@pytest.mark.source(f"{WGS84_TABLE} (from memory)")
def test_somigliana_constant():
    # ours follows from the two gravities, which are rounded to 1e-10 m s-2: 1e-11 in the constant
    assert WGS84.somigliana_constant == pytest.approx(0.00193185265241, abs=1.1e-11)


@pytest.mark.source("WGS 84 normal gravity at 45 degrees, 9.8061977695 m s-2 (from memory)")
def test_gravity_half_way():
    assert gravity(45.0) == pytest.approx(9.8061977695, abs=1e-9)


@pytest.mark.source("TEOS-10 (IOC et al. 2010), eq. D.1: gsw.grav at the sea surface")
def test_gravity_of_seawater_standard():
    latitude = np.linspace(-90.0, 90.0, 181)
    difference = gravity(latitude) - gsw.grav(latitude, 0.0)
    # TEOS-10 fits normal gravity by a polynomial in sin(lat)^2 with rounded coefficients: measured
    # 2.1e-6 m s-2 apart at most (at 44 degrees), far below the 1e-4 that would matter to a velocity
    assert np.abs(difference).max() < 1e-4
    assert np.abs(difference).max() < 1e-5
