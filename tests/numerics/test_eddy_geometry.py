"""Areas against the ellipsoid and pyproj, misfits against closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pyproj import Geod, Transformer

from setdrift.numerics.authalic import authalic_latitude, authalic_radius
from setdrift.numerics.earth import WGS84
from setdrift.numerics.eddy_geometry import (
    area_and_misfit,
    interpolate_axis,
    project_points,
)


def misfit_of(x, y):
    return area_and_misfit(np.array([x, y], dtype=float), len(x))


def ring(n=4000):
    angle = np.linspace(0, 2 * np.pi, n, endpoint=False)
    return np.cos(angle), np.sin(angle)


@pytest.mark.parametrize("centre", [(0.0, 0.0), (179.9, 35.0), (20.0, -62.0), (300.0, 85.0)])
def test_areas_are_those_of_the_ellipsoid(centre):
    longitude, latitude = centre[0] - 5 + np.arange(41) * 0.25, centre[1] - 4 + np.arange(33) * 0.25
    x, y = ring(200)
    points = np.ascontiguousarray([20 + 9 * x, 16 + 7 * y + x])
    plane = np.empty_like(points)
    project_points(points, 200, authalic_latitude(latitude), longitude, 16, 20, authalic_radius(), plane)
    line = np.interp(points[0], np.arange(41), longitude), np.interp(points[1], np.arange(33), latitude)
    area, _ = area_and_misfit(plane, 200)
    geodesic, _ = Geod(ellps="WGS84").polygon_area_perimeter(*line)
    # straight lines of the plane and geodesics part by metres over 25 km sides
    assert area == pytest.approx(abs(geodesic), rel=1e-5)


def test_the_plane_is_that_of_pyproj():
    sphere = f"+proj=laea +lat_0=40 +lon_0=10 +R={authalic_radius():.9f} +type=crs"
    project = Transformer.from_crs(f"+proj=longlat +R={authalic_radius():.9f} +type=crs", sphere, always_xy=True)
    longitude, latitude = 8.0 + np.arange(17) * 0.25, 38.0 + np.arange(17) * 0.25
    points = np.random.default_rng(0).uniform(0, 16, (2, 50))
    plane = np.empty_like(points)
    project_points(points, 50, latitude, longitude, 8, 8, authalic_radius(), plane)
    expected = project.transform(8.0 + points[0] * 0.25, 38.0 + points[1] * 0.25)
    np.testing.assert_allclose(plane, expected, atol=1e-3)


def test_a_circle_fits_itself():
    area, misfit = misfit_of(*ring())
    assert area == pytest.approx(np.pi, rel=1e-5)
    assert misfit == pytest.approx(0, abs=1e-4)


@pytest.mark.parametrize("ratio", [1.5, 2.0, 3.0, 10.0])
def test_the_misfit_of_an_ellipse(ratio):
    x, y = ring()
    area, misfit = misfit_of(np.sqrt(ratio) * x, y / np.sqrt(ratio))
    assert area == pytest.approx(np.pi, rel=1e-5)
    # the parts of the ellipse inside the circle: two sectors of the circle, two of the (stretched) ellipse
    assert misfit == pytest.approx(2 - 8 / np.pi * np.arctan(1 / np.sqrt(ratio)), abs=1e-4)


def test_the_misfit_of_a_square():
    half = np.sqrt(np.pi) / 2
    _, misfit = misfit_of([half, -half, -half, half], [half, half, -half, -half])
    # four segments of the unit circle stick out over the sides
    segment = np.arccos(half) - half * np.sqrt(1 - half**2)
    assert misfit == pytest.approx(2 * 4 * segment / np.pi, rel=1e-12)


def test_the_misfit_of_a_ring_that_misses_its_centre():
    # a thin horseshoe: its centroid is outside it and the circle of its area covers little of it
    angle = np.linspace(0.3, 2 * np.pi - 0.3, 400)
    x = np.concatenate([10 * np.cos(angle), 9.9 * np.cos(angle[::-1])])
    y = np.concatenate([10 * np.sin(angle), 9.9 * np.sin(angle[::-1])])
    area, misfit = misfit_of(x, y)
    assert area == pytest.approx((10**2 - 9.9**2) * (np.pi - 0.3), rel=1e-3)
    assert misfit == pytest.approx(2.0)


@given(st.floats(-3, 3), st.floats(0, 6.2), st.floats(0.1, 10), st.booleans())
@settings(deadline=None, derandomize=True)
def test_the_misfit_knows_neither_place_nor_turn_nor_size(shift, turn, size, backwards):
    x, y = ring(60)
    x, y = x * (1 + 0.3 * y), 0.6 * y + 0.2 * x**2
    moved = size * (np.cos(turn) * x - np.sin(turn) * y) + shift, size * (np.sin(turn) * x + np.cos(turn) * y) - shift
    if backwards:
        moved = moved[0][::-1], moved[1][::-1]
    area, misfit = misfit_of(x, y)
    moved_area, moved_misfit = misfit_of(*moved)
    assert moved_area == pytest.approx(size**2 * area, rel=1e-9)
    assert moved_misfit == pytest.approx(misfit, abs=1e-9)


def test_a_polygon_without_area_does_not_fit():
    assert misfit_of([0, 1, 2], [0, 1, 2]) == (0.0, 2.0)
    assert area_and_misfit.py_func(np.array([[0.0, 1.0, 2.0], [0.0, 1.0, 2.0]]), 3) == (0.0, 2.0)


def test_repeated_points_change_nothing():
    x, y = ring(40)
    assert misfit_of(np.repeat(x, 2), np.repeat(y, 2)) == pytest.approx(misfit_of(x, y))


def test_an_axis_goes_on_round_the_globe():
    longitude = np.array([10.0, 100.0, 190.0, 280.0])
    positions = (-1.5, -1.0, 0.0, 0.5, 3.5, 4.0, 8.25)
    found = [interpolate_axis(longitude, position, 360.0) for position in positions]
    assert found == [-125.0, -80.0, 10.0, 55.0, 325.0, 370.0, 752.5]


def test_the_ellipsoid_is_not_a_sphere():
    assert abs(authalic_latitude(np.array(45.0)) - 45.0) == pytest.approx(0.128, abs=1e-3)
    assert authalic_radius() < WGS84.semi_major_axis
