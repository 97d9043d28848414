"""Velocity along contours of flows whose rotation is known."""

from __future__ import annotations

import numpy as np
import pytest

from setdrift.numerics.earth import metres_per_degree
from setdrift.numerics.eddy_contours import contour_buffers, outer_contour
from setdrift.numerics.eddy_rotation import Flow, fastest_level, velocity_along

LATITUDE = 30.0 + 0.1 * np.arange(61)
LONGITUDE = -170.0 + 0.1 * np.arange(71)
EAST, NORTH = metres_per_degree(LATITUDE)
# a plane round the grid's middle; a degree of longitude taken as at the middle keeps the flow exactly circular
X = (LONGITUDE - LONGITUDE[35])[None, :] * EAST[30] + np.zeros((61, 1))
Y = (LATITUDE - LATITUDE[30])[:, None] * NORTH[30] + np.zeros((1, 71))
R = np.hypot(X, Y)
METRIC = (LONGITUDE, LATITUDE, np.full(61, EAST[30]), np.full(61, NORTH[30]), False)


def contour_at(height, level):
    points, crossings = contour_buffers(height.shape)
    n, _ = outer_contour(height, level, 30, 35, False, points, crossings)
    return points, n


def test_solid_rotation_is_measured_at_the_contour():
    flow = Flow(-1e-5 * Y, 1e-5 * X, *METRIC)
    velocity, length = velocity_along(*contour_at(-R, -100e3), flow)
    assert velocity == pytest.approx(1.0, rel=2e-3)
    assert length == pytest.approx(2 * np.pi * 100e3, rel=2e-3)


def test_a_steady_current_is_no_rotation():
    still, _ = velocity_along(*contour_at(-R, -100e3), Flow(np.full_like(X, 0.5), np.full_like(X, -0.2), *METRIC))
    assert still == pytest.approx(0.0, abs=2e-3)


def test_a_flow_out_of_the_middle_is_no_rotation():
    velocity, _ = velocity_along(*contour_at(-R, -100e3), Flow(1e-5 * X, 1e-5 * Y, *METRIC))
    assert velocity == pytest.approx(0.0, abs=2e-3)


def test_velocity_counts_where_it_is_known():
    u, v = -1e-5 * Y, 1e-5 * X
    u[:25] = np.nan
    velocity, length = velocity_along(*contour_at(-R, -100e3), Flow(u, v, *METRIC))
    assert velocity == pytest.approx(1.0, rel=3e-3)
    assert length == pytest.approx(2 * np.pi * 100e3, rel=2e-3)
    u[:33] = np.nan
    velocity, length = velocity_along(*contour_at(-R, -100e3), Flow(u, v, *METRIC))
    assert np.isnan(velocity)
    assert length == pytest.approx(2 * np.pi * 100e3, rel=2e-3)


@pytest.mark.parametrize("sense", [1.0, -1.0])
def test_the_fastest_contour_is_found_between_the_tried_levels(sense):
    # speed rises to a sharp crest at 73 km and falls again
    speed = 0.5 * np.exp(-np.abs(R - 73e3) / 60e3)
    flow = Flow(-sense * speed * Y / np.maximum(R, 1), sense * speed * X / np.maximum(R, 1), *METRIC)
    level, found = fastest_level(-R, -200e3, sense, 30, 35, flow, *contour_buffers(R.shape))
    assert -level == pytest.approx(73e3, rel=0.03)
    # the crest is sharper than the grid and loses a little
    assert found == pytest.approx(0.5, rel=0.05)


def test_the_outer_contour_may_be_the_fastest():
    flow = Flow(-1e-5 * Y, 1e-5 * X, *METRIC)
    level, found = fastest_level(-R, -150e3, 1.0, 30, 35, flow, *contour_buffers(R.shape))
    assert level == -150e3
    assert found == pytest.approx(1.5, rel=2e-3)


def test_unknown_velocity_is_said_so():
    nothing = np.full_like(X, np.nan)
    level, found = fastest_level(-R, -150e3, 1.0, 30, 35, Flow(nothing, nothing, *METRIC), *contour_buffers(R.shape))
    assert (level, found) == (-150e3, -np.inf)
