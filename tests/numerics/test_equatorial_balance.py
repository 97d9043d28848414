"""The fit across the equator: exactness, gaps, what it refuses, and what it makes of noise."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.ndimage import gaussian_filter

from setdrift.numerics.earth import beta_parameter, coriolis_parameter, gravity, meridional_radius
from setdrift.numerics.equatorial_balance import EquatorialBand, equatorial_error_gain, equatorial_velocity

ROWS = np.arange(-8.0, 8.01, 0.25)
COLUMNS = np.arange(0.0, 10.0, 0.25)
BAND = np.abs(ROWS) <= 6.0
EQUATOR = np.flatnonzero(ROWS == 0.0)[0]


def _parabola():
    """Sea level in balance with a nearly uniform eastward flow."""
    return np.tile((-3.0 * np.deg2rad(ROWS) ** 2)[:, np.newaxis], (1, COLUMNS.size))


def _in_balance(rows):
    """The u of _parabola, exactly: -(g / M f) dh/dlat, with lat / sin(lat) by sinc."""
    f_over_latitude = 1.458423e-4 * np.sinc(rows / 180.0)
    return 6.0 * gravity(rows) / meridional_radius(rows) / f_over_latitude


def test_a_polynomial_is_recovered_exactly():
    u, v = equatorial_velocity(_parabola(), ROWS, COLUMNS)
    np.testing.assert_allclose(u[BAND], np.tile(_in_balance(ROWS[BAND])[:, np.newaxis], (1, 40)), rtol=1e-7)
    np.testing.assert_allclose(v[BAND], 0.0, atol=1e-9)


def test_nothing_outside_the_band():
    u, v = equatorial_velocity(_parabola(), ROWS, COLUMNS)
    assert np.isnan(u[~BAND]).all()
    assert np.isnan(v[~BAND]).all()
    assert np.isnan(equatorial_velocity(np.ones((4, 4)), np.arange(20.0, 24.0), np.arange(4.0))[0]).all()


def test_the_equator_takes_the_second_derivatives():
    """beta u = -g d2h/dy2 and beta v = g d2h/dxdy (Picaut et al. 1989), for h = p lat^2 + q lat lon."""
    degree = np.deg2rad(1.0)
    field = 1e-3 * ROWS[:, np.newaxis] ** 2 + 2e-4 * ROWS[:, np.newaxis] * COLUMNS
    u, v = equatorial_velocity(field, ROWS, COLUMNS)
    g, beta = gravity(0.0), beta_parameter(0.0)
    north = meridional_radius(0.0) * degree
    np.testing.assert_allclose(u[EQUATOR], -g / beta * 2e-3 / north**2, rtol=1e-6)
    # the eastward length of a degree changes by 0.5 % over the band, which the polynomial follows
    np.testing.assert_allclose(v[EQUATOR], g / beta * 2e-4 / north / (6378137.0 * degree), rtol=1e-5)


def test_the_trapped_slope_is_left_out():
    """A slope S(y) in either direction is balanced by acceleration: no velocity."""
    width = np.sqrt(2.0 / beta_parameter(0.0)) / meridional_radius(0.0)
    trapped = np.exp(-0.5 * (np.deg2rad(ROWS) / width) ** 2)[:, np.newaxis]
    field = 1e-3 * trapped * COLUMNS * np.cos(np.deg2rad(ROWS))[:, np.newaxis]
    _, v = equatorial_velocity(field, ROWS, COLUMNS)
    # what remains is the difference between a degree's length on the ellipsoid and the cosine
    assert np.nanmax(np.abs(v)) < 1e-3


def test_islands_are_bridged_and_keep_the_velocity_of_the_sea_around():
    field = _parabola()
    field[30:33, 10:14] = np.nan
    u, _ = equatorial_velocity(field, ROWS, COLUMNS)
    expected = np.where(np.isnan(field[BAND]), np.nan, _in_balance(ROWS[BAND])[:, np.newaxis])
    np.testing.assert_allclose(u[BAND], expected, rtol=1e-6)


def test_a_sea_beyond_a_barrier_has_no_part_in_the_fit():
    field = _parabola()
    barrier = (ROWS > 3.0) & (ROWS < 5.0)
    field[barrier] = np.nan
    field[ROWS >= 5.0] += 10.0
    u, _ = equatorial_velocity(field, ROWS, COLUMNS)
    near, beyond = BAND & (ROWS <= 3.0), BAND & (ROWS >= 5.0)
    np.testing.assert_allclose(u[near], np.tile(_in_balance(ROWS[near])[:, np.newaxis], (1, 40)), rtol=1e-6)
    assert np.isnan(u[beyond]).all()


@pytest.mark.parametrize(
    "sea",
    [ROWS > 0.0, ROWS >= 0.0, ROWS < -1.0, ROWS > -1.9, np.abs(ROWS) < 1.9, np.abs(ROWS) > 1.0, ROWS > 99.0],
)
def test_no_fit_without_sea_on_both_sides(sea):
    field = np.where(sea[:, np.newaxis], _parabola(), np.nan)
    u, v = equatorial_velocity(field, ROWS, COLUMNS)
    assert np.isnan(u).all()
    assert np.isnan(v).all()


def test_too_few_rows_make_no_fit():
    rows = np.array([-5.0, 0.0, 5.0])
    u, _ = equatorial_velocity(np.zeros((3, 5)), rows, np.arange(5.0), band=EquatorialBand(largest_gap=9.0))
    assert np.isnan(u).all()
    assert np.isnan(equatorial_velocity(np.zeros((1, 5)), [0.0], np.arange(5.0))[0]).all()


def test_a_coarse_grid_still_has_an_overdetermined_fit():
    rows = np.arange(-6.0, 6.01, 1.5)
    field = np.tile((-3.0 * np.deg2rad(rows) ** 2)[:, np.newaxis], (1, 5))
    u, _ = equatorial_velocity(field, rows, np.arange(5.0))
    np.testing.assert_allclose(u, np.tile(_in_balance(rows)[:, np.newaxis], (1, 5)), rtol=1e-6)


def test_columns_that_share_their_gaps_do_not_disturb_each_other():
    rng = np.random.default_rng(5)
    field = _parabola() + 0.01 * rng.standard_normal((ROWS.size, COLUMNS.size))
    field[40:, 20:] = np.nan
    u, _ = equatorial_velocity(field, ROWS, COLUMNS)
    single, _ = equatorial_velocity(field[:, 30:33], ROWS, COLUMNS[30:33])
    np.testing.assert_allclose(u[:, 31], single[:, 1], atol=1e-12)


def _correlated_noise(columns):
    """1 cm of noise with the correlation exp(-(r / 100 km)^2), periodic in longitude."""
    white = np.random.default_rng(2).standard_normal((2000, columns.size))
    noise = gaussian_filter(white, 100.0 / 27.7 / 2.0, mode="wrap")
    # stack independent pieces as days: the smoothing reaches over 15 rows, pieces are 80 rows apart
    pieces = np.stack([noise[start : start + ROWS.size] for start in range(0, 1920, 80)])
    return 0.01 * pieces / noise.std()


def test_the_error_gain_is_what_noise_shows():
    columns = np.arange(0.0, 360.0, 0.25)
    noise = _correlated_noise(columns)
    for velocity, gain in zip(
        equatorial_velocity(noise, ROWS, columns, periodic=True), equatorial_error_gain(ROWS, 1e5), strict=True
    ):
        scatter = velocity[:, BAND].std(axis=(0, 2))
        # 24 pieces of some 200 independent stretches: 1 %; v's fourth-order difference loses 1 % of the
        # slope of noise this short, and the noise is made on a grid whose step is 27.7 km both ways
        np.testing.assert_allclose(scatter, 0.01 * gain[BAND], rtol=0.04)
        assert np.isnan(gain[~BAND]).all()


def test_no_error_gain_without_a_fit():
    assert np.isnan(equatorial_error_gain(np.arange(3.0, 9.0), 1e5)).all()
    with pytest.raises(ValueError, match="correlation_length"):
        equatorial_error_gain(ROWS, 0.0)


def test_one_centimetre_of_noise_stays_below_thirty_centimetres_a_second():
    """Errors of maps are correlated over about 100 km (exp(-(r / 100 km)^2) here)."""
    columns = np.arange(0.0, 360.0, 0.25)
    noise = _correlated_noise(columns)
    u, v = equatorial_velocity(noise, ROWS, columns, periodic=True)
    inside = np.abs(ROWS) <= 4.0
    # measured 0.24 (u) and 0.22 (v) at the equator
    assert u[:, inside].std(axis=(0, 2)).max() < 0.28
    assert v[:, inside].std(axis=(0, 2)).max() < 0.26
    # against the f-plane at half a degree, where it would amplify to 1.1 m/s
    f_plane = gravity(0.5) / coriolis_parameter(0.5) * np.diff(noise, axis=1).std() / (0.25 * 110574.0)
    assert f_plane > 3.0 * u[:, inside].std(axis=(0, 2)).max()


def test_a_grid_of_cell_centres_keeps_the_full_degree():
    """Rows from 5.875 S to 5.875 N hold the whole band: a term of degree 8 comes through."""
    rows = np.arange(-5.875, 6.0, 0.25)
    field = np.tile(((rows / 6.0) ** 8)[:, np.newaxis], (1, 5))
    u, _ = equatorial_velocity(field, rows, np.arange(5.0))
    slope = 8.0 * (rows / 6.0) ** 7 / (6.0 * np.deg2rad(1.0) * meridional_radius(rows))
    expected = -gravity(rows) / coriolis_parameter(rows) * slope
    np.testing.assert_allclose(u[:, 2], expected, atol=1e-8 * np.abs(expected).max())


def test_a_point_without_an_eastward_slope_leaves_the_rest_of_its_column():
    field = _parabola()
    field[30, [11, 13]] = np.nan
    u, v = equatorial_velocity(field, ROWS, COLUMNS)
    others = BAND & (np.arange(ROWS.size) != 30)
    assert np.isnan(v[30, 12])
    np.testing.assert_allclose(u[others, 12], _in_balance(ROWS[others]), rtol=1e-6)
    np.testing.assert_allclose(v[others, 12], 0.0, atol=1e-9)


@pytest.mark.parametrize(
    ("settings", "name"),
    [
        ({"inner": 6.0}, "inner"),
        ({"outer": 7.0}, "outer"),
        ({"inner": 0.0}, "inner"),
        ({"degree": 2}, "degree"),
        ({"wave_speed": 0.0}, "wave_speed"),
    ],
)
def test_settings_that_contradict_each_other_are_refused(settings, name):
    with pytest.raises(ValueError, match=name):
        EquatorialBand(**settings)
