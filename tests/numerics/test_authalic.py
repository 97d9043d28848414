"""The authalic sphere against the ellipsoid's closed forms."""

from __future__ import annotations

import numpy as np
import pytest

from setdrift.numerics.authalic import authalic_latitude, authalic_radius
from setdrift.numerics.earth import WGS84, spherical_earth


def test_the_sphere_has_the_area_of_the_ellipsoid():
    eccentricity = np.sqrt(WGS84.eccentricity_squared)
    stretch = (1 - eccentricity**2) * np.arctanh(eccentricity) / eccentricity
    assert 4 * np.pi * authalic_radius() ** 2 == pytest.approx(2 * np.pi * WGS84.semi_major_axis**2 * (1 + stretch))
    assert authalic_radius(spherical_earth(6.4e6, 9.8)) == pytest.approx(6.4e6)


def test_zones_have_the_area_of_the_ellipsoid():
    # the area of a narrow zone is its circumference times its height along the meridian
    latitude = np.linspace(-90.0, 90.0, 200_001)
    middle = np.deg2rad(0.5 * (latitude[1:] + latitude[:-1]))
    squared = WGS84.eccentricity_squared
    radius = WGS84.semi_major_axis / np.sqrt(1 - squared * np.sin(middle) ** 2)
    meridian = radius * (1 - squared) / (1 - squared * np.sin(middle) ** 2)
    zone = 2 * np.pi * radius * np.cos(middle) * meridian * np.deg2rad(np.diff(latitude))
    share = np.concatenate(([0.0], np.cumsum(zone))) / zone.sum()
    sine = np.sin(np.deg2rad(authalic_latitude(latitude)))
    np.testing.assert_allclose((1 + sine) / 2, share, atol=1e-9)


def test_latitudes_of_a_sphere_are_its_own():
    latitude = np.array([-90.0, -60.0, -10.0, 0.0, 33.0, 75.0, 90.0])
    np.testing.assert_allclose(authalic_latitude(latitude, spherical_earth(1.0, 1.0)), latitude, atol=1e-6)
