"""Segments of a track: short ones stand alone between gaps."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.segments import BREAK_STEPS, in_short_segments, usual_step

NO_CUTS = np.empty(0)


def seconds_of(*lengths: int, gap: float = 30.0, step: float = 1.0) -> np.ndarray:
    """Times of segments of some lengths, a gap between each two."""
    starts = np.cumsum([0.0, *(step * (n - 1) + gap for n in lengths[:-1])])
    return np.concatenate([start + step * np.arange(n) for start, n in zip(starts, lengths, strict=True)])


def test_only_segments_of_fewer_points_are_short() -> None:
    lengths = [50, 2, 40, 3, 1, 60, 4]
    found = in_short_segments(seconds_of(*lengths), 3, NO_CUTS)
    np.testing.assert_array_equal(found, np.repeat([n < 3 for n in lengths], lengths))


@pytest.mark.parametrize("fewest", [0, 1])
def test_no_segment_has_fewer_points_than_one(fewest: int) -> None:
    assert not in_short_segments(seconds_of(30, 1, 1, 20), fewest, NO_CUTS).any()


@pytest.mark.parametrize(("steps", "short"), [(BREAK_STEPS, False), (BREAK_STEPS + 0.01, True)])
def test_a_gap_is_more_than_so_many_usual_steps(steps: float, short: bool) -> None:
    time = seconds_of(40, 2, 40, gap=steps * 1.5, step=1.5)
    np.testing.assert_array_equal(np.flatnonzero(in_short_segments(time, 3, NO_CUTS)), [40, 41] if short else [])


@pytest.mark.parametrize("cut", [42.5, 39 + 30 - 4.0, 39 + 30 + 1 + 4.0])
def test_a_segment_at_a_cut_is_not_short(cut: float) -> None:
    time = seconds_of(40, 2, 40)
    expected = [] if cut > 60.0 else [40, 41]
    np.testing.assert_array_equal(np.flatnonzero(in_short_segments(time, 3, np.array([-500.0, cut, 900.0]))), expected)


@given(lengths=st.lists(st.integers(1, 12), min_size=1, max_size=12), fewest=st.integers(0, 8), seed=st.integers(0, 99))
@settings(deadline=None, derandomize=True, max_examples=80)
def test_reversing_time_changes_nothing(lengths: list[int], fewest: int, seed: int) -> None:
    time = seconds_of(*lengths) + 0.3 * np.random.default_rng(seed).random(sum(lengths))
    cuts = np.sort(np.random.default_rng(seed).uniform(0.0, time[-1] + 1.0, 3))
    backward = in_short_segments(-time[::-1], fewest, -cuts[::-1])
    np.testing.assert_array_equal(in_short_segments(time, fewest, cuts), backward[::-1])


def test_a_single_point_alone_is_short_and_none_is_no_error() -> None:
    assert in_short_segments(np.array([5.0]), 3, NO_CUTS).tolist() == [True]
    assert in_short_segments(np.empty(0), 3, NO_CUTS).size == 0
    # nothing tells how long a usual step is
    assert usual_step(np.zeros(3)) == np.inf


@pytest.mark.parametrize(
    ("name", "time", "cuts"),
    [("time", [0.0, -1.0], []), ("time", [0.0, np.nan], []), ("cuts", [0.0], [2.0, 1.0])],
)
def test_times_that_descend_are_refused(name: str, time: list[float], cuts: list[float]) -> None:
    with pytest.raises(ValueError, match=name):
        in_short_segments(np.array(time), 3, np.array(cuts))
