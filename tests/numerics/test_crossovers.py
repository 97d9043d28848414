"""Crossovers: where great circles cross is known exactly, whatever the place on the globe."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from setdrift.numerics.crossovers import Crossovers, find_crossovers
from setdrift.numerics.superobservations import SeaLevelObservations

Floats = NDArray[np.float64]
STEP = 0.06  # degrees along the track in a second
NOISE = 0.02


def great_circle(
    inclination: float, node: float, start: float, count: int, day: float, altimeter: int = 0, number: int = 0
) -> SeaLevelObservations:
    """A pass on a sphere, one point a second; `start` is the angle from the ascending node, all in degrees."""
    angle = np.deg2rad(start + STEP * np.arange(count))
    tilt = np.deg2rad(inclination)
    latitude = np.rad2deg(np.arcsin(np.sin(tilt) * np.sin(angle)))
    longitude = node + np.rad2deg(np.arctan2(np.cos(tilt) * np.sin(angle), np.cos(angle)))
    time = day + np.arange(count) / 86400.0
    same = np.full(count, altimeter, dtype=np.int64)
    value = 0.1 * altimeter + 0.001 * np.arange(count)
    return SeaLevelObservations(
        (longitude + 180.0) % 360.0 - 180.0,
        latitude,
        time,
        value,
        np.full(count, NOISE**2),
        same,
        np.full(count, number, dtype=np.int64),
        np.ones(count, dtype=np.int64),
    )


def pair(turn: float = 0.0, lag: float = 2.0) -> SeaLevelObservations:
    """A pass up the meridian `turn` + 10, and one of 60 degrees whose node is at `turn`."""
    up = great_circle(90.0, turn + 10.0, 5.0, 400, day=100.0)
    tilted = great_circle(60.0, turn, 5.0, 400, day=100.0 + lag, altimeter=1)
    return SeaLevelObservations.joined([up, tilted])


def east_of(longitude: Floats, origin: float) -> Floats:
    return np.asarray((longitude - origin + 180.0) % 360.0 - 180.0)


@pytest.mark.parametrize("turn", [0.0, 165.0, 169.9, 170.0, 170.1, -180.0, 33.3])
def test_two_great_circles_cross_where_geometry_says(turn: float) -> None:
    found = find_crossovers(pair(turn), 10.0)
    assert found.size == 1
    latitude = np.rad2deg(np.arctan(np.tan(np.deg2rad(60.0)) * np.sin(np.deg2rad(10.0))))
    # means of five points on an arc lie a hair inside it: 1e-4 degrees are 11 m
    assert found.latitude[0] == pytest.approx(latitude, abs=1e-4)
    assert east_of(found.longitude, turn)[0] == pytest.approx(10.0, abs=1e-4)
    along = np.array([latitude, np.rad2deg(np.arcsin(np.sin(np.deg2rad(latitude)) / np.sin(np.deg2rad(60.0))))])
    seconds = (along - 5.0) / STEP
    assert (found.day[:, 0] - [100.0, 102.0]) * 86400.0 == pytest.approx(seconds, abs=0.01)
    assert found.value[:, 0] == pytest.approx([0.001 * seconds[0], 0.1 + 0.001 * seconds[1]], abs=1e-5)
    assert found.altimeter[:, 0].tolist() == [0, 1]
    assert found.difference[0] == pytest.approx(found.value[0, 0] - found.value[1, 0])
    # a mean of five, or of two such: never less than a tenth of one observation's variance
    assert np.all(found.noise_variance <= NOISE**2 / 5 * (1 + 1e-9))
    assert np.all(found.noise_variance >= NOISE**2 / 10 * (1 - 1e-9))


def test_passes_cross_near_the_pole() -> None:
    passes = [great_circle(80.0, node, 60.0, 1000, 50.0 + node / 100.0, number=int(node)) for node in (7.0, 100.0)]
    found = find_crossovers(SeaLevelObservations.joined(passes), 10.0)
    # the crossing lies across the two poles of the circles
    tilt, node = np.deg2rad(80.0), np.deg2rad([[7.0], [100.0]])
    poles = np.hstack((np.sin(tilt) * np.sin(node), -np.sin(tilt) * np.cos(node), np.full((2, 1), np.cos(tilt))))
    crossing = np.cross(*poles)
    latitude = np.rad2deg(np.arcsin(abs(crossing[2]) / np.linalg.norm(crossing)))
    assert latitude > 75.0
    assert found.latitude == pytest.approx([latitude], abs=2e-3)
    assert not found.between.any()


def lattice() -> SeaLevelObservations:
    """Four meridians crossed by the equator on three days; meridians stand where means of the equator lie."""
    up = [great_circle(90.0, 0.12 + 1.5 * n, -3.0, 100, 10.0 + n / 10.0, number=n) for n in range(4)]
    across = [great_circle(0.0, 0.0, -1.5, 150, 11.0 + n, altimeter=1, number=n) for n in range(3)]
    return SeaLevelObservations.joined([*up, *across])


def test_every_pair_of_passes_crosses_once() -> None:
    found = find_crossovers(lattice(), 10.0)
    pairs = list(zip(found.pass_index[0].tolist(), found.pass_index[1].tolist(), strict=True))
    assert sorted(pairs) == [(a, b) for a in range(4) for b in range(4, 7)]
    assert found.pass_altimeter.tolist() == [0, 0, 0, 0, 1, 1, 1]
    assert found.pass_number.tolist() == [0, 1, 2, 3, 0, 1, 2]
    assert found.between.all()


@settings(deadline=None, derandomize=True, max_examples=20)
@given(st.randoms(use_true_random=False))
def test_order_of_the_observations_does_not_matter(random: object) -> None:
    observations = lattice()
    order = list(range(observations.size))
    random.shuffle(order)  # type: ignore[attr-defined]  # hypothesis gives a random.Random
    expected, found = (find_crossovers(o, 10.0) for o in (observations, observations.take(np.array(order))))
    for name in ("longitude", "latitude", "day", "value", "pass_index"):
        np.testing.assert_allclose(getattr(found, name), getattr(expected, name), rtol=0, atol=1e-9)


def test_longest_lag_is_kept_to() -> None:
    found = find_crossovers(lattice(), 1.05)
    lags = np.abs(found.day[0] - found.day[1])
    assert 0 < found.size < 12
    assert lags.max() < 1.1
    assert find_crossovers(pair(lag=2.0), 1.9).size == 0


def test_nothing_is_interpolated_across_a_gap() -> None:
    observations = pair()
    seconds = find_crossovers(observations, 10.0).day[0, 0]
    away = np.abs(observations.day - seconds) * 86400.0
    assert find_crossovers(observations.take(away > 15.0), 10.0).size == 0
    assert find_crossovers(observations.take(away > 2.0), 10.0).size == 1


def test_passes_side_by_side_never_cross() -> None:
    beside = [great_circle(66.0, n / 10.0, 0.0, 200, 5.0 + n, number=n) for n in range(4)]
    assert find_crossovers(SeaLevelObservations.joined(beside), 10.0).size == 0


def test_no_observations_have_no_crossovers() -> None:
    found = find_crossovers(pair().take(np.array([], dtype=np.int64)), 10.0)
    assert isinstance(found, Crossovers)
    assert (found.size, found.pass_altimeter.size) == (0, 0)


def test_lag_must_be_positive() -> None:
    with pytest.raises(ValueError, match="largest_lag_days: must be above 0, found 0"):
        find_crossovers(pair(), 0.0)
