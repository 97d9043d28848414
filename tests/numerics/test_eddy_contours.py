"""Contours against contourpy, and what they enclose against point-in-polygon."""

from __future__ import annotations

import contourpy
import numpy as np
import pytest
from matplotlib.path import Path
from numba.core.dispatcher import Dispatcher
from scipy.ndimage import gaussian_filter

from setdrift.numerics import eddy_contours as contours

NAN = np.nan


@pytest.fixture(params=["compiled", "interpreted"])
def kernels(request, monkeypatch):
    """Run a test with the kernels as compiled and as plain Python."""
    for name, kernel in vars(contours).copy().items():
        if request.param == "interpreted" and isinstance(kernel, Dispatcher):
            monkeypatch.setattr(contours, name, kernel.py_func)


def rough_field(seed, shape=(30, 36), scale=1.2):
    field = gaussian_filter(np.random.default_rng(seed).standard_normal(shape), scale, mode="nearest")
    return field / field.std()


def trace(field, level, row, column, periodic=False):
    points, crossings = contours.contour_buffers(field.shape)
    n, crossed = contours.outer_contour(field, level, row, column, periodic, points, crossings)
    return points[:, :n].T.copy(), crossings[:crossed].copy()


def line_area(line):
    x, y = line.T
    return 0.5 * np.sum(x * np.roll(y, -1) - np.roll(x, -1) * y)


def closed_lines(field, level):
    lines = contourpy.contour_generator(z=field, line_type=contourpy.LineType.Separate).lines(level)
    return [line[:-1] for line in lines if np.array_equal(line[0], line[-1])]


@pytest.mark.parametrize("seed", range(5))
def test_contours_are_those_of_contourpy(seed):
    field = rough_field(seed)
    compared = 0
    for level in (-0.5, 0.0, 0.3, 1.0):
        # every hill: contours that run anticlockwise round higher values
        hills = {round(line_area(line), 9): line for line in closed_lines(field, level) if line_area(line) > 0}
        for row, column in np.argwhere(field > level):
            line, _ = trace(field, level, row, column)
            if line.size:
                compared += 1
                twin = hills[round(line_area(line), 9)]
                assert len(line) == len(twin)
                start = np.argmin(np.hypot(*(twin - line[0]).T))
                np.testing.assert_allclose(line, np.roll(twin, -start, axis=0), atol=1e-12)
    assert compared > 100


@pytest.mark.parametrize("seed", range(3))
def test_enclosed_points_are_those_in_the_polygon(seed):
    field = rough_field(seed)
    i, j = np.meshgrid(np.arange(36), np.arange(30))
    compared = 0
    for row, column in np.argwhere(field > 0.1):
        line, crossings = trace(field, 0.1, row, column)
        if line.size:
            compared += 1
            inside = Path(line).contains_points(np.stack([i.ravel(), j.ravel()], axis=1))
            assert contours.count_enclosed(field, crossings, -np.inf) == inside.sum()
            lowest = field.ravel()[inside].min()
            assert contours.count_enclosed(field, crossings, lowest) == 0
            assert contours.count_enclosed(field, crossings, np.nextafter(lowest, -np.inf)) == inside.sum()
    assert compared > 30


@pytest.mark.usefixtures("kernels")
def test_the_contour_goes_round_dips():
    field = np.pad(np.ones((5, 9)), 2)
    field[4, 5], field[4, 8] = -1.0, 0.2
    line, crossings = trace(field, 0.5, 4, 3)
    assert line_area(line) > 40
    assert contours.count_enclosed(field, crossings, 0.5) == 0
    assert contours.count_enclosed(field, crossings, -1.5) == 45


@pytest.mark.usefixtures("kernels")
def test_a_gap_inside_is_no_contour_or_not_sound():
    field = np.pad(np.ones((5, 9)), 2)
    field[4, 5] = NAN
    assert trace(field, 0.5, 4, 3)[0].size == 0
    line, crossings = trace(field, 0.5, 2, 3)
    assert line.size
    assert contours.count_enclosed(field, crossings, -np.inf) == 0


