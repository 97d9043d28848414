"""Least-cost links against all permutations, and neighbours against all pairs."""

from __future__ import annotations

from itertools import permutations

import numpy as np
import pytest
from pyproj import Geod

from setdrift.numerics.authalic import authalic_radius
from setdrift.numerics.eddy_links import Pairs, cheapest_links, nearby_pairs


def total_cost(table, partner, unlinked):
    return sum(unlinked if k < 0 else table[row, k] for row, k in enumerate(partner))


@pytest.mark.parametrize("seed", range(20))
def test_links_cost_no_more_than_any_other(seed):
    rng = np.random.default_rng(seed)
    rows, columns = (int(size) for size in rng.integers(1, 5, 2))
    table = np.where(rng.random((rows, columns)) < 0.7, rng.uniform(0, 6, (rows, columns)), np.inf)
    first, second = np.nonzero(np.isfinite(table))
    partner = cheapest_links(Pairs(first, second, table[first, second]), rows, columns, 4.0)
    choices = list(range(columns)) + [-1] * rows
    best = min(total_cost(table, choice, 4.0) for choice in permutations(choices, rows))
    assert total_cost(table, partner, 4.0) == pytest.approx(best)
    linked = partner[partner >= 0]
    assert np.unique(linked).size == linked.size


def test_no_pairs_leave_all_unlinked():
    nothing = Pairs(np.empty(0, int), np.empty(0, int), np.empty(0))
    np.testing.assert_array_equal(cheapest_links(nothing, 2, 3, 1.0), [-1, -1])
    assert cheapest_links(nothing, 0, 0, 1.0).size == 0


def test_a_link_as_dear_as_none_is_not_made():
    pair = Pairs(np.array([0]), np.array([0]), np.array([4.0]))
    np.testing.assert_array_equal(cheapest_links(pair, 1, 1, 4.0), [-1])
    np.testing.assert_array_equal(cheapest_links(pair, 1, 1, 4.1), [0])


def test_neighbours_are_those_within_the_distance():
    rng = np.random.default_rng(1)
    longitude, latitude = rng.uniform(170, 190, 60), rng.uniform(-10, 10, 60)
    other_longitude, other_latitude = rng.uniform(-190, -170, 50), rng.uniform(-10, 10, 50)
    near = nearby_pairs(longitude, latitude, other_longitude, other_latitude, 400e3)
    sphere = Geod(a=authalic_radius(), f=0)
    one, two = np.meshgrid(np.arange(60), np.arange(50), indexing="ij")
    distance = sphere.inv(longitude[one], latitude[one], other_longitude[two], other_latitude[two])[2]
    first, second = np.nonzero(distance <= 400e3)
    assert first.size > 50
    np.testing.assert_array_equal(near.first, first)
    np.testing.assert_array_equal(near.second, second)
    np.testing.assert_allclose(near.value, distance[first, second], rtol=1e-9)


def test_an_empty_set_has_no_neighbours():
    assert nearby_pairs(np.empty(0), np.empty(0), np.ones(3), np.ones(3), 1e6).first.size == 0
    assert nearby_pairs(np.ones(3), np.ones(3), np.empty(0), np.empty(0), 1e6).second.size == 0
