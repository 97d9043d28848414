"""Lengths of a degree, grid spacings and cell areas on the WGS 84 ellipsoid."""

from __future__ import annotations

import numpy as np
import pytest
from pyproj import Geod

from setdrift.numerics.authalic import authalic_latitude, authalic_radius
from setdrift.numerics.earth import metres_per_degree

GEOD = Geod(ellps="WGS84")
LATITUDE = np.arange(-89.5, 89.6, 1.0)


@pytest.mark.source("Karney (2013), geodesics on an ellipsoid: pyproj.Geod.inv")
def test_length_of_a_degree():
    zero, step = np.zeros_like(LATITUDE), 0.005
    _, _, north = GEOD.inv(zero, LATITUDE - step, zero, LATITUDE + step)
    _, _, east = GEOD.inv(zero - step, LATITUDE, zero + step, LATITUDE)
    ours_east, ours_north = metres_per_degree(LATITUDE)
    # the geodesic between points 0.01 degree apart on a parallel is shorter than the parallel by
    # (step sin(lat))^2 / 6, 1.3e-9; the meridian's curvature changes by less over the same step
    np.testing.assert_allclose(ours_north, north / (2 * step), rtol=1e-6)
    np.testing.assert_allclose(ours_east, east / (2 * step), rtol=1e-6)


@pytest.mark.source("lengths of a degree on WGS 84 as tabulated in handbooks (from memory), to 0.1 m")
@pytest.mark.parametrize(
    ("latitude", "east", "north"),
    [(0.0, 111319.5, 110574.3), (45.0, 78846.8, 111131.7), (60.0, 55800.0, 111412.2), (90.0, 0.0, 111693.9)],
)
def test_handbook_lengths(latitude, east, north):
    # the tables give the length of the degree centred on the latitude to a decimetre
    assert metres_per_degree(latitude)[0] == pytest.approx(east, abs=0.1)
    assert metres_per_degree(latitude)[1] == pytest.approx(north, abs=0.1)


@pytest.mark.source("Karney (2013), area of a geodesic polygon: pyproj.Geod.polygon_area_perimeter")
@pytest.mark.parametrize("latitude", [-75.0, -30.125, 0.0, 12.5, 45.0, 89.875])
def test_area_of_a_cell_on_the_authalic_sphere(latitude):
    edge = np.linspace(0.0, 0.25, 201)
    south, north = np.full_like(edge, latitude - 0.125), np.full_like(edge, latitude + 0.125)
    area, _ = GEOD.polygon_area_perimeter(np.concatenate([edge, edge[::-1]]), np.concatenate([south, north]))
    # 200 geodesics along each parallel instead of the parallel itself: parts in 1e8
    zone = np.diff(np.sin(np.deg2rad(authalic_latitude(np.array([latitude - 0.125, latitude + 0.125])))))
    assert authalic_radius() ** 2 * np.deg2rad(0.25) * zone[0] == pytest.approx(area, rel=1e-6)
