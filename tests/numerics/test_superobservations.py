"""Means of consecutive observations along a pass."""

from __future__ import annotations

from dataclasses import fields

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.superobservations import SeaLevelObservations, average_along_pass

SECOND = 1.0 / 86400.0

quickly = settings(deadline=None, derandomize=True, max_examples=50)


def along_pass(count=60, start=100.0, step=1.0, **changes):
    """Return observations each `step` seconds of one pass that begins at day `start`, in the middle of a second."""
    rng = np.random.default_rng(count)
    columns = {
        "longitude": 10.0 + 0.02 * np.arange(count),
        "latitude": 40.0 + 0.06 * np.arange(count),
        "day": start + (0.5 + step * np.arange(count)) * SECOND,
        "value": rng.normal(0.0, 0.1, count),
        "noise_variance": rng.uniform(1e-4, 9e-4, count),
        "altimeter": np.zeros(count, dtype=np.int64),
        "pass_number": np.zeros(count, dtype=np.int64),
        "weight": np.ones(count, dtype=np.int64),
    }
    return SeaLevelObservations(**columns | changes)


def assert_same(a, b, tolerance=0.0):
    for field in fields(SeaLevelObservations):
        left, right = getattr(a, field.name), getattr(b, field.name)
        np.testing.assert_allclose(left, right, rtol=tolerance, atol=0.0, err_msg=field.name)
        assert left.dtype == right.dtype


def test_columns_of_different_lengths_are_refused():
    with pytest.raises(ValueError, match=r"value: must have the length of longitude \(60\)"):
        along_pass(value=np.zeros(59))


def test_take_and_joined_undo_each_other():
    whole = along_pass()
    first = np.arange(60) < 20
    assert_same(SeaLevelObservations.joined((whole.take(first), whole.take(~first))), whole)


def test_a_mean_of_one_is_itself():
    apart = along_pass(step=10.0)
    assert_same(average_along_pass(apart, 5.0), apart)


def test_mean_of_each_span():
    observations = along_pass(count=20)
    means = average_along_pass(observations, 5.0)
    assert means.size == 4
    for name in ("longitude", "latitude", "day", "value"):
        expected = getattr(observations, name).reshape(4, 5).mean(axis=1)
        np.testing.assert_allclose(getattr(means, name), expected, rtol=1e-12, err_msg=name)


def test_white_noise_is_divided_by_the_number_averaged():
    even = along_pass(noise_variance=np.full(60, 9e-4))
    np.testing.assert_allclose(average_along_pass(even, 5.0).noise_variance, 9e-4 / 5.0)


def test_uneven_noise_is_that_of_the_plain_mean():
    observations = along_pass(count=5)
    expected = observations.noise_variance.sum() / 25.0  # variance of the sum over the square of the number
    np.testing.assert_allclose(average_along_pass(observations, 5.0).noise_variance, expected)


def test_noise_of_means_is_what_many_draws_show():
    rng = np.random.default_rng(11)
    count = 20_000
    noisy = along_pass(count, value=rng.normal(0.0, 0.03, count), noise_variance=np.full(count, 9e-4))
    means = average_along_pass(noisy, 4.0)
    # 5,000 means: their variance is known to sqrt(2/5000) = 2 %; three times that
    assert means.value.var() == pytest.approx(means.noise_variance.mean(), rel=0.06)


def test_weights_add_up():
    assert average_along_pass(along_pass(weight=np.full(60, 3)), 7.0).weight.sum() == 180


def test_means_of_means_are_means():
    observations = along_pass(noise_variance=np.full(60, 9e-4))
    twice = average_along_pass(average_along_pass(observations, 5.0), 20.0)
    assert_same(twice, average_along_pass(observations, 20.0), tolerance=1e-12)


def test_passes_and_altimeters_are_not_mixed():
    number = np.arange(60) % 2
    for name in ("altimeter", "pass_number"):
        means = average_along_pass(along_pass(**{name: number}), 1000.0)
        assert means.size == 2
        assert list(getattr(means, name)) == [0, 1]


def test_one_pass_number_of_two_altimeters_is_two_passes():
    means = average_along_pass(along_pass(altimeter=np.arange(60) % 2), 5.0)
    assert set(means.altimeter) == {0, 1}
    assert means.size == 24


@quickly
@given(seed=st.integers(0, 10_000), seconds=st.floats(1.0, 50.0))
def test_order_of_the_input_does_not_matter(seed, seconds):
    rng = np.random.default_rng(seed)
    observations = along_pass(altimeter=rng.integers(0, 2, 60), pass_number=rng.integers(0, 3, 60))
    shuffled = observations.take(rng.permutation(60))
    assert_same(average_along_pass(shuffled, seconds), average_along_pass(observations, seconds))


@quickly
@given(seed=st.integers(0, 10_000), seconds=st.floats(1.0, 50.0))
def test_means_are_ordered_by_altimeter_pass_and_time(seed, seconds):
    rng = np.random.default_rng(seed)
    observations = along_pass(altimeter=rng.integers(0, 2, 60), pass_number=rng.integers(0, 3, 60))
    means = average_along_pass(observations.take(rng.permutation(60)), seconds)
    order = np.lexsort((means.day, means.pass_number, means.altimeter))
    np.testing.assert_array_equal(order, np.arange(means.size))


@pytest.mark.parametrize("convention", [0.0, 360.0])
def test_longitudes_are_averaged_across_the_dateline(convention):
    unwrapped = 179.7 + 0.02 * np.arange(60)
    wrapped = (unwrapped + 180.0) % 360.0 - 180.0
    if convention:
        wrapped %= 360.0
    means = average_along_pass(along_pass(longitude=wrapped), 5.0)
    expected = unwrapped.reshape(12, 5).mean(axis=1)
    np.testing.assert_allclose((means.longitude - expected + 180.0) % 360.0, 180.0, atol=1e-11)


def test_longitudes_are_averaged_across_greenwich():
    wrapped = (-0.5 + 0.02 * np.arange(60)) % 360.0
    means = average_along_pass(along_pass(longitude=wrapped), 5.0)
    distance = np.abs((means.longitude + 180.0) % 360.0 - 180.0)
    assert distance.max() < 0.7


@pytest.mark.parametrize("first", [1, 2, 3, 4])
def test_spans_are_counted_from_the_epoch(first):
    whole = average_along_pass(along_pass(), 5.0)
    part = average_along_pass(along_pass().take(np.arange(first, 60)), 5.0)
    # only the mean that lost members changes
    assert_same(part.take(np.arange(1, part.size)), whole.take(np.arange(1, whole.size)))


def test_nothing_in_nothing_out():
    assert average_along_pass(along_pass().take(np.zeros(60, dtype=bool)), 5.0).size == 0


@pytest.mark.parametrize("seconds", [0.0, -1.0, np.nan])
def test_a_span_without_length_is_refused(seconds):
    with pytest.raises(ValueError, match="seconds: must be above 0"):
        average_along_pass(along_pass(), seconds)
