"""The local plane against PROJ and a worked example."""

from __future__ import annotations

import numpy as np
import pytest
from pyproj import Proj

from setdrift.numerics.local_plane import MEAN_RADIUS_KM, to_plane

CENTRES = [(0.0, 0.0), (179.9, 12.0), (-35.0, 47.0), (10.0, -89.9), (120.0, 90.0), (-60.0, -90.0)]


@pytest.mark.source("PROJ, +proj=laea on the sphere (Snyder 1987, equations 22-4, 22-5, 24-2)")
@pytest.mark.parametrize("centre", CENTRES)
def test_equal_area_plane_agrees_with_proj(centre):
    rng = np.random.default_rng(2)
    longitude = rng.uniform(-180.0, 180.0, 2000)
    latitude = np.rad2deg(np.arcsin(rng.uniform(-1.0, 1.0, 2000)))
    project = Proj(proj="laea", lon_0=centre[0], lat_0=centre[1], R=1000.0 * MEAN_RADIUS_KM)
    east, north = project(longitude, latitude)
    x, y = to_plane(longitude, latitude, *centre)
    # the same formula: only rounding, which grows like the inverse square of the distance to the antipode, and
    # none of these random places is nearer to it than half a degree
    assert np.hypot(x, y).max() < 2.0 * MEAN_RADIUS_KM * np.cos(np.deg2rad(0.25))
    np.testing.assert_allclose(x, np.array(east) / 1000.0, rtol=1e-9, atol=1e-6)
    np.testing.assert_allclose(y, np.array(north) / 1000.0, rtol=1e-9, atol=1e-6)


@pytest.mark.source("Snyder (1987), Map Projections: A Working Manual, Appendix A, pages 332-333")
def test_worked_example_on_a_sphere_of_radius_three():
    x, y = to_plane(100.0, -20.0, -100.0, 40.0)
    scaled = 3.0 / MEAN_RADIUS_KM
    # seven decimals are given
    np.testing.assert_allclose((x * scaled, y * scaled), (-4.2339303, 4.0257775), atol=6e-8)
