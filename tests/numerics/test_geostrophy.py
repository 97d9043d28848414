"""Geostrophic velocity: symmetries, the blend across the equator, grids that hold part of the band."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.earth import WGS84, coriolis_parameter, gravity, meridional_radius
from setdrift.numerics.equatorial_balance import equatorial_error_gain
from setdrift.numerics.geostrophy import (
    EquatorialBand,
    VelocityMethod,
    equatorial_velocity,
    f_plane_velocity,
    geostrophic_velocity,
    geostrophic_velocity_error,
    rossby_number,
    velocity_from_slopes,
)

LATITUDE = np.arange(-19.75, 20.0, 0.5)
LONGITUDE = np.arange(-180.0, 180.0, 3.0)
BAND = EquatorialBand()
LAWS = settings(deadline=None, derandomize=True, max_examples=15)


def _smooth_sea(seed, rows=LATITUDE, columns=LONGITUDE):
    """A smooth periodic field of about 10 cm, with land where it is highest."""
    rng = np.random.default_rng(seed)
    field = np.zeros((rows.size, columns.size))
    for _ in range(12):
        across, along = rng.integers(0, 7), rng.normal(0.0, 8.0)
        phase = rng.uniform(0.0, 2 * np.pi)
        angle = across * np.deg2rad(columns) + along * np.deg2rad(rows)[:, np.newaxis] + phase
        field += 0.1 * rng.normal() * np.cos(angle)
    return np.where(field > 0.5, np.nan, field)


def _velocity(field, rows=LATITUDE, columns=LONGITUDE):
    return geostrophic_velocity(field, rows, columns, periodic=True)


@LAWS
@given(seed=st.integers(0, 2**16))
def test_reversed_sea_level_reverses_the_flow(seed):
    field = _smooth_sea(seed)
    there, back = _velocity(field), _velocity(-field)
    np.testing.assert_array_equal(there.eastward, -back.eastward)
    np.testing.assert_array_equal(there.northward, -back.northward)
    np.testing.assert_array_equal(there.method, back.method)


@LAWS
@given(seed=st.integers(0, 2**16))
def test_hemispheres_mirror(seed):
    field = _smooth_sea(seed)
    north, south = _velocity(field), _velocity(field[::-1])
    np.testing.assert_allclose(north.eastward, south.eastward[::-1], atol=1e-9)
    np.testing.assert_allclose(north.northward, -south.northward[::-1], atol=1e-9)
    np.testing.assert_array_equal(north.method, south.method[::-1])


@LAWS
@given(seed=st.integers(0, 2**16), shift=st.integers(1, 119))
def test_flow_turns_with_the_globe(seed, shift):
    field = _smooth_sea(seed)
    still, turned = _velocity(field), _velocity(np.roll(field, shift, axis=1))
    np.testing.assert_allclose(np.roll(still.eastward, shift, axis=1), turned.eastward, atol=1e-12)
    np.testing.assert_allclose(np.roll(still.northward, shift, axis=1), turned.northward, atol=1e-12)
    np.testing.assert_array_equal(np.roll(still.method, shift, axis=1), turned.method)


@LAWS
@given(seed=st.integers(0, 2**16), offset=st.floats(-50.0, 50.0))
def test_the_reference_level_does_not_matter(seed, offset):
    field = _smooth_sea(seed)
    low, high = _velocity(field), _velocity(field + offset)
    # 50 m stored in double precision resolves 7e-15 m, amplified by at most 3e3 m s-1 per m
    np.testing.assert_allclose(low.eastward, high.eastward, atol=1e-9)
    np.testing.assert_allclose(low.northward, high.northward, atol=1e-9)


def test_days_are_independent():
    days = np.stack([_smooth_sea(seed) for seed in range(6)]).reshape(2, 3, LATITUDE.size, LONGITUDE.size)
    whole = _velocity(days)
    for index in np.ndindex(2, 3):
        single = _velocity(days[index])
        np.testing.assert_allclose(whole.eastward[index], single.eastward, atol=1e-12)
        np.testing.assert_allclose(whole.northward[index], single.northward, atol=1e-12)
        np.testing.assert_array_equal(whole.method[index], single.method)


def test_method_changes_with_latitude():
    method = _velocity(np.zeros((LATITUDE.size, LONGITUDE.size))).method
    distance = np.abs(LATITUDE)
    assert method.dtype == np.int8
    assert np.all(method[distance <= BAND.inner] == VelocityMethod.BETA_PLANE)
    assert np.all(method[(distance > BAND.inner) & (distance < BAND.outer)] == VelocityMethod.BLENDED)
    assert np.all(method[distance >= BAND.outer] == VelocityMethod.F_PLANE)


def test_both_components_or_neither():
    flow = _velocity(_smooth_sea(4))
    missing = flow.method == VelocityMethod.NONE
    assert missing.any()
    assert not missing.all()
    np.testing.assert_array_equal(np.isnan(flow.eastward), missing)
    np.testing.assert_array_equal(np.isnan(flow.northward), missing)


def test_outside_the_band_it_is_the_f_plane():
    field = _smooth_sea(9)
    flow = _velocity(field)
    u, v = f_plane_velocity(field, LATITUDE, LONGITUDE, periodic=True)
    far = (np.abs(LATITUDE) >= BAND.outer)[:, np.newaxis] & ~np.isnan(u + v)
    np.testing.assert_array_equal(flow.eastward[far], u[far])
    np.testing.assert_array_equal(flow.northward[far], v[far])


def _largest_step(component, rows, near_edges):
    """The largest change from row to row, close to the edges of the blend or elsewhere within 12 degrees."""
    middle = np.abs(0.5 * (rows[1:] + rows[:-1]))
    at_edge = (np.abs(middle - BAND.inner) < 0.2) | (np.abs(middle - BAND.outer) < 0.2)
    chosen = at_edge if near_edges else ~at_edge & (middle < 12.0)
    return np.nanmax(np.abs(np.diff(component, axis=0))[chosen])


def _trapped_sea(rows, columns):
    """Sea level whose slopes on the equator leave the two balances as far apart as they get."""
    shape = np.exp(-0.5 * (rows / 3.5) ** 2)[:, np.newaxis] * (1.0 + 0.3 * rows[:, np.newaxis])
    return 0.1 * shape * np.cos(3.0 * np.deg2rad(columns))


def test_no_seam_where_the_balances_meet():
    """Steps between rows across 4 and 6 degrees are no larger than elsewhere."""
    rows, columns = np.arange(-15.0, 15.01, 0.25), np.arange(0.0, 360.0, 1.0)
    flow = geostrophic_velocity(_trapped_sea(rows, columns), rows, columns, periodic=True)
    for component in (flow.eastward, flow.northward):
        assert _largest_step(component, rows, True) <= _largest_step(component, rows, False)


@LAWS
@given(seed=st.integers(0, 2**16))
def test_the_blend_leaves_either_balance_gently(seed):
    """At the edges of the blend a row's step differs little from the step of the balance it leaves."""
    rows, columns = np.arange(-15.0, 15.01, 0.25), np.arange(0.0, 360.0, 5.0)
    field = np.nan_to_num(_smooth_sea(seed, rows, columns))
    flow = geostrophic_velocity(field, rows, columns, periodic=True)
    fitted = equatorial_velocity(field, rows, columns, periodic=True)
    f_plane = f_plane_velocity(field, rows, columns, periodic=True)
    middle = np.abs(0.5 * (rows[1:] + rows[:-1]))
    between = (np.abs(rows) >= BAND.inner) & (np.abs(rows) <= BAND.outer)
    for blend, fit, plane in zip((flow.eastward, flow.northward), fitted, f_plane, strict=True):
        disagreement = np.abs(fit - plane)[between].max()
        for edge, pure in ((BAND.inner, fit), (BAND.outer, plane)):
            extra = np.abs(np.diff(blend - pure, axis=0))[np.abs(middle - edge) < 0.3]
            # the smooth weight changes by 0.04 over the outermost quarter degree of the blend
            assert np.nanmax(extra) < 0.05 * disagreement


