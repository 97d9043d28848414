"""Maxima and closing levels: small fields by hand, laws, and contours just above and below the level."""

from __future__ import annotations

import contourpy
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.ndimage import gaussian_filter

from setdrift.numerics.eddy_flood import find_maxima

NAN = np.nan


def smooth_field(seed, shape=(40, 50), scale=2.5, mode="nearest"):
    field = gaussian_filter(np.random.default_rng(seed).standard_normal(shape), scale, mode=mode)
    return 0.1 * field / field.std()


def ringed(rows):
    """Field with a low rim, so that nothing touches the edge before level -1."""
    return np.pad(np.array(rows, dtype=float), 2, constant_values=-1.0)


def listed(maxima):
    return [(int(j), int(i), float(level)) for j, i, level in zip(*maxima, strict=True)]


def test_two_maxima_close_at_the_saddle_between_them():
    assert listed(find_maxima(ringed([[5, 2, 3]]), 0.5)) == [(2, 2, 2.0), (2, 4, 2.0)]


def test_a_bump_does_not_count():
    assert listed(find_maxima(ringed([[5, 2, 3]]), 1.0)) == [(2, 2, -1.0)]


def test_a_bump_at_the_edge_closes_a_contour_all_the_same():
    field = ringed([[5, 2, 3]])
    field[1, 4] = NAN
    assert listed(find_maxima(field, 1.0)) == [(2, 2, 2.0)]


def test_an_uneven_diagonal_joins_at_its_lower_end():
    # the mean of the cell, 2.75, is above its lower corner: a contour at 0.5 runs round both
    assert listed(find_maxima(ringed([[10, 0], [0, 1]]), 0.5)) == [(2, 2, -1.0)]


def test_an_even_diagonal_joins_at_the_mean():
    assert listed(find_maxima(ringed([[4, 0], [0, 4]]), 0.5)) == [(2, 2, 2.0), (3, 3, 2.0)]
    assert listed(find_maxima(ringed([[0, 4], [4, 0]]), 0.5)) == [(2, 3, 2.0), (3, 2, 2.0)]


def test_three_maxima_in_one_cell_of_saddles():
    field = ringed([[4, 0, 4], [0, 5, 0], [4, 0, 4]])
    # each corner joins the middle above the mean of its cell, (4 + 5 + 0 + 0) / 4
    assert {level for *_, level in listed(find_maxima(field, 0.5))} == {2.25}
    assert len(listed(find_maxima(field, 0.5))) == 5


@pytest.mark.parametrize("gap", [(1, 1), (2, 1), (3, 3)])
def test_a_gap_next_to_a_point_closes_there(gap):
    field = ringed([[5, 4], [3, 2]])
    field[gap] = NAN
    touching = [field[j, i] for j in range(6) for i in range(6) if max(abs(j - gap[0]), abs(i - gap[1])) == 1]
    level = np.nanmax(touching)
    assert [entry[2] for entry in listed(find_maxima(field, 0.5))] == ([] if level == 5 else [level])


@pytest.mark.parametrize(
    "field",
    [
        np.full((5, 6), NAN),
        np.full((5, 6), 1.0),
        np.ones((1, 1)),
        np.ones((2, 7)),
        np.array([[1.0, 2.0, 1.0]]),
        np.tile([1.0, NAN], (6, 3)),
    ],
    ids=["missing", "constant", "point", "strip", "row", "stripes"],
)
@pytest.mark.parametrize("periodic", [False, True])
def test_fields_without_closed_contours(field, periodic):
    assert find_maxima(field, 0.0, periodic=periodic).row.size == 0


def test_columns_are_joined_across_the_seam():
    field = np.roll(ringed([[5, 2, 3]]), 4, axis=1)
    assert listed(find_maxima(field, 0.5, periodic=True)) == [(2, 1, 2.0), (2, 6, 2.0)]
    assert listed(find_maxima(field, 0.5)) == [(2, 1, 2.0)]


@given(st.integers(0, 10**6), st.integers(1, 49))
@settings(deadline=None, derandomize=True, max_examples=20)
def test_turning_a_periodic_field_turns_the_maxima(seed, shift):
    field = smooth_field(seed, mode=("nearest", "wrap"))
    here = find_maxima(field, 0.01, periodic=True)
    there = find_maxima(np.roll(field, shift, axis=1), 0.01, periodic=True)
    turned = sorted((int(j), int(i + shift) % 50, float(level)) for j, i, level in zip(*here, strict=True))
    assert turned == sorted(listed(there))


@given(st.integers(0, 10**6))
@settings(deadline=None, derandomize=True, max_examples=20)
def test_reflection_reflects_the_maxima(seed):
    field = smooth_field(seed)
    here, there = find_maxima(field, 0.01), find_maxima(field[::-1, ::-1], 0.01)
    turned = sorted((39 - int(j), 49 - int(i), float(level)) for j, i, level in zip(*here, strict=True))
    assert turned == sorted(listed(there))


def enclosing_lines(field, level, row, column):
    """Closed contours at a level round a point, by an independent contouring."""
    lines = contourpy.contour_generator(z=field, line_type=contourpy.LineType.Separate).lines(level)
    closed = [line for line in lines if np.array_equal(line[0], line[-1])]
    return [line for line in closed if winding(line, column, row) > 0]


def winding(line, x, y):
    """Turns of a closed line round a point, anticlockwise."""
    angle = np.unwrap(np.arctan2(line[:, 1] - y, line[:, 0] - x))
    return round((angle[-1] - angle[0]) / (2 * np.pi))


@pytest.mark.parametrize("seed", range(4))
def test_contours_stop_closing_round_one_maximum_at_the_level(seed):
    field = smooth_field(seed)
    maxima = find_maxima(field, 0.0)
    assert maxima.row.size > 8
    for row, column, level in listed(maxima):
        others = [(j, i) for j, i, _ in listed(maxima) if (j, i) != (row, column)]

        def holds_it_alone(at, row=row, column=column, others=others):
            # outermost contour that runs anticlockwise round the point and is part of its own hill
            lines = enclosing_lines(field, at, row, column)
            return bool(lines) and not any(winding(line, i, j) for line in lines[:1] for j, i in others)

        assert holds_it_alone(level + 1e-7)
        assert not holds_it_alone(level - 1e-7)