@pytest.mark.usefixtures("kernels")
@pytest.mark.parametrize("row_column", [(0, 3), (6, 3), (3, 0), (3, 6)])
@pytest.mark.parametrize("periodic", [False, True])
def test_contours_that_meet_the_edge_are_open(row_column, periodic):
    field = np.zeros((7, 7))
    field[row_column] = 1.0
    closed = periodic and row_column[0] == 3
    assert (trace(field, 0.5, *row_column, periodic)[0].size > 0) == closed


@pytest.mark.usefixtures("kernels")
def test_contours_round_the_globe_are_open():
    field = np.zeros((7, 7))
    field[3] = [1, 1, 1, 1, 1, 1, 1]
    assert trace(field, 0.5, 3, 2, True)[0].size == 0
    field[3, 5] = 0
    line, crossings = trace(field, 0.5, 3, 2, True)
    assert line_area(line) > 5
    assert contours.count_enclosed(field, crossings, 0.5) == 6


@pytest.mark.usefixtures("kernels")
def test_a_spiral_of_more_than_a_turn_is_given_up():
    # an arm that climbs twice round a narrow globe; on a wide one it is closed
    wide = np.zeros((30, 20))
    for k in range(12):
        wide[3 + 2 * k : 6 + 2 * k, 3 + k] = 1.0
    narrow = wide[:, :6] + wide[:, 6:12] + wide[:, 12:18]
    assert narrow.max() == 1.0
    assert trace(wide, 0.5, 4, 3)[0].size
    assert trace(narrow, 0.5, 4, 3, True)[0].size == 0


@pytest.mark.usefixtures("kernels")
def test_a_point_not_above_the_level_has_no_contour():
    field = np.pad(np.ones((3, 3)), 2)
    assert trace(field, 1.0, 3, 3)[0].size == 0
    assert trace(field, 1.0, 3, 3, True)[0].size == 0


@pytest.mark.usefixtures("kernels")
def test_a_full_buffer_ends_the_search():
    field = np.pad(np.ones((3, 3)), 2)
    assert contours.follow_contour(field, 0.5, 3, 4, False, np.empty((2, 5)), np.empty(5, np.int64)) == (0, 0)
    assert contours.follow_contour(field, 0.5, 3, 4, False, np.empty((2, 12)), np.empty(12, np.int64)) == (12, 6)


@pytest.mark.usefixtures("kernels")
def test_values_on_sides_follow_a_cubic():
    y, x = np.mgrid[0:6, 0:7].astype(float)
    values = x**3 - 2 * y**3 + x**2 - y + 0.5 * x
    for at in (2.25, 3.9):
        assert contours.value_on_side(values, False, at, 2.0) == pytest.approx(at**3 - 18 + at**2 + 0.5 * at)
        assert contours.value_on_side(values, False, 4.0, at - 1) == pytest.approx(82 - 2 * (at - 1) ** 3 - at + 1)
    assert contours.value_on_side(values, False, 3.0, 2.0) == values[2, 3]


@pytest.mark.usefixtures("kernels")
def test_values_on_sides_are_linear_next_to_gaps_and_edges():
    values = np.array([[0.0, 1.0, 4.0, 9.0], [0.0, 1.0, 4.0, NAN]])
    assert contours.value_on_side(values, False, 0.5, 0.0) == 0.5
    assert contours.value_on_side(values, False, 1.5, 0.0) == 2.25
    assert contours.value_on_side(values, False, 1.5, 1.0) == 2.5
    assert contours.value_on_side(values, True, 0.5, 0.0) == -0.25
    assert np.isnan(contours.value_on_side(values, False, 2.5, 1.0))
    assert contours.value_on_side(values, False, 2.0, 0.5) == 4.0
