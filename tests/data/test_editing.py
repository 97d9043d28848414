"""Editing: each observation is kept, or dropped once for the first reason that holds."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from altimeter_files import MARCH_FIRST
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.data.alongtrack import AlongTrack, concatenate
from setdrift.data.ancillary import LandMask
from setdrift.data.bathymetry import SeaFloor
from setdrift.data.configuration import Editing
from setdrift.data.editing import REASONS, edit, number_passes
from setdrift.data.grids import Area

LAND = LandMask(np.tile([True, False, False, False], (10, 1)), np.arange(5.0, 15.0), np.arange(-30.0, -26.0))
AREA = Area(-32.0, 6.0, 6.0, 13.0)
# a bank, 40 m deep, between 29.5 and 28.5 W; the sea elsewhere is 4 km deep
FLOOR = SeaFloor(np.tile([4000.0, 40.0, 4000.0, 4000.0], (10, 1)), LAND.latitude, LAND.longitude)
SETTINGS = Editing()


def pass_of(count: int = 120, start: float = MARCH_FIRST, **replaced: Any) -> AlongTrack:
    """A northward pass at sea, from 7 to 12 N along 28 W."""
    step = np.arange(count, dtype=float)
    columns: dict[str, Any] = {
        "time": start + step,
        "latitude": 7.0 + step * 0.04,
        "longitude": np.full(count, -28.0),
        "sea_level_anomaly": 0.1 * np.sin(step / 12.0),
        "flagged": np.zeros(count, dtype=bool),
    }
    return AlongTrack(**columns | replaced)


def changed(track: AlongTrack, name: str, index: int, value: Any) -> AlongTrack:
    values = getattr(track, name).copy()
    values[index] = value
    return AlongTrack(**{**vars(track), name: values})


@pytest.mark.parametrize(
    ("reason", "name", "value"),
    [
        ("bad_time", "time", np.nan),
        ("bad_position", "latitude", np.nan),
        ("bad_position", "longitude", np.nan),
        ("not_finite", "sea_level_anomaly", np.nan),
        ("not_finite", "sea_level_anomaly", -np.inf),
        ("flagged", "flagged", True),
        ("outside_area", "latitude", 5.5),
        ("outside_area", "longitude", 150.0),
        ("land", "longitude", -30.0),
        ("shallow", "longitude", -29.0),
        ("implausible", "sea_level_anomaly", -2.5),
        ("spike", "sea_level_anomaly", 0.9),
        ("duplicate", "time", MARCH_FIRST + 49.0),
    ],
)
def test_each_test_drops_its_own(reason: str, name: str, value: Any) -> None:
    result = edit(changed(pass_of(), name, 50, value), SETTINGS, LAND, AREA, FLOOR)
    assert result.dropped == dict.fromkeys(REASONS, 0) | {reason: 1}
    assert result.received == 120
    assert len(result.track) == 119
    expected = np.delete(pass_of().sea_level_anomaly, 50)
    np.testing.assert_array_equal(result.track.sea_level_anomaly, expected)


def test_the_first_failing_test_counts() -> None:
    track = pass_of()
    order = [
        ("sea_level_anomaly", 2.5, "implausible"),
        ("longitude", -29.0, "shallow"),
        ("longitude", -30.0, "land"),
        ("latitude", 5.5, "outside_area"),
        ("flagged", True, "flagged"),
        ("sea_level_anomaly", np.nan, "not_finite"),
        ("latitude", np.nan, "bad_position"),
        ("time", np.nan, "bad_time"),
    ]
    for name, value, reason in order:
        track = changed(track, name, 50, value)
        assert edit(track, SETTINGS, LAND, AREA, FLOOR).dropped == dict.fromkeys(REASONS, 0) | {reason: 1}


def test_sea_is_shallow_only_where_its_floor_is_given_and_above_the_limit() -> None:
    track = changed(pass_of(), "longitude", slice(40, 60), -29.0)
    assert len(edit(track, SETTINGS, LAND, AREA).track) == 120
    assert edit(track, SETTINGS, LAND, AREA, FLOOR).dropped["shallow"] == 20
    assert len(edit(track, Editing(least_depth_m=30.0), LAND, AREA, FLOOR).track) == 120


def test_two_points_between_islands_are_a_short_segment() -> None:
    longitude = np.full(120, -28.0)
    longitude[40:70] = -30.0
    longitude[[54, 55]] = -28.0
    result = edit(pass_of(longitude=longitude), SETTINGS, LAND, AREA)
    assert {reason: n for reason, n in result.dropped.items() if n} == {"land": 28, "short_segment": 2}
    assert len(edit(pass_of(longitude=longitude), Editing(shortest_segment=2), LAND, AREA).track) == 92
    longitude[56] = -28.0
    assert len(edit(pass_of(longitude=longitude), SETTINGS, LAND, AREA).track) == 93


def test_what_a_dropped_spike_parts_is_no_segment() -> None:
    track = pass_of()
    track.sea_level_anomaly[[48, 51]] += 0.8
    result = edit(track, SETTINGS, LAND, AREA)
    assert (result.dropped["spike"], len(result.track)) == (2, 118)


def test_a_segment_that_midnight_or_the_area_cuts_is_not_short() -> None:
    at_midnight = pass_of(2, MARCH_FIRST)
    assert len(edit(concatenate([at_midnight, pass_of(start=MARCH_FIRST + 600.0)]), SETTINGS, LAND, AREA).track) == 122
    at_noon = pass_of(2, MARCH_FIRST + 43200.0)
    assert edit(concatenate([at_noon, pass_of()]), SETTINGS, LAND, AREA).dropped["short_segment"] == 2
    # only the last two points of a pass are in the area
    clipped = pass_of(60, MARCH_FIRST + 43200.0, latitude=6.0 - 0.04 * np.arange(58.0, -2.0, -1.0))
    result = edit(concatenate([clipped, pass_of()]), SETTINGS, LAND, AREA)
    assert (result.dropped["outside_area"], len(result.track)) == (58, 122)


@given(seed=st.integers(0, 2**31), count=st.integers(0, 150))
@settings(deadline=None, derandomize=True, max_examples=60)
def test_counts_always_add_up(seed: int, count: int) -> None:
    rng = np.random.default_rng(seed)
    track = pass_of(count)
    for name, low, high in (("time", 0, 2e9), ("latitude", -90, 90), ("longitude", -180, 180)):
        values = getattr(track, name)
        values[rng.random(count) < 0.1] = np.nan
        odd = rng.random(count) < 0.1
        values[odd] = rng.uniform(low, high, odd.sum())
    track.sea_level_anomaly[rng.random(count) < 0.2] = rng.choice([np.nan, np.inf, 3.0, 0.8, -0.7])
    track.flagged[rng.random(count) < 0.1] = True
    if count:
        track = track.select(rng.integers(0, count, 2 * count))
    result = edit(track, SETTINGS, LAND, AREA, FLOOR if seed % 2 else None)
    assert result.received == len(track) == len(result.track) + sum(result.dropped.values())
    assert np.all(np.diff(result.track.time) > 0)
    for column in (result.track.latitude, result.track.longitude, result.track.sea_level_anomaly):
        assert np.isfinite(column).all()


@given(seed=st.integers(0, 2**31))
@settings(deadline=None, derandomize=True, max_examples=20)
def test_order_of_records_does_not_matter(seed: int) -> None:
    rng = np.random.default_rng(seed)
    track = changed(changed(pass_of(), "sea_level_anomaly", 30, 1.0), "flagged", 80, True)
    track = concatenate([track, pass_of(60, MARCH_FIRST + 6000.0)])
    expected = edit(track, SETTINGS, LAND, AREA)
    shuffled = edit(track.select(rng.permutation(len(track))), SETTINGS, LAND, AREA)
    assert shuffled.dropped == expected.dropped
    for name in ("time", "latitude", "longitude", "sea_level_anomaly", "pass_number"):
        np.testing.assert_array_equal(getattr(shuffled.track, name), getattr(expected.track, name))


def test_duplicate_of_a_flagged_observation_stays() -> None:
    first = changed(pass_of(), "flagged", 50, True)
    result = edit(concatenate([first, pass_of()]), SETTINGS, LAND, AREA)
    assert len(result.track) == 120
    assert result.dropped["flagged"] == 1
    assert result.dropped["duplicate"] == 119


def test_of_two_at_one_time_the_first_stays() -> None:
    first, second = pass_of(), pass_of()
    second.sea_level_anomaly[:] += 0.01
    kept = edit(concatenate([first, second]), SETTINGS, LAND, AREA).track
    np.testing.assert_array_equal(kept.sea_level_anomaly, first.sea_level_anomaly)


def test_all_flagged_or_missing_is_no_error() -> None:
    assert len(edit(pass_of(flagged=np.ones(120, dtype=bool)), SETTINGS, LAND, AREA).track) == 0
    assert len(edit(pass_of(sea_level_anomaly=np.full(120, np.nan)), SETTINGS, LAND, AREA).track) == 0
    assert len(edit(pass_of(time=np.full(120, np.nan)), SETTINGS, LAND, AREA).track) == 0


def test_given_pass_numbers() -> None:
    numbers = {"pass_number": np.full(120, 17), "cycle_number": np.full(120, 4)}
    np.testing.assert_array_equal(number_passes(pass_of(**numbers), 300.0), np.full(120, 40017))


def test_inferred_passes_are_named_by_their_first_second() -> None:
    track = concatenate([pass_of(10, MARCH_FIRST + 0.7), pass_of(5, MARCH_FIRST + 6000.2)])
    expected = np.repeat([MARCH_FIRST, MARCH_FIRST + 6000.0], [10, 5])
    np.testing.assert_array_equal(number_passes(track, 300.0), expected)


def test_passes_that_seem_to_start_in_one_second_stay_apart() -> None:
    latitude = np.repeat([8.0, 9.0, 8.0, 9.0], 3)
    track = pass_of(12, latitude=latitude, time=MARCH_FIRST + 0.05 * np.arange(12))
    assert np.unique(number_passes(track, 300.0)).size == 3


def test_cycle_alone_or_pass_alone_is_not_enough() -> None:
    alone = pass_of(5, pass_number=np.full(5, 17))
    np.testing.assert_array_equal(number_passes(alone, 300.0), np.full(5, MARCH_FIRST))