def test_a_hard_switch_would_leave_a_seam():
    """The measure above does see the step that blending removes."""
    rows, columns = np.arange(-15.0, 15.01, 0.25), np.arange(0.0, 360.0, 1.0)
    field = _trapped_sea(rows, columns)
    near = (np.abs(rows) < BAND.inner)[:, np.newaxis]
    fitted = equatorial_velocity(field, rows, columns, periodic=True)
    f_plane = f_plane_velocity(field, rows, columns, periodic=True)
    for inner, outer in zip(fitted, f_plane, strict=True):
        switched = np.where(near, inner, outer)
        assert _largest_step(switched, rows, True) > 2.0 * _largest_step(switched, rows, False)


@pytest.mark.parametrize("side", [-1.0, 1.0])
def test_a_grid_on_one_side_of_the_equator_uses_the_f_plane_down_to_its_limit(side):
    rows = np.sort(side * np.arange(0.5, 12.01, 0.25))
    field = np.tile((0.1 * np.sin(np.deg2rad(30.0 * rows)))[:, np.newaxis], (1, 20))
    flow = geostrophic_velocity(field, rows, np.arange(20.0))
    below = np.abs(rows) < BAND.minimum_latitude
    assert below.any()
    assert np.all(flow.method[below] == VelocityMethod.NONE)
    assert np.all(flow.method[~below] == VelocityMethod.F_PLANE)


