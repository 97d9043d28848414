"""Steady zonal flow on the rotating sphere, pole to pole and across the equator.

Test case 2 balances solid-body rotation exactly, centrifugal force included. Sea level alone through linear
geostrophy gives u0 cos(lat) (1 + u0 / (2 Omega a)); taking the centrifugal part out again belongs to the
gradient-wind velocity and is checked with it.
"""

from __future__ import annotations

import numpy as np
import pytest

from setdrift.numerics.earth import EARTH_ROTATION_RATE, spherical_earth
from setdrift.numerics.geostrophy import VelocityMethod, geostrophic_velocity

RADIUS, GRAVITY, SPEED = 6.37122e6, 9.80616, 40.0
SPHERE = spherical_earth(RADIUS, GRAVITY, rotation_rate=EARTH_ROTATION_RATE)
COLUMNS = np.arange(0.0, 360.0, 15.0)
CASE_2 = "Williamson et al. (1992), J. Comput. Phys. 102, test case 2, eqs. 90 and 95 (numbers from memory)"


def _sea_level(rows):
    centrifugal = RADIUS * EARTH_ROTATION_RATE * SPEED + 0.5 * SPEED**2
    height = -centrifugal * np.sin(np.deg2rad(rows)) ** 2 / GRAVITY
    return np.tile(height[:, np.newaxis], (1, COLUMNS.size))


@pytest.mark.source(CASE_2)
@pytest.mark.parametrize("rows", [np.arange(-89.875, 90.0, 0.25), np.arange(-90.0, 90.01, 0.25)])
def test_linear_geostrophy_from_pole_to_pole(rows):
    flow = geostrophic_velocity(_sea_level(rows), rows, COLUMNS, periodic=True, earth=SPHERE)
    # a pole row has no east: only that row, where cos(lat) = 0, is left out
    rows_with_east = np.abs(rows) < 90.0
    expected = SPEED * np.cos(np.deg2rad(rows)) * (1.0 + SPEED / (2.0 * EARTH_ROTATION_RATE * RADIUS))
    expected = np.tile(expected[rows_with_east, np.newaxis], (1, COLUMNS.size))
    # fourth-order differences err by 1e-9, the last rows before the poles (second order) by 5e-5, the
    # polynomial of degree 8 across the equator by less: 0.1 % leaves a wide margin
    np.testing.assert_allclose(flow.eastward[rows_with_east], expected, rtol=1e-3)
    np.testing.assert_allclose(flow.northward[rows_with_east], 0.0, atol=1e-6 * SPEED)
    assert np.all(flow.method[~rows_with_east] == VelocityMethod.NONE)


@pytest.mark.source(CASE_2)
def test_the_excess_over_the_wind_is_the_centrifugal_part():
    rows = np.arange(-89.875, 90.0, 0.25)
    flow = geostrophic_velocity(_sea_level(rows), rows, COLUMNS, periodic=True, earth=SPHERE)
    ratio = flow.eastward[:, 0] / (SPEED * np.cos(np.deg2rad(rows)))
    # u0 / (2 Omega a) = 4.3 %, many times the tolerance: it would show if it were lost
    np.testing.assert_allclose(ratio - 1.0, SPEED / (2.0 * EARTH_ROTATION_RATE * RADIUS), atol=1e-3)
