"""Bilinear regridding with land, and the lookup of flags."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.regridding import regrid_bilinear

ROWS = np.arange(-10.0, 10.1, 1.0)
COLUMNS = np.arange(20.0, 40.1, 1.0)
TARGET_ROWS = np.arange(-9.9, 9.95, 0.3)
TARGET_COLUMNS = np.arange(20.05, 39.95, 0.3)


def _plane(rows, columns):
    return 3.0 + 0.2 * rows[:, np.newaxis] - 0.1 * columns


def test_a_plane_is_exact():
    found = regrid_bilinear(_plane(ROWS, COLUMNS), ROWS, COLUMNS, TARGET_ROWS, TARGET_COLUMNS)
    np.testing.assert_allclose(found, _plane(TARGET_ROWS, TARGET_COLUMNS), atol=1e-12)


def test_the_same_grid_comes_back_with_its_land():
    field = np.random.default_rng(0).standard_normal((ROWS.size, COLUMNS.size))
    field[field > 1.0] = np.nan
    np.testing.assert_allclose(regrid_bilinear(field, ROWS, COLUMNS, ROWS, COLUMNS), field, atol=1e-12)


def test_irregular_and_descending_rows():
    rows = np.array([9.0, 4.0, 2.5, -1.0, -9.5])
    inside = (TARGET_ROWS > -9.5) & (TARGET_ROWS < 9.0)
    found = regrid_bilinear(_plane(rows, COLUMNS), rows, COLUMNS, TARGET_ROWS[inside], TARGET_COLUMNS)
    np.testing.assert_allclose(found, _plane(TARGET_ROWS[inside], TARGET_COLUMNS), atol=1e-12)


@settings(deadline=None, derandomize=True, max_examples=30)
@given(turns=st.integers(-2, 2), first=st.integers(0, 35))
def test_longitude_conventions_do_not_matter(turns, first):
    columns = np.arange(0.0, 360.0, 10.0)
    field = np.cos(np.deg2rad(columns))[np.newaxis] + ROWS[:, np.newaxis]
    target = np.array([-179.0, -5.0, -1e-12, 0.0, 3.0, 178.0, 355.0, 359.99])
    expected = regrid_bilinear(field, ROWS, columns, ROWS, target, periodic=True)
    rolled = np.roll(columns, -first)
    rolled = np.where(rolled > 180.0, rolled - 360.0, rolled)
    found = regrid_bilinear(np.roll(field, -first, axis=1), ROWS, rolled, ROWS, target + 360.0 * turns, periodic=True)
    assert not np.isnan(found).any()
    np.testing.assert_allclose(found, expected, atol=1e-9)


def test_the_wrap_interpolates_between_last_and_first():
    columns = np.arange(5.0, 360.0, 10.0)
    field = np.tile(np.where(columns > 180.0, 1.0, 3.0), (ROWS.size, 1))
    found = regrid_bilinear(field, ROWS, columns, ROWS, [-5.0, -2.5, 0.0, 360.0, 365.0], periodic=True)
    np.testing.assert_allclose(found[0], [1.0, 1.5, 2.0, 2.0, 3.0], atol=1e-12)
    assert np.isnan(regrid_bilinear(field, ROWS, columns, ROWS, [0.0])).all()


def test_a_column_given_twice_closes_the_circle():
    columns = np.arange(0.0, 361.0, 10.0)
    field = np.tile(np.cos(np.deg2rad(columns)), (ROWS.size, 1))
    once = regrid_bilinear(field[:, :-1], ROWS, columns[:-1], ROWS, TARGET_COLUMNS, periodic=True)
    twice = regrid_bilinear(field, ROWS, columns, ROWS, TARGET_COLUMNS, periodic=True)
    np.testing.assert_allclose(once, twice, atol=1e-12)


def test_only_sea_corners_count():
    field = np.array([[1.0, np.nan], [3.0, np.nan]])
    found = regrid_bilinear(field, [0.0, 1.0], [0.0, 1.0], [0.25], [0.0, 0.5, 0.9, 1.0])
    np.testing.assert_allclose(found[0, :3], 1.5, atol=1e-12)
    assert np.isnan(found[0, 3])


def test_the_coast_is_filled_up_to_the_distance():
    """Sea on one meridian; empty points east of it, 111.2 km a degree on the mean sphere."""
    field = np.full((3, 11), np.nan)
    field[:, 0] = [1.0, 2.0, 3.0]
    rows, columns = [-1.0, 0.0, 1.0], np.arange(0.0, 11.0)
    target = np.array([2.0, 4.9, 5.1])
    found = regrid_bilinear(field, rows, columns, [0.0], target, fill_distance_km=5.0 * 111.19)
    np.testing.assert_array_equal(found[0, :2], 2.0)
    assert np.isnan(found[0, 2])
    assert np.isnan(regrid_bilinear(field, rows, columns, [0.0], target)).all()


@pytest.mark.parametrize("side", [-1.0, 1.0])
def test_filling_reaches_north_and_south(side):
    rows = [-2.0, -1.0, 0.0, 1.0, 2.0]
    field = np.where(np.array(rows) == side * 2.0, 5.0, np.nan)[:, np.newaxis]
    assert regrid_bilinear(field, rows, [10.0], [0.0], [10.0], fill_distance_km=223.0)[0, 0] == 5.0
    assert np.isnan(regrid_bilinear(field, rows, [10.0], [0.0], [10.0], fill_distance_km=222.0)[0, 0])


def test_a_rounding_error_beyond_the_first_column_is_still_the_first_column():
    found = regrid_bilinear(_plane(ROWS, COLUMNS), ROWS, COLUMNS, [0.0], [20.0 - 1e-12, 40.0 + 1e-12])
    np.testing.assert_allclose(found[0], [1.0, -1.0], atol=1e-9)


def test_filling_reaches_across_the_dateline():
    field = np.array([[7.0, np.nan, np.nan, np.nan]])
    columns = [179.0, 180.0, 181.0, 182.0]
    found = regrid_bilinear(field, [0.0], columns, [0.0], [-179.0], fill_distance_km=250.0)
    assert found[0, 0] == 7.0


def test_nothing_to_fill_from():
    land = np.full((ROWS.size, COLUMNS.size), np.nan)
    assert np.isnan(regrid_bilinear(land, ROWS, COLUMNS, [0.0], [30.0], fill_distance_km=1e4)).all()
    sea = np.ones((ROWS.size, COLUMNS.size))
    assert np.isnan(regrid_bilinear(sea, ROWS, COLUMNS, [60.0], [30.0], fill_distance_km=100.0)).all()
    assert not np.isnan(regrid_bilinear(sea, ROWS, COLUMNS, [0.0], [30.0], fill_distance_km=100.0)).any()


@pytest.mark.parametrize(
    ("shape", "rows", "columns", "options", "name"),
    [
        ((2, 2), [0.0, 1.0, 2.0], [0.0, 1.0], {}, "field"),
        ((3, 2), [0.0, 2.0, 1.0], [0.0, 1.0], {}, "latitude"),
        ((2, 3), [0.0, 1.0], [0.0, 2.0, 1.0], {}, "longitude"),
        ((2, 2), [0.0, 1.0], [0.0, 1.0], {"fill_distance_km": -1.0}, "fill_distance_km"),
        ((2, 3), [0.0, 1.0], [0.0, 100.0, 200.0], {"periodic": True}, "periodic"),
    ],
)
def test_a_grid_that_does_not_fit_is_refused(shape, rows, columns, options, name):
    with pytest.raises(ValueError, match=name):
        regrid_bilinear(np.ones(shape), rows, columns, [0.5], [0.5], **options)