def test_a_grid_that_reaches_a_little_across_the_equator_has_a_fit():
    rows = np.arange(-2.5, 12.01, 0.25)
    field = np.tile((-2.0 * np.deg2rad(rows) ** 2)[:, np.newaxis], (1, 20))
    part = geostrophic_velocity(field, rows, np.arange(20.0))
    assert np.all(part.method[np.abs(rows) <= BAND.inner] == VelocityMethod.BETA_PLANE)
    # u = -(g / M f) dh/dlat for h = -2 lat^2, with lat / sin(lat) by sinc
    f_over_latitude = 2.0 * WGS84.rotation_rate * np.sinc(rows / 180.0)
    expected = 4.0 * gravity(rows) / meridional_radius(rows) / f_over_latitude
    np.testing.assert_allclose(part.eastward[:, 10], expected, rtol=1e-6)


def test_a_grid_far_from_the_equator_has_no_band():
    rows = np.arange(40.0, 50.01, 0.25)
    flow = geostrophic_velocity(np.zeros((rows.size, 10)), rows, np.arange(10.0))
    assert np.all(flow.method == VelocityMethod.F_PLANE)


def test_the_fit_serves_alone_where_the_f_plane_lacks_a_slope():
    """A row with land to the north and south has no meridional difference but lies within the fit."""
    rows = np.arange(-6.0, 6.01, 0.25)
    field = np.zeros((rows.size, 10))
    field[[-5, -3]] = np.nan
    flow = geostrophic_velocity(field, rows, np.arange(10.0))
    assert np.all(flow.method[-4] == VelocityMethod.BETA_PLANE)
    assert not flow.eastward[-4].any()


def test_no_f_plane_velocity_on_the_equator():
    rows = np.array([-1.0, 0.0, 1.0])
    for equator in (0.0, 1e-12):
        u, v = velocity_from_slopes(np.ones((3, 2)), np.ones((3, 2)), rows + equator)
        assert np.isnan(u[1]).all()
        assert np.isnan(v[1]).all()
        assert not np.isnan(u[[0, 2]]).any()


def test_velocity_errors_off_the_equator_are_those_of_the_slopes():
    rows = np.array([-45.0, -44.75, -44.5])
    east, north = geostrophic_velocity_error(
        np.full((3, 2), 0.02), np.full((3, 2), 1e-7), np.full((3, 2), 2e-7), rows, correlation_length=1e5
    )
    factor = gravity(rows[0]) / abs(coriolis_parameter(rows[0]))
    np.testing.assert_allclose(east[0], 2e-7 * factor, rtol=1e-12)
    np.testing.assert_allclose(north[0], 1e-7 * factor, rtol=1e-12)


def test_velocity_errors_near_the_equator_are_those_of_the_fit():
    rows = np.arange(-10.0, 10.01, 0.25)
    height = np.full((2, rows.size, 3), 0.02)
    height[1] *= 2.0
    slope = np.full_like(height, 2e-7)
    height[:, :, 2] = slope[:, :, 2] = np.nan
    errors = geostrophic_velocity_error(height, slope, slope, rows, correlation_length=1e5)
    gains = equatorial_error_gain(rows, 1e5)
    near = np.abs(rows) <= BAND.inner
    for error, gain in zip(errors, gains, strict=True):
        np.testing.assert_allclose(error[0, near, 0], 0.02 * gain[near], rtol=1e-12)
        np.testing.assert_allclose(error[1, near], 2.0 * error[0, near], rtol=1e-12)
        assert np.all(error[..., :2] > 0.0)
        assert np.isnan(error[..., 2]).all()


def test_velocity_errors_without_a_fit_stop_with_the_velocity():
    rows = np.arange(0.5, 10.01, 0.25)
    ones = np.ones((rows.size, 1))
    east, _ = geostrophic_velocity_error(ones, ones, ones, rows, correlation_length=1e5)
    np.testing.assert_array_equal(np.isnan(east[:, 0]), rows < BAND.minimum_latitude)


def test_rossby_number_is_signed_by_the_sense_of_rotation():
    rows = np.array([-30.0, -1.0, 1.0, 30.0])
    counter_clockwise = np.full((4, 1), 1e-6)
    ratio = rossby_number(counter_clockwise, rows)[:, 0]
    assert ratio[0] < 0.0 < ratio[3]
    assert np.isnan(ratio[1:3]).all()
    assert ratio[3] == pytest.approx(1e-6 / coriolis_parameter(30.0), rel=1e-15)
    assert not np.isnan(rossby_number(counter_clockwise, rows, minimum_latitude=0.5)).any()
