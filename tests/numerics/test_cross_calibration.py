"""Biases from crossovers: on simulated differences, errors are as large as stated and drift is seen."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from setdrift.numerics import cross_calibration
from setdrift.numerics.covariance import CovarianceModel
from setdrift.numerics.cross_calibration import CrossCalibration, calibrate
from setdrift.numerics.crossovers import Crossovers
from setdrift.numerics.local_plane import to_plane

Floats = NDArray[np.float64]

MODEL = CovarianceModel(0.20, 15.0, 0.05)
BIAS, LONG_WAVE, NOISE = 0.03, 0.02, 0.01
EDGES = np.array([1000.0, 1010.0, 1020.0, 1030.0])
ALTIMETERS, PASSES = 3, 60


def geometry(seed: int = 5, count: int = 300) -> Crossovers:
    """Crossovers of random passes, none of values yet: passes over a box of 10 degrees within 30 days."""
    rng = np.random.default_rng(seed)
    pass_day, pass_altimeter = rng.uniform(1000.0, 1030.0, PASSES), np.arange(PASSES) % ALTIMETERS
    order = np.lexsort((pass_day, pass_altimeter))
    pass_day, pass_altimeter = pass_day[order], pass_altimeter[order]
    first, second = np.triu_indices(PASSES, 1)
    near = np.flatnonzero(np.abs(pass_day[first] - pass_day[second]) < 8.0)
    chosen = np.sort(rng.choice(near, count, replace=False))
    index = np.stack((first[chosen], second[chosen]))
    return Crossovers(
        rng.uniform(176.0, 186.0, count) % 360.0,
        rng.uniform(20.0, 30.0, count),
        pass_day[index],
        np.zeros((2, count)),
        np.full((2, count), NOISE**2),
        pass_altimeter[index],
        index,
        pass_altimeter,
        np.arange(PASSES),
    )


def sea_change(crossovers: Crossovers) -> Floats:
    """A factor of the covariance of the sea at both times of every crossover, written without the kernel."""
    covariance = MODEL.at(25.0)
    x, y = to_plane(np.tile(crossovers.longitude, 2), np.tile(crossovers.latitude, 2), 181.0, 25.0)
    t = crossovers.day.ravel()
    matrix = covariance(x[:, None] - x, y[:, None] - y, t[:, None] - t)
    return np.linalg.cholesky(matrix + 1e-10 * np.eye(t.size))


def measured(crossovers: Crossovers, bias: Floats, pass_error: Floats, sea: Floats, noise: Floats) -> Crossovers:
    value = sea.reshape(2, -1) + noise + bias[crossovers.altimeter] + pass_error[crossovers.pass_index]
    return replace(crossovers, value=value)


def estimated(crossovers: Crossovers) -> CrossCalibration:
    return calibrate(crossovers, ALTIMETERS, MODEL, BIAS**2, LONG_WAVE**2, EDGES)


def draw(
    crossovers: Crossovers, rng: np.random.Generator, factor: Floats, drift: float = 0.0
) -> tuple[Crossovers, Floats, Floats]:
    """Draw values, and return them with the biases about their mean and the errors of passes behind them."""
    bias = BIAS * rng.standard_normal(ALTIMETERS)
    pass_error = LONG_WAVE * rng.standard_normal(PASSES)
    noise = NOISE * rng.standard_normal((2, crossovers.size))
    noise = noise + drift * (crossovers.altimeter == 1) * (crossovers.day - 1015.0)
    sea = factor @ rng.standard_normal(factor.shape[0])
    return measured(crossovers, bias, pass_error, sea, noise), bias - bias.mean(), pass_error


def test_stated_errors_are_the_errors_made() -> None:
    """Of 150 draws, the mean square of error over stated error is 1 within what chance allows."""
    crossovers, rng = geometry(), np.random.default_rng(11)
    factor = sea_change(crossovers)
    bias, slope, windows, reduced = [], [], [], []
    for _ in range(150):
        values, true, pass_error = draw(crossovers, rng, factor)
        found = estimated(values)
        bias.append((found.bias.value - true) / found.bias.error)
        slope.append(found.slope.value / found.slope.error)
        windows.append((found.window_bias.value - true) / found.window_bias.error)
        reduced.append(np.mean((found.pass_error - pass_error) ** 2) / np.mean(pass_error**2))
    # 150 draws of 2 independent biases: one standard deviation of the mean square is 0.08; windows count 6
    assert np.mean(np.square(bias)) == pytest.approx(1.0, abs=0.25)
    assert np.mean(np.square(slope)) == pytest.approx(1.0, abs=0.25)
    assert np.mean(np.square(windows)) == pytest.approx(1.0, abs=0.2)
    assert np.mean(reduced) < 0.6


def test_standard_deviation_of_pass_errors_is_found_from_a_wrong_guess() -> None:
    crossovers, rng = geometry(count=500), np.random.default_rng(3)
    factor = sea_change(crossovers)
    found = []
    for _ in range(10):
        values, _, _ = draw(crossovers, rng, factor)
        guess = calibrate(values, ALTIMETERS, MODEL, BIAS**2, (2.5 * LONG_WAVE) ** 2, EDGES)
        found.append(guess.long_wave_deviation)
    # 20 passes an altimeter, 10 draws: 5 % by chance; estimates also lean towards the guess
    assert np.mean(found, axis=0) == pytest.approx(np.full(ALTIMETERS, LONG_WAVE), rel=0.2)


def test_drift_of_one_altimeter_is_seen() -> None:
    crossovers = geometry()
    values, _, _ = draw(crossovers, np.random.default_rng(8), sea_change(crossovers), drift=0.006)
    found = estimated(values)
    expected = 0.006 * (np.array([0.0, 1.0, 0.0]) - 1.0 / 3.0)
    assert np.all(np.abs(found.slope.value - expected) < 3.5 * found.slope.error)
    assert found.slope.value[1] > 3.0 * found.slope.error[1]
    assert np.all(np.diff(found.window_bias.value[:, 1]) > 0.0)


def test_biases_and_slopes_sum_to_zero() -> None:
    crossovers = geometry()
    values, _, _ = draw(crossovers, np.random.default_rng(2), sea_change(crossovers))
    found = estimated(values)
    for values_ in (found.bias.value, found.slope.value, *found.window_bias.value):
        assert np.sum(values_) == pytest.approx(0.0, abs=1e-12)


def test_names_of_altimeters_do_not_matter() -> None:
    """Numbering the altimeters the other way round, and so turning the differences, changes nothing else."""
    crossovers = geometry()
    values, _, _ = draw(crossovers, np.random.default_rng(4), sea_change(crossovers))
    last = ALTIMETERS - 1
    turned = replace(
        values,
        day=values.day[::-1],
        value=values.value[::-1],
        noise_variance=values.noise_variance[::-1],
        altimeter=last - values.altimeter[::-1],
        pass_index=values.pass_index[::-1],
        pass_altimeter=last - values.pass_altimeter,
    )
    expected, found = estimated(values), estimated(turned)
    np.testing.assert_allclose(found.bias.value, expected.bias.value[::-1], atol=1e-9)
    np.testing.assert_allclose(found.bias.error, expected.bias.error[::-1], atol=1e-9)
    np.testing.assert_allclose(found.window_bias.value, expected.window_bias.value[:, ::-1], atol=1e-9)
    np.testing.assert_allclose(found.slope.value, expected.slope.value[::-1], atol=1e-9)
    np.testing.assert_allclose(found.pass_error, expected.pass_error, atol=1e-9)


def test_exact_differences_are_explained() -> None:
    crossovers = geometry()
    bias = np.array([0.02, -0.03, 0.01])
    still = np.zeros(2 * crossovers.size)
    found = estimated(measured(crossovers, bias, np.zeros(PASSES), still, np.zeros((2, crossovers.size))))
    # a fraction of the bias goes to the priors
    assert found.bias.value == pytest.approx(bias, abs=0.001)
    before, after = (np.mean(np.square(d)) for d in (found.used.difference, found.residual[1]))
    assert after < 0.01 * before


def test_an_altimeter_that_never_meets_another_has_no_bias() -> None:
    crossovers = geometry()
    values, _, _ = draw(crossovers, np.random.default_rng(6), sea_change(crossovers))
    apart = values.take(~(values.between & np.any(values.altimeter == 2, axis=0)))
    found = estimated(apart)
    assert np.isnan(found.bias.value).tolist() == [False, False, True]
    assert np.isnan(found.bias.error).tolist() == [False, False, True]
    assert np.nansum(found.bias.value) == pytest.approx(0.0, abs=1e-12)


def test_an_altimeter_missing_in_a_window_does_not_move_the_others() -> None:
    crossovers = geometry()
    bias = np.array([0.02, -0.03, 0.01])
    still = np.zeros(2 * crossovers.size)
    values = measured(crossovers, bias, np.zeros(PASSES), still, np.zeros((2, crossovers.size)))
    late = (values.day.mean(axis=0) >= EDGES[1]) & np.any(values.altimeter == 1, axis=0)
    found = estimated(values.take(~late))
    assert np.isnan(found.window_bias.value).tolist() == [[False] * 3, [False, True, False], [False, True, False]]
    for k in (0, 2):
        assert found.window_bias.value[:, k] == pytest.approx(np.full(3, bias[k]), abs=0.002)


def test_shortest_lags_are_used(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cross_calibration, "MOST_CROSSOVERS", 20)
    crossovers = geometry()
    used = estimated(crossovers).used
    assert used.size == 60
    middle = crossovers.day.mean(axis=0)
    for low, high in ((EDGES[0], EDGES[1]), (EDGES[1], EDGES[2]), (EDGES[2], EDGES[3])):
        lags = [np.sort(np.abs(c.day[0] - c.day[1])[(m >= low) & (m < high)])
                for c, m in ((crossovers, middle), (used, used.day.mean(axis=0)))]  # fmt: skip
        assert lags[1].tolist() == lags[0][:20].tolist()


@pytest.mark.parametrize(
    ("bias", "long_wave", "message"),
    [(0.0, 1.0, "bias_variance: must be above 0"), (1.0, -1.0, "long_wave_variance: must be above 0")],
)
def test_variances_must_be_positive(bias: float, long_wave: float, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        calibrate(geometry(), ALTIMETERS, MODEL, bias, long_wave, EDGES)


def test_windows_without_crossovers_are_refused() -> None:
    with pytest.raises(ValueError, match="crossovers: none of two altimeters"):
        calibrate(geometry(), ALTIMETERS, MODEL, 1.0, 1.0, EDGES + 500.0)
