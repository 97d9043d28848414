"""The rule of thumb for mid-latitude surface currents."""

from __future__ import annotations

import numpy as np
import pytest

from setdrift.numerics.earth import metres_per_degree
from setdrift.numerics.geostrophy import f_plane_velocity, geostrophic_velocity

ROWS = np.arange(43.0, 47.01, 0.25)
COLUMNS = np.arange(0.0, 5.01, 0.25)
MIDDLE = np.flatnonzero(ROWS == 45.0)[0]


@pytest.mark.source("common practice, no source: 1 m in 100 km at 45 degrees is about 0.95 m s-1")
@pytest.mark.parametrize("hemisphere", [-1.0, 1.0])
def test_one_metre_in_a_hundred_kilometres(hemisphere):
    rows = np.sort(hemisphere * ROWS)
    _, north = metres_per_degree(45.0)
    poleward = np.tile((1e-5 * north * (np.abs(rows) - 45.0))[:, np.newaxis], (1, COLUMNS.size))
    # sea level that rises towards the pole drives a westward flow in both hemispheres
    u, v = f_plane_velocity(poleward, rows, COLUMNS)
    # "about 0.95" holds two digits
    np.testing.assert_allclose(u[MIDDLE], -0.95, rtol=0.02)
    np.testing.assert_allclose(v[MIDDLE], 0.0, atol=1e-12)


@pytest.mark.source("common practice, no source: 1 m in 100 km at 45 degrees is about 0.95 m s-1")
def test_the_same_eastward():
    east, _ = metres_per_degree(ROWS)
    eastward = 1e-5 * east[:, np.newaxis] * (COLUMNS - 2.5)
    flow = geostrophic_velocity(eastward, ROWS, COLUMNS)
    # high water to the east: northward flow in the northern hemisphere
    np.testing.assert_allclose(flow.northward[MIDDLE], 0.95, rtol=0.02)
