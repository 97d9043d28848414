"""The outermost fit level of hills whose contours are circles."""

from __future__ import annotations

import numpy as np
import pytest
from numba.core.dispatcher import Dispatcher

from setdrift.numerics import eddy_outlines as outlines
from setdrift.numerics.eddy_contours import contour_buffers

LATITUDE, LONGITUDE = np.linspace(-2, 2, 41), np.linspace(0, 4, 41)
RADIUS = 6371e3
DEGREE = RADIUS * np.pi / 180
LOOSE = outlines.Bounds(0.0, 1e14, 1.0, 2.0, 0.0, RADIUS)
HILL = -np.hypot((LONGITUDE - 2)[None, :], LATITUDE[:, None])


@pytest.fixture(params=["compiled", "interpreted"], autouse=True)
def _kernels(request, monkeypatch):
    for name, kernel in vars(outlines).copy().items():
        if request.param == "interpreted" and isinstance(kernel, Dispatcher):
            monkeypatch.setattr(outlines, name, kernel.py_func)


def outermost(field, closing, innermost, bounds=LOOSE, periodic=False):
    points, crossings = contour_buffers(field.shape)
    buffers = outlines.Buffers(points, np.empty_like(points), crossings)
    axes = (LONGITUDE * (90.0 if periodic else 1.0), LATITUDE)
    return outlines.outermost_level(field, *axes, periodic, closing, innermost, 20, 20, bounds, buffers)


def test_the_closing_level_serves_if_it_is_fit():
    assert outermost(HILL, -1.5, -0.5) == -1.5


def test_the_largest_area_is_met_closely():
    level = outermost(HILL, -1.5, -0.2, LOOSE._replace(maximum_area=np.pi * DEGREE**2))
    # 32 steps and 6 bisections leave a two-thousandth of the range; the polygon is a little inside its circle
    assert level == pytest.approx(-1.0, abs=0.005)


def test_a_foot_that_is_no_circle_is_cut_off():
    # a tongue leaves the hill below -0.83; at -0.93 it covers 1.5 per cent of the contour's area
    tongue = np.where((np.abs(LATITUDE)[:, None] < 0.15) & (LONGITUDE > 2)[None, :], 0.4 * HILL - 0.5, HILL)
    level = outermost(np.maximum(HILL, tongue), -1.19, -0.2, LOOSE._replace(maximum_misfit=0.03))
    assert -1.0 < level < -0.83


def test_small_contours_end_the_search():
    bounds = LOOSE._replace(maximum_misfit=1e-6)
    assert np.isnan(outermost(HILL, -1.5, -0.1, bounds._replace(minimum_cells=50.0)))
    assert np.isnan(outermost(HILL, -1.5, -0.1, bounds._replace(minimum_area=1e9)))
    assert np.isnan(outermost(HILL, -1.5, -0.5, bounds))


def test_dips_and_gaps_inside_are_passed_over():
    # the contour must shrink to leave a dip or a gap 0.7 degrees from the middle outside
    dip, gap = HILL.copy(), HILL.copy()
    dip[20, 27] = -3.0
    gap[20, 27] = np.nan
    for field in (dip, gap):
        assert outermost(field, -1.5, -0.2) == pytest.approx(-0.7, abs=0.12)
    assert outermost(dip, -1.5, -0.2, LOOSE._replace(dip=2.0)) == -1.5


def test_a_belt_round_the_globe_is_passed_over():
    belt = np.maximum(HILL, -1.0 - np.abs(LATITUDE)[:, None] / 2)
    assert outermost(belt, -1.5, -0.2, periodic=True) == pytest.approx(-1.0, abs=0.02)
