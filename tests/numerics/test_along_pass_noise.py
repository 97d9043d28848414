"""White noise from third differences: exact for white noise, blind to what is smooth."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.along_pass_noise import FEWEST, GAIN, NoiseEstimate, estimate_noise, pooled_noise

RNG = np.random.default_rng(11)
NOISE = 0.025 * RNG.standard_normal(40_000)


def estimated(values: np.ndarray, time: np.ndarray | None = None, passes: np.ndarray | None = None) -> NoiseEstimate:
    time = np.arange(float(values.size)) if time is None else time
    found = estimate_noise(time, values, np.zeros(values.size, np.int64) if passes is None else passes)
    assert found is not None
    return found


def test_a_third_difference_has_twenty_times_the_variance() -> None:
    weights = np.diff(np.eye(4), 3, axis=0)[0]
    np.testing.assert_array_equal(weights, [-1.0, 3.0, -3.0, 1.0])
    np.testing.assert_allclose(GAIN**2, np.sum(weights**2), rtol=1e-14)
    np.testing.assert_allclose(GAIN**2, 20.0, rtol=1e-14)


def test_white_noise_is_found() -> None:
    found = estimated(NOISE)
    # a median of 40,000 correlated differences scatters by 0.8 %
    assert found.standard_deviation == pytest.approx(0.025, rel=0.025)
    assert found.differences == NOISE.size - 3


def test_the_mean_of_many_short_records_is_the_truth() -> None:
    found = [estimated(part).standard_deviation for part in NOISE.reshape(-1, 400)]
    assert np.mean(found) == pytest.approx(0.025, rel=0.02)


@given(coefficients=st.tuples(*3 * [st.floats(-1.0, 1.0)]), factor=st.floats(1e-3, 1e3), backward=st.booleans())
@settings(deadline=None, derandomize=True, max_examples=30)
def test_a_parabola_adds_nothing_and_scale_carries_over(
    coefficients: tuple[float, float, float], factor: float, backward: bool
) -> None:
    values = NOISE[:500]
    plain = estimated(values).standard_deviation
    smooth = np.polyval(coefficients, np.linspace(-1.0, 1.0, 500))
    assert estimated(values + smooth).standard_deviation == pytest.approx(plain, rel=1e-8)
    assert estimated(factor * values[:: -1 if backward else 1]).standard_deviation == pytest.approx(factor * plain)


@pytest.mark.parametrize(("wavelength", "share"), [(15.0, 2.6e-4), (7.5, 1.45e-2)])
def test_a_wave_leaks_in_by_its_known_share(wavelength: float, share: float) -> None:
    assert (2.0 * np.sin(np.pi / wavelength)) ** 6 / 20.0 == pytest.approx(share, rel=0.02)
    # third differences of an unevenly cut wave: their mean square over 20 is that share of the wave's variance
    wave = np.sin(2.0 * np.pi * np.arange(30_000) / wavelength)
    assert np.mean((np.diff(wave, 3) / GAIN) ** 2) == pytest.approx(share * 0.5, rel=0.02)
    both = estimated(NOISE[:30_000] + 0.05 * wave).standard_deviation
    expected = np.hypot(estimated(NOISE[:30_000]).standard_deviation, 0.05 * np.sqrt(share * 0.5))
    assert both == pytest.approx(expected, rel=0.01)


def test_odd_values_hardly_count() -> None:
    values = NOISE[:4000].copy()
    values[::200] += 1.0
    assert estimated(values).standard_deviation == pytest.approx(estimated(NOISE[:4000]).standard_deviation, rel=0.05)


def test_differences_reach_over_no_gap_and_no_end_of_a_pass() -> None:
    time = np.arange(1000.0)
    time[400:] += 7.0
    passes = np.repeat([0, 1], [700, 300])
    values = NOISE[:1000] + 50.0 * (np.arange(1000) >= 400) + 30.0 * passes
    found = estimated(values, time, passes)
    assert found.differences == 397 + 297 + 297
    assert found.standard_deviation == pytest.approx(0.025, rel=0.15)


def test_too_few_differences_tell_nothing() -> None:
    enough = FEWEST + 3
    assert estimated(NOISE[:enough]).differences == FEWEST
    for count in (0, 1, 3, enough - 1):
        assert estimate_noise(np.arange(float(count)), NOISE[:count], np.zeros(count, np.int64)) is None
    same_time = np.zeros(500)
    assert estimate_noise(same_time, NOISE[:500], np.zeros(500, np.int64)) is None


def test_pooled_by_differences() -> None:
    assert pooled_noise([]) is None
    pooled = pooled_noise([NoiseEstimate(0.03, 100), NoiseEstimate(0.01, 300)])
    assert pooled is not None
    assert pooled.differences == 400
    assert pooled.standard_deviation == pytest.approx(np.sqrt((0.03**2 + 3 * 0.01**2) / 4))


def test_wrong_input_is_refused() -> None:
    with pytest.raises(ValueError, match="values"):
        estimate_noise(np.arange(3.0), np.arange(2.0), np.arange(3))
    with pytest.raises(ValueError, match="values"):
        estimate_noise(np.arange(3.0), np.array([0.0, np.nan, 1.0]), np.arange(3))
