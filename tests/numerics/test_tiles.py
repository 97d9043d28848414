"""Tiles of the globe: their weights, their places and their sizes."""

from __future__ import annotations

import numpy as np
import pytest
from pyproj import Geod

from setdrift.numerics.local_plane import MEAN_RADIUS_KM, to_plane
from setdrift.numerics.tiles import OVERLAP, tiles_over

GRIDS = {
    "regional": (np.arange(-9.0, 17.1, 0.5), np.arange(-40.0, -15.9, 0.5)),
    "periodic": (np.arange(-88.75, 89.0, 2.5), np.arange(-178.75, 180.0, 2.5)),
    "dateline": (np.arange(30.0, 45.1, 0.5), np.arange(170.0, 195.1, 0.5)),
    "greenwich": (np.arange(30.0, 45.1, 0.5), np.arange(350.0, 371.0, 0.5)),
    "polar": (np.arange(85.1, 89.95, 0.2), np.arange(-179.5, 180.0, 5.0)),
    "pole": (np.array([89.9, 90.0]), np.arange(-180.0, 180.0, 10.0)),
    "south pole": (np.array([-90.0, -89.9]), np.arange(-180.0, 180.0, 10.0)),
    "one point": (np.array([12.3]), np.array([-45.6])),
}


def total_weight(latitude, longitude, size):
    total = np.zeros((latitude.size, longitude.size))
    for tile in tiles_over(latitude, longitude, size):
        total[np.ix_(tile.rows, tile.columns)] += tile.weight
    return total


@pytest.mark.parametrize("grid", GRIDS)
@pytest.mark.parametrize("size", [1.0, 2.0, 10.0])
def test_weights_sum_to_one(grid, size):
    latitude, longitude = GRIDS[grid]
    total = total_weight(latitude, longitude, size)
    # the last row of tiles has no neighbour beyond the pole: within its overlap the weights sum to less than one
    inside = np.abs(latitude) <= 90.0 - OVERLAP * size
    np.testing.assert_allclose(total[inside], 1.0, rtol=1e-12)
    assert np.all(total >= 0.5 - 1e-12)


@pytest.mark.parametrize("grid", GRIDS)
def test_weights_are_positive_and_at_most_one(grid):
    for tile in tiles_over(*GRIDS[grid], 2.0):
        assert tile.weight.shape == (tile.rows.size, tile.columns.size)
        assert tile.weight.min() > 0.0
        assert tile.weight.max() <= 1.0


def test_weights_fade_without_a_step():
    latitude = np.arange(38.0, 46.0, 0.01)
    for tile in tiles_over(latitude, np.array([0.5]), 2.0):
        if 40.0 < tile.latitude < 44.0:
            across = np.concatenate(([0.0], tile.weight[:, 0], [0.0]))
            # a smooth step of width 1 degree is steepest at 1.5 a degree
            assert np.abs(np.diff(across)).max() <= 0.0151


def test_overlapping_grids_are_served_by_the_same_tiles():
    latitude, longitude = GRIDS["regional"]
    whole = {(tile.latitude, tile.longitude): tile for tile in tiles_over(latitude, longitude, 2.0)}
    shared = 0
    for tile in tiles_over(latitude[7:31], longitude[11:29], 2.0):
        same = whole[tile.latitude, tile.longitude]
        assert (tile.half_width, tile.half_height) == (same.half_width, same.half_height)
        rows, columns = np.isin(same.rows, tile.rows + 7), np.isin(same.columns, tile.columns + 11)
        np.testing.assert_array_equal(same.weight[np.ix_(rows, columns)], tile.weight)
        shared += 1
    assert shared > 20


def test_a_grid_shifted_by_whole_turns_is_served_by_the_same_tiles():
    latitude, longitude = GRIDS["dateline"]
    here, there = (list(tiles_over(latitude, longitude + turn, 2.0)) for turn in (0.0, -360.0))
    assert [(tile.latitude, tile.longitude) for tile in here] == [(tile.latitude, tile.longitude) for tile in there]
    for a, b in zip(here, there, strict=True):
        # where a weight is zero but for rounding, the point may be left out
        whole = np.zeros((2, latitude.size, longitude.size))
        whole[0][np.ix_(a.rows, a.columns)] = a.weight
        whole[1][np.ix_(b.rows, b.columns)] = b.weight
        np.testing.assert_allclose(whole[0], whole[1], atol=1e-12)


def test_tiles_run_south_to_north_and_west_to_east():
    places = [(tile.latitude, tile.longitude) for tile in tiles_over(*GRIDS["periodic"], 2.0)]
    assert places == sorted(places)
    assert len(set(places)) == len(places)


def test_hemispheres_mirror_each_other():
    latitude = np.arange(-20.0, 20.1, 0.5)
    places = {(tile.latitude, tile.longitude): tile for tile in tiles_over(latitude, np.arange(0.0, 10.0), 2.0)}
    for (south, longitude), tile in places.items():
        mirrored = places[-south, longitude]
        np.testing.assert_array_equal(mirrored.weight, tile.weight[::-1])


def test_tiles_are_as_wide_as_high_on_the_ground():
    latitude, longitude = np.arange(-69.0, 70.0, 2.0), np.arange(-180.0, 180.0, 1.0)
    geod = Geod(a=1.0, b=1.0)
    by_row = {}
    for tile in tiles_over(latitude, longitude, 2.0):
        by_row.setdefault(tile.latitude, []).append(tile.longitude)
    for centre, longitudes in by_row.items():
        width = 360.0 / len(longitudes)
        ground = np.rad2deg(geod.inv(0.0, centre, width, centre)[2])
        # a whole number of tiles round the globe: at 69 degrees 65 of them, so 1 % at most
        assert ground == pytest.approx(2.0, rel=0.01)


@pytest.mark.parametrize("grid", ["regional", "periodic", "dateline", "polar", "pole"])
def test_reach_holds_every_point_served(grid):
    latitude, longitude = GRIDS[grid]
    for tile in tiles_over(latitude, longitude, 2.0):
        rows, columns = np.meshgrid(latitude[tile.rows], longitude[tile.columns], indexing="ij")
        x, y = to_plane(columns.ravel(), rows.ravel(), tile.longitude, tile.latitude)
        # parallels curve on the plane: at 87 degrees a corner is 1.4 % farther north
        assert np.abs(x).max() <= 1.001 * tile.half_width
        assert np.abs(y).max() <= 1.02 * tile.half_height


def test_half_height_is_the_overlap_beyond_half_a_tile():
    tile = next(tiles_over(*GRIDS["one point"], 2.0))
    assert tile.half_height == pytest.approx((0.5 + OVERLAP) * np.deg2rad(2.0) * MEAN_RADIUS_KM, rel=1e-3)


@pytest.mark.parametrize("size", [7.0, 0.37, 200.0])
def test_a_size_that_does_not_divide_the_globe_is_refused(size):
    with pytest.raises(ValueError, match="size: must divide 180 degrees"):
        list(tiles_over(*GRIDS["one point"], size))


def test_a_grid_point_is_served_by_four_tiles_at_most_between_the_polar_rows():
    latitude, longitude = GRIDS["regional"]
    served = np.zeros((latitude.size, longitude.size), dtype=int)
    for tile in tiles_over(latitude, longitude, 2.0):
        served[np.ix_(tile.rows, tile.columns)] += 1
    assert served.min() == 1
    assert served.max() == 4
