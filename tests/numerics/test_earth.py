"""The earth model's own consistency; outside values are in tests/published."""

from __future__ import annotations

import numpy as np
import pytest

from setdrift.numerics.earth import (
    beta_parameter,
    coriolis_parameter,
    gravity,
    meridional_radius,
    metres_per_degree,
    spherical_earth,
    transverse_radius,
)

LATITUDE = np.linspace(-90.0, 90.0, 181)
SPHERE = spherical_earth(6.371e6, 9.81, rotation_rate=7.0e-5)


def test_sphere_has_one_radius_and_one_gravity():
    np.testing.assert_allclose(meridional_radius(LATITUDE, SPHERE), 6.371e6, rtol=1e-15)
    np.testing.assert_allclose(transverse_radius(LATITUDE, SPHERE), 6.371e6, rtol=1e-15)
    np.testing.assert_allclose(gravity(LATITUDE, SPHERE), 9.81, rtol=1e-15)


def test_sphere_rotates_at_its_own_rate():
    assert coriolis_parameter(90.0, SPHERE) == pytest.approx(1.4e-4, rel=1e-15)
    assert beta_parameter(0.0, SPHERE) == pytest.approx(1.4e-4 / 6.371e6, rel=1e-15)


def test_coriolis_parameter_vanishes_on_the_equator_only():
    f = coriolis_parameter(LATITUDE)
    assert f[90] == 0.0
    assert np.all(f[:90] < 0.0)
    assert np.all(f[91:] > 0.0)


def test_beta_is_the_meridional_gradient_of_f():
    step = 1e-4
    rise = coriolis_parameter(LATITUDE + step) - coriolis_parameter(LATITUDE - step)
    _, north = metres_per_degree(LATITUDE)
    # a centred difference over 2e-4 degree loses eps / step in each f, no more than 1e-9 of beta at the equator
    np.testing.assert_allclose(beta_parameter(LATITUDE), rise / (2 * step * north), atol=1e-9 * 2.3e-11)


def test_a_degree_of_longitude_vanishes_at_the_poles_and_never_turns_negative():
    east, north = metres_per_degree([-90.0, 0.0, 90.0, 90.0000001])
    np.testing.assert_allclose(east[[0, 2, 3]], 0.0, atol=1e-8)
    assert np.all(east >= 0.0)
    assert north[0] == north[2] > north[1]


@pytest.mark.parametrize(("radius", "g", "name"), [(0.0, 9.8, "radius"), (6e6, -1.0, "gravity")])
def test_an_impossible_sphere_is_refused(radius, g, name):
    with pytest.raises(ValueError, match=name):
        spherical_earth(radius, g)
