"""The local plane: distances, poles, the dateline and the antipode."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pyproj import Geod

from setdrift.numerics.local_plane import MEAN_RADIUS_KM, to_plane

SPHERE = Geod(a=1000.0 * MEAN_RADIUS_KM, b=1000.0 * MEAN_RADIUS_KM)
CENTRES = [(0.0, 0.0), (179.9, 12.0), (-35.0, 47.0), (10.0, -89.0), (120.0, 90.0), (-180.0, -90.0)]

quickly = settings(deadline=None, derandomize=True, max_examples=100)


@pytest.mark.parametrize("centre", CENTRES)
def test_the_centre_is_the_origin(centre):
    np.testing.assert_allclose(to_plane(*centre, *centre), 0.0, atol=1e-9)


@pytest.mark.parametrize("centre", CENTRES)
def test_distance_to_the_centre_is_the_chord(centre):
    azimuth = np.arange(0.0, 360.0, 15.0)
    origin = np.full_like(azimuth, centre[0]), np.full_like(azimuth, centre[1])
    longitude, latitude, _ = SPHERE.fwd(*origin, azimuth, np.full_like(azimuth, 1.5e6))
    chord = 2.0 * MEAN_RADIUS_KM * np.sin(1500.0 / (2.0 * MEAN_RADIUS_KM))
    np.testing.assert_allclose(np.hypot(*to_plane(longitude, latitude, *centre)), chord, rtol=1e-9)


@pytest.mark.parametrize("centre", CENTRES)
def test_distances_between_places_within_1000_km_are_right_to_half_a_per_cent(centre):
    rng = np.random.default_rng(3)
    azimuth, distance = rng.uniform(0.0, 360.0, 80), 1e6 * np.sqrt(rng.uniform(0.0, 1.0, 80))
    origin = np.full_like(azimuth, centre[0]), np.full_like(azimuth, centre[1])
    longitude, latitude, _ = SPHERE.fwd(*origin, azimuth, distance)
    x, y = to_plane(longitude, latitude, *centre)
    i, j = np.triu_indices(80, 1)
    _, _, metres = SPHERE.inv(longitude[i], latitude[i], longitude[j], latitude[j])
    ratio = np.hypot(x[i] - x[j], y[i] - y[j]) / (metres / 1000.0)
    assert np.abs(ratio - 1.0).max() < 0.005


@quickly
@given(longitude=st.floats(-180.0, 180.0), latitude=st.floats(-90.0, 90.0), turns=st.integers(-2, 2))
def test_whole_turns_of_longitude_change_nothing(longitude, latitude, turns):
    here = to_plane(longitude, latitude, 30.0, 20.0)
    np.testing.assert_allclose(to_plane(longitude + 360.0 * turns, latitude, 30.0, 20.0), here, rtol=1e-9, atol=1e-6)


@quickly
@given(east=st.floats(-90.0, 90.0), latitude=st.floats(-80.0, 80.0))
def test_mirror_images_of_a_place_are_mirrored(east, latitude):
    x, y = to_plane(east, latitude, 0.0, 40.0)
    np.testing.assert_allclose(to_plane(-east, latitude, 0.0, 40.0), (-x, y), rtol=1e-12, atol=1e-9)
    np.testing.assert_allclose(to_plane(east, -latitude, 0.0, -40.0), (x, -y), rtol=1e-12, atol=1e-9)


def test_east_and_north_are_positive():
    x, y = to_plane([1.0, 0.0], [0.0, 1.0], 0.0, 0.0)
    assert x[0] > 100.0
    assert y[1] > 100.0


@pytest.mark.parametrize("centre", CENTRES)
def test_the_antipode_is_put_far_away(centre):
    distance = np.hypot(*to_plane(centre[0] + 180.0, -centre[1], *centre))
    assert np.isfinite(distance)
