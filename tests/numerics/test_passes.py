"""Passes and spikes along a satellite's track."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.passes import infer_passes, turning_points
from setdrift.numerics.spikes import find_spikes

PERIOD = 6000.0
INCLINATION = 66.0


def orbit(time: np.ndarray) -> np.ndarray:
    """Latitude along a circular orbit, degrees."""
    return np.rad2deg(np.arcsin(np.sin(np.deg2rad(INCLINATION)) * np.sin(2 * np.pi * time / PERIOD)))


def true_passes(time: np.ndarray) -> np.ndarray:
    """Number of half revolutions between extremes of latitude."""
    return np.floor(time / PERIOD * 2 + 0.5).astype(int)


def test_polar_turns_of_a_whole_day() -> None:
    time = np.arange(0.0, 86400.0, 1.0)
    passes = infer_passes(time, orbit(time), 300.0)
    # at each of the 29 turns, the extreme and its like neighbour may go to either pass
    assert np.count_nonzero(passes != true_passes(time)) <= 2 * 29
    assert passes[-1] == true_passes(time)[-1]


@given(seed=st.integers(0, 2**31))
@settings(deadline=None, derandomize=True, max_examples=25)
def test_noise_gaps_and_repeats_make_no_pass(seed: int) -> None:
    rng = np.random.default_rng(seed)
    time = np.arange(0.0, 30000.0, 1.0)
    starts = rng.uniform(0, 30000, 20)
    kept = np.all([(time < s) | (time > s + rng.uniform(0, 250)) for s in starts], axis=0)
    time = np.sort(np.concatenate([time[kept], rng.choice(time[kept], 200)]))
    latitude = orbit(time) + rng.normal(0, 0.01, time.size)
    strays = rng.choice(time.size // 10, 10, replace=False) * 10 + 5
    latitude[strays] = rng.uniform(-66, 66, strays.size)
    passes = infer_passes(time, latitude, 300.0)
    # gaps of nearly 5 minutes may run into one another, which rightly starts a pass
    extra = np.count_nonzero(np.diff(time) > 300.0)
    assert true_passes(time)[-1] <= passes[-1] <= true_passes(time)[-1] + extra
    far_from_turns = abs((time / PERIOD * 2 + 0.5) % 1.0 - 0.5) < 0.4
    for number in np.unique(passes):
        assert np.unique(true_passes(time)[(passes == number) & far_from_turns]).size <= 1


def test_gap_in_time_starts_a_pass() -> None:
    time = np.array([0.0, 1.0, 302.0, 303.0, 603.0])
    np.testing.assert_array_equal(infer_passes(time, time / 20.0, 300.0), [0, 0, 1, 1, 1])


def test_southward_then_northward() -> None:
    latitude = np.array([5.0, 4.0, 3.0, 2.0, 2.0, 3.0, 4.0])
    assert turning_points(latitude) in ([3], [4])


@pytest.mark.parametrize("count", [0, 1, 2, 3])
def test_short_series(count: int) -> None:
    np.testing.assert_array_equal(infer_passes(np.arange(count) * 1.0, np.arange(count) * 1.0, 300.0), np.zeros(count))


def test_wrong_arguments_are_named() -> None:
    with pytest.raises(ValueError, match="time"):
        infer_passes(np.array([1.0, 0.0]), np.zeros(2), 300.0)
    with pytest.raises(ValueError, match="time"):
        infer_passes(np.array([1.0, np.nan]), np.zeros(2), 300.0)
    with pytest.raises(ValueError, match="latitude"):
        infer_passes(np.zeros(2), np.array([1.0, np.nan]), 300.0)
    with pytest.raises(ValueError, match="latitude"):
        infer_passes(np.zeros(2), np.zeros(3), 300.0)
    with pytest.raises(ValueError, match="values"):
        find_spikes(np.zeros(2), np.array([0.0, np.nan]), np.zeros(2, int), 9, 5.0, 0.1)
    with pytest.raises(ValueError, match="values"):
        find_spikes(np.zeros(2), np.zeros(3), np.zeros(2, int), 9, 5.0, 0.1)


def profile(count: int, rng: np.random.Generator) -> np.ndarray:
    """Two eddies and a steep front, with noise of 2 cm; 6 km between points."""
    s = 6.0 * np.arange(count)
    eddies = 0.25 * np.exp(-(((s - 500) / 60) ** 2)) - 0.3 * np.exp(-(((s - 900) / 70) ** 2))
    return np.asarray(eddies + 0.4 * np.tanh((s - 1400) / 50) + rng.normal(0, 0.02, count))


@given(seed=st.integers(0, 2**31))
@settings(deadline=None, derandomize=True, max_examples=40)
def test_spikes_are_found_and_nothing_else(seed: int) -> None:
    rng = np.random.default_rng(seed)
    values = profile(300, rng)
    spikes = np.zeros(300, dtype=bool)
    spikes[rng.choice(60, 8, replace=False) * 5] = True
    values[spikes] += rng.choice([-1.0, 1.0], 8) * rng.uniform(0.3, 3.0, 8)
    found = find_spikes(np.arange(300.0), values, np.zeros(300, int), 9, 5.0, 0.10)
    # 0.3 m beside a front of 0.4 m can hide, rarely
    assert np.count_nonzero(spikes & ~found) <= 1
    assert np.count_nonzero(found & ~spikes) <= 1


def test_two_spikes_in_a_row_and_at_ends() -> None:
    values = 0.01 * np.sin(np.arange(60.0))
    values[[0, 20, 21, 59]] += [1.0, 0.5, 0.6, -0.4]
    found = find_spikes(np.arange(60.0), values, np.zeros(60, int), 9, 5.0, 0.10)
    np.testing.assert_array_equal(np.flatnonzero(found), [0, 20, 21, 59])


def test_slope_that_meets_an_end_is_no_spike() -> None:
    values = 0.06 * np.arange(40.0)
    assert not find_spikes(np.arange(40.0), values, np.zeros(40, int), 9, 5.0, 0.05).any()


def test_window_stays_within_its_stretch() -> None:
    # 40 points at 0 m and 6 at 1 m, across an island or in the next pass
    values = np.repeat([0.0, 1.0], [40, 6])
    step = np.arange(46.0)
    values[39] = 0.5
    one = np.zeros(46, int)
    found = find_spikes(step + 100.0 * (step >= 40), values, one, 9, 5.0, 0.10)
    np.testing.assert_array_equal(np.flatnonzero(found), [39])
    found = find_spikes(step, values, (step >= 40).astype(int), 9, 5.0, 0.10)
    np.testing.assert_array_equal(np.flatnonzero(found), [39])
    assert not find_spikes(step, values, one, 9, 5.0, 0.10)[39]


def test_points_cut_off_are_judged_by_their_pass() -> None:
    # two points between wide gaps, such as a land echo off an island, have no neighbours of their own
    values = np.zeros(60)
    values[[30, 31]] = -1.9
    time = np.arange(60.0) + 50.0 * (np.arange(60) >= 30) + 50.0 * (np.arange(60) >= 32)
    found = find_spikes(time, values, np.zeros(60, int), 9, 5.0, 0.10)
    np.testing.assert_array_equal(np.flatnonzero(found), [30, 31])


@given(shift=st.floats(-2, 2), sign=st.sampled_from([-1.0, 1.0]))
@settings(deadline=None, derandomize=True, max_examples=20)
def test_spikes_do_not_depend_on_level_sign_or_direction(shift: float, sign: float) -> None:
    values = profile(200, np.random.default_rng(5))
    values[[3, 70, 71, 150]] += 0.4
    time, one = np.arange(200.0), np.zeros(200, int)
    found = find_spikes(time, values, one, 9, 5.0, 0.10)
    assert found.sum() >= 4
    np.testing.assert_array_equal(find_spikes(time, sign * values + shift, one, 9, 5.0, 0.10), found)
    np.testing.assert_array_equal(find_spikes(time, values[::-1].copy(), one, 9, 5.0, 0.10)[::-1], found)


def test_floor_and_limit() -> None:
    values = np.random.default_rng(3).normal(0.0, 0.02, 100)
    values[50] = 0.3
    time, one = np.arange(100.0), np.zeros(100, int)
    assert find_spikes(time, values, one, 9, 5.0, 0.10)[50]
    assert not find_spikes(time, values, one, 9, 5.0, 0.40).any()
    assert not find_spikes(time, values, one, 9, 50.0, 0.10).any()
    assert find_spikes(time[:0], values[:0], one[:0], 9, 5.0, 0.10).size == 0
