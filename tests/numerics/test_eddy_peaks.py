"""Fitted peaks of known surfaces."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.eddy_peaks import fit_peaks

Y, X = np.mgrid[0:7, 0:8].astype(float)


def fit(field, row=3, column=4):
    return [float(value[0]) for value in fit_peaks(field, np.array([row]), np.array([column]))]


@given(st.floats(-0.5, 0.5), st.floats(-0.5, 0.5), st.floats(0.2, 2), st.floats(0.2, 2), st.floats(-0.3, 0.3))
@settings(deadline=None, derandomize=True)
def test_quadratics_are_fitted_exactly(dy, dx, a, b, twist):
    y, x = Y - 3 - dy, X - 4 - dx
    twist *= np.sqrt(a * b)
    assert fit(2 - a * x**2 - b * y**2 - twist * x * y) == pytest.approx([3 + dy, 4 + dx, 2.0], abs=1e-6)


def test_a_gaussian_peak_keeps_its_height():
    for offset in (0.0, 0.25, 0.5):
        field = np.exp(-((X - 4 - offset) ** 2 + (Y - 3) ** 2) / (2 * 2.4**2))
        row, column, value = fit(field)
        assert (row, column) == pytest.approx((3, 4 + offset), abs=0.05)
        assert value == pytest.approx(1.0, abs=5e-3)


@pytest.mark.parametrize("field", [np.ones_like(X), X * Y, -((X - 9) ** 2) - Y**2, X**2 - Y**2], ids=str)
def test_without_a_near_peak_the_grid_point_serves(field):
    assert fit(field) == [3.0, 4.0, field[3, 4]]


def test_the_last_column_neighbours_the_first():
    field = -((np.minimum(X, 8 - X) - 0.0) ** 2) - (Y - 3) ** 2
    assert fit(field, 3, 0) == pytest.approx([3.0, 0.0, 0.0])
