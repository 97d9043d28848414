"""Slopes and vorticity: exactness, order, gaps, symmetry."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.derivatives import eastward_slope, northward_slope, relative_vorticity, slopes
from setdrift.numerics.earth import WGS84, coriolis_parameter, metres_per_degree, spherical_earth

LATITUDE = np.arange(30.0, 40.01, 0.25)
LONGITUDE = np.arange(10.0, 25.01, 0.25)
EAST, NORTH = metres_per_degree(LATITUDE)
ORIGIN = LONGITUDE[30]


def _along_longitude(profile):
    """The field whose every row is a function of longitude from its middle, degrees."""
    return np.tile(profile(LONGITUDE - ORIGIN), (LATITUDE.size, 1))


def test_quartic_is_exact_inside():
    slope_x, _ = slopes(_along_longitude(lambda d: d**4), LATITUDE, LONGITUDE)
    expected = 4 * (LONGITUDE - ORIGIN) ** 3 / EAST[:, np.newaxis]
    np.testing.assert_allclose(slope_x[:, 2:-2], expected[:, 2:-2], atol=1e-12)


def test_parabola_is_exact_to_the_edge():
    slope_x, _ = slopes(_along_longitude(lambda d: d**2), LATITUDE, LONGITUDE)
    np.testing.assert_allclose(slope_x, 2 * (LONGITUDE - ORIGIN) / EAST[:, np.newaxis], atol=1e-15)


def test_northward_slope_uses_the_metric_of_the_point_itself():
    field = np.tile((LATITUDE[:, np.newaxis] - 35.0) ** 2, (1, LONGITUDE.size))
    expected = 2 * (LATITUDE - 35.0) / NORTH
    np.testing.assert_allclose(slopes(field, LATITUDE, LONGITUDE)[1][:, 5], expected, atol=1e-15)


@pytest.mark.parametrize(("edge", "order"), [(slice(2, -2), 4), (slice(0, 1), 2), (slice(1, 2), 2)])
def test_error_falls_with_the_order_of_the_stencil(edge, order):
    errors = []
    for spacing in (0.5, 0.25):
        columns = np.arange(0.0, 20.0 + spacing / 2, spacing)
        field = np.sin(np.deg2rad(18.0) * columns)[np.newaxis]
        exact = np.deg2rad(18.0) * np.cos(np.deg2rad(18.0) * columns) / metres_per_degree([35.0])[0]
        errors.append(np.abs(slopes(field, [35.0], columns)[0][0] - exact)[edge].max())
    # the ratio tends to 2^order; third-order terms still show at these spacings
    assert errors[0] / errors[1] == pytest.approx(2**order, rel=0.15)


@pytest.mark.parametrize(
    ("sea", "stencil"),
    [
        ({-2, -1, 0, 1, 2}, {-2: 1 / 12, -1: -8 / 12, 1: 8 / 12, 2: -1 / 12}),
        ({-1, 0, 1, 2}, {-1: -0.5, 1: 0.5}),
        ({-2, 0, 1, 2}, {0: -1.5, 1: 2.0, 2: -0.5}),
        ({-2, -1, 0}, {-2: 0.5, -1: -2.0, 0: 1.5}),
        ({-2, 0, 1}, {0: -1.0, 1: 1.0}),
        ({-1, 0, 2}, {-1: -1.0, 0: 1.0}),
    ],
)
@pytest.mark.parametrize("axis", [0, 1])
def test_each_gap_gets_the_best_stencil_left(sea, stencil, axis):
    field = np.random.default_rng(3).standard_normal((LATITUDE.size, LONGITUDE.size))
    line = field[:, 20] if axis == 0 else field[20, :]
    for offset in {-2, -1, 0, 1, 2} - sea:
        line[20 + offset] = np.nan
    expected = sum(weight * line[20 + offset] for offset, weight in stencil.items())
    slope = slopes(field, LATITUDE, LONGITUDE)[1 - axis][20, 20]
    assert slope * (NORTH if axis == 0 else EAST)[20] * 0.25 == pytest.approx(expected, rel=1e-9)


def test_no_slope_on_land_or_without_neighbours():
    field = np.full((LATITUDE.size, LONGITUDE.size), np.nan)
    field[5, 5] = field[20, 20] = field[20, 21] = 1.0
    slope_x, slope_y = slopes(field, LATITUDE, LONGITUDE)
    assert np.flatnonzero(~np.isnan(slope_x)).tolist() == [20 * LONGITUDE.size + 20, 20 * LONGITUDE.size + 21]
    assert np.isnan(slope_y).all()


def test_a_land_point_between_two_seas_stays_land():
    field = _along_longitude(lambda d: d)
    field[:, 30] = np.nan
    assert np.isnan(slopes(field, LATITUDE, LONGITUDE)[0][:, 30]).all()


def test_no_eastward_slope_at_the_poles():
    rows, columns = np.arange(-90.0, 91.0, 10.0), np.arange(0.0, 360.0, 10.0)
    slope_x, slope_y = slopes(np.ones((19, 36)), rows, columns, periodic=True)
    assert np.isnan(slope_x[[0, -1]]).all()
    assert not np.isnan(slope_x[1:-1]).any()
    assert not slope_y.any()


def test_single_row_and_single_column():
    assert np.isnan(northward_slope([[1.0, 2.0, 4.0]], [10.0], [0.0, 1.0, 2.0])).all()
    assert np.isnan(eastward_slope([[1.0], [2.0], [4.0]], [0.0, 1.0, 2.0], [10.0])).all()


@settings(deadline=None, derandomize=True, max_examples=20)
@given(shift=st.integers(1, 71), seed=st.integers(0, 2**16))
def test_periodic_slopes_turn_with_the_globe(shift, seed):
    rows, columns = np.arange(-60.0, 61.0, 5.0), np.arange(0.0, 360.0, 5.0)
    field = np.random.default_rng(seed).standard_normal((rows.size, columns.size))
    field[field > 1.0] = np.nan
    turned = slopes(np.roll(field, shift, axis=1), rows, columns, periodic=True)
    for before, after in zip(slopes(field, rows, columns, periodic=True), turned, strict=True):
        np.testing.assert_array_equal(np.roll(before, shift, axis=1), after)


def test_leading_dimensions_are_independent():
    field = np.random.default_rng(1).standard_normal((2, 3, LATITUDE.size, LONGITUDE.size))
    field[field > 1.0] = np.nan
    whole = slopes(field, LATITUDE, LONGITUDE)
    for index in np.ndindex(2, 3):
        for component, single in zip(whole, slopes(field[index], LATITUDE, LONGITUDE), strict=True):
            np.testing.assert_array_equal(component[index], single)


def test_single_precision_longitudes_are_regular_enough():
    columns = np.arange(0.125, 360.0, 0.25, dtype=np.float32)
    slope_x, _ = slopes(np.ones((1, columns.size)), [0.0], columns, periodic=True)
    assert not slope_x.any()


@pytest.mark.parametrize(
    ("field", "rows", "columns", "periodic", "name"),
    [
        (np.ones(3), [0.0], [0.0, 1.0, 2.0], False, "field"),
        (np.ones((2, 3)), [0.0, 1.0, 2.0], [0.0, 1.0, 2.0], False, "latitude"),
        (np.ones((2, 3)), [0.0, 1.0], [0.0, 1.0], False, "longitude"),
        (np.ones((3, 2)), [0.0, 1.0, 3.0], [0.0, 1.0], False, "latitude"),
        (np.ones((2, 3)), [1.0, 0.0], [0.0, 1.0, 2.0], False, "latitude"),
        (np.ones((2, 3)), [0.0, 1.0], [0.0, 1.0, 2.5], False, "longitude"),
        (np.ones((2, 3)), [0.0, 1.0], [0.0, 1.0, 2.0], True, "periodic"),
        (np.ones((2, 359)), [0.0, 1.0], np.arange(359.0), True, "periodic"),
    ],
)
def test_a_grid_that_does_not_fit_is_refused(field, rows, columns, periodic, name):
    with pytest.raises(ValueError, match=name):
        slopes(field, rows, columns, periodic=periodic)


@pytest.mark.parametrize("earth", [WGS84, spherical_earth(6.371e6, 9.81)])
def test_solid_rotation_has_the_vorticity_of_the_planet(earth):
    rows, columns = np.arange(-88.0, 88.1, 0.25), np.arange(0.0, 5.0, 1.0)
    east, _ = metres_per_degree(rows, earth)
    # metres per degree east is the distance from the axis times a degree
    u = np.tile((earth.rotation_rate * np.rad2deg(east))[:, np.newaxis], (1, columns.size))
    vorticity = relative_vorticity(u, np.zeros_like(u), rows, columns, earth=earth)
    expected = np.tile(coriolis_parameter(rows, earth)[:, np.newaxis], (1, columns.size))
    # fourth-order truncation at 1/4 degree is (0.0044)^4 / 30; the outermost rows are second order
    np.testing.assert_allclose(vorticity[2:-2], expected[2:-2], atol=1e-4 * 1e-4)
    np.testing.assert_allclose(vorticity, expected, atol=1e-4 * 1.5e-4)


def test_a_gradient_has_no_vorticity():
    potential = np.sin(np.deg2rad(20.0 * LONGITUDE)) * np.cos(np.deg2rad(15.0 * LATITUDE))[:, np.newaxis]
    u, v = slopes(potential, LATITUDE, LONGITUDE)
    inside = (slice(4, -4), slice(4, -4))
    rotation = relative_vorticity(u, v, LATITUDE, LONGITUDE)[inside]
    strain = slopes(u, LATITUDE, LONGITUDE)[1][inside]
    assert np.abs(rotation).max() < 1e-3 * np.abs(strain).max()


def test_vorticity_is_refused_for_components_of_different_shape():
    with pytest.raises(ValueError, match="northward"):
        relative_vorticity(np.ones((2, 2)), np.ones((2, 3)), [0.0, 1.0], [0.0, 1.0])
