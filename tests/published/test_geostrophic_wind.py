"""The f-plane velocity against an independent implementation."""

from __future__ import annotations

import metpy.calc
import numpy as np
import pytest
from metpy.constants import g as metpy_gravity
from metpy.units import units

from setdrift.numerics.earth import coriolis_parameter, gravity, metres_per_degree
from setdrift.numerics.geostrophy import f_plane_velocity

ROWS = np.arange(30.0, 45.01, 0.25)
COLUMNS = np.arange(-60.0, -39.9, 0.25)
ALONG, ACROSS = np.deg2rad(24.0), np.deg2rad(30.0)  # phase per degree of longitude and latitude
HEIGHT = 0.3 * np.cos(ALONG * COLUMNS) * np.sin(ACROSS * ROWS)[:, np.newaxis]


def _by_metpy():
    """The same balance by metpy, brought from its constant gravity to ours."""
    east, north = metres_per_degree(ROWS)
    dx = np.tile(0.25 * east[:, np.newaxis], (1, COLUMNS.size - 1))
    dy = np.tile(0.125 * (north[1:] + north[:-1])[:, np.newaxis], (1, COLUMNS.size))
    u, v = metpy.calc.geostrophic_wind(
        HEIGHT * units.m,
        dx=dx * units.m,
        dy=dy * units.m,
        latitude=np.tile(ROWS[:, np.newaxis], (1, COLUMNS.size)) * units.degree,
    )
    ratio = (gravity(ROWS) / metpy_gravity.to("m/s^2").magnitude)[:, np.newaxis]
    return u.to("m/s").magnitude * ratio, v.to("m/s").magnitude * ratio


def _truncation():
    """The largest error of a second-order centred difference: step^2 / 6 times the third derivative."""
    east, north = metres_per_degree(ROWS)
    factor = gravity(ROWS) / coriolis_parameter(ROWS)
    return (
        np.abs(factor * 0.3 * ACROSS**3 / north * 0.25**2 / 6.0).max(),
        np.abs(factor * 0.3 * ALONG**3 / east * 0.25**2 / 6.0).max(),
    )


@pytest.mark.source("metpy.calc.geostrophic_wind (three-point differences on dx, dy)")
def test_f_plane_velocity_within_the_two_stencils_truncation():
    ours = f_plane_velocity(HEIGHT, ROWS, COLUMNS)
    inside = (slice(2, -2), slice(2, -2))
    # the fourth-order stencil's own error is 0.3 % of the second-order one's (step^2 k^2 / 5); the bound
    # takes the largest factor of each kind at once, which leaves room for that
    for mine, theirs, bound in zip(ours, _by_metpy(), _truncation(), strict=True):
        difference = np.abs(mine - theirs)[inside].max()
        assert difference < bound
        # the bound is no formality: it is a few thousandths of the velocity, and nearly reached
        assert bound < 5e-3 * np.abs(theirs).max()
        assert difference > 0.5 * bound


@pytest.mark.source("Gill (1982), section 7.6: u = -(g/f) dh/dy, v = (g/f) dh/dx, differentiated by hand")
def test_f_plane_velocity_against_the_analytic_slope():
    east, north = metres_per_degree(ROWS)
    factor = (gravity(ROWS) / coriolis_parameter(ROWS))[:, np.newaxis]
    slope_y = 0.3 * ACROSS * np.cos(ALONG * COLUMNS) * np.cos(ACROSS * ROWS)[:, np.newaxis] / north[:, np.newaxis]
    slope_x = -0.3 * ALONG * np.sin(ALONG * COLUMNS) * np.sin(ACROSS * ROWS)[:, np.newaxis] / east[:, np.newaxis]
    u, v = f_plane_velocity(HEIGHT, ROWS, COLUMNS)
    inside = (slice(2, -2), slice(2, -2))
    # fourth order: (step k)^4 / 30 = 1e-5 of the maximum
    np.testing.assert_allclose(u[inside], (-factor * slope_y)[inside], atol=2e-5 * np.abs(u[inside]).max())
    np.testing.assert_allclose(v[inside], (factor * slope_x)[inside], atol=2e-5 * np.abs(v[inside]).max())
