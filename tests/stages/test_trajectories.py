"""Trajectories follow the planted eddies, and are linked again from the first day that changed."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Mapping
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from tiny_analysis import FIRST, analysis_of, silent, tiny

from setdrift.data.configuration import Configuration
from setdrift.data.day_store import DayStore
from setdrift.data.days import blocks_between, days_between
from setdrift.data.receipts import refresh_block
from setdrift.data.records import read_record, write_record
from setdrift.errors import SetdriftError
from setdrift.stages.trajectories import link_trajectories

Configure = Callable[..., Configuration]
Places = list[tuple[float, float, int]]
LAST = FIRST + dt.timedelta(days=7)
STEADY: Places = [(-29.0, 28.0, 1), (-26.0, 26.0, -1)]


def eddies(places: Places) -> xr.Dataset:
    longitude, latitude, polarity = np.array(places, dtype=float).reshape(-1, 3).T
    columns = {"longitude": longitude, "latitude": latitude, "polarity": polarity.astype(np.int8)}
    columns |= {"amplitude": np.full(len(places), 0.2), "equal_area_radius": np.full(len(places), 8e4)}
    return xr.Dataset({name: ("eddy", values) for name, values in columns.items()})


def link(configuration: Configuration, days: Mapping[dt.date, Places]) -> list[str]:
    """Put the days' eddies in the place of the detection's, link, and return the days that were linked."""
    first, last = min(days), max(days)
    write_record(configuration.work / "manifests" / "period.json", {"first": first, "last": last})
    for block in blocks_between(first, last, configuration.block_days):
        wanted = block.days_within(first, last)
        refresh_block(
            configuration, "eddies", block, wanted, lambda day: repr(days[day]), lambda day: eddies(days[day]), silent
        )
    lines: list[str] = []
    link_trajectories(configuration, lines.append)
    return [line.split()[0] for line in lines if line.endswith("done")]


def identifiers(configuration: Configuration, day: dt.date) -> list[int]:
    found: list[int] = analysis_of(configuration, "trajectories", day)["trajectory"].values.tolist()
    return found


def drifting(n: int) -> Places:
    return [(longitude - 0.05 * n, latitude, polarity) for longitude, latitude, polarity in STEADY]


@pytest.fixture
def days() -> dict[dt.date, Places]:
    return {day: drifting(n) for n, day in enumerate(days_between(FIRST, LAST))}


def test_planted_eddies_keep_their_identifiers(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    first, *later = (identifiers(configuration, FIRST + dt.timedelta(days=n)) for n in range(3))
    assert len(set(first)) == 2
    assert later == [first, first]


def test_order_of_the_day_does_not_matter(configure: Configure, days: dict[dt.date, Places]) -> None:
    configuration = configure()
    days[FIRST + dt.timedelta(days=3)].reverse()
    link(configuration, days)
    first = identifiers(configuration, FIRST)
    assert identifiers(configuration, FIRST + dt.timedelta(days=3)) == first[::-1]
    assert identifiers(configuration, LAST) == first


def test_only_days_from_the_changed_one_are_linked_again(configure: Configure, days: dict[dt.date, Places]) -> None:
    configuration = configure()
    assert link(configuration, days) == [str(day) for day in days]
    assert link(configuration, days) == []
    changed = FIRST + dt.timedelta(days=4)
    days[changed] = [*days[changed], (-30.5, 30.0, 1)]
    assert link(configuration, days) == [str(day) for day in days_between(changed, LAST)]


@pytest.mark.parametrize("change", ["more", "less", "moved"])
def test_linking_again_equals_linking_at_once(
    configure: Configure, tmp_path: Path, days: dict[dt.date, Places], change: str
) -> None:
    configuration = configure()
    link(configuration, days)
    middle = FIRST + dt.timedelta(days=4)
    days[middle] = {"more": [*days[middle], (-30.5, 30.0, 1)], "less": [], "moved": [(-29.4, 28.2, 1)]}[change]
    link(configuration, days)
    fresh = configure(output="fresh")
    link(fresh, days)
    for day in days:
        xr.testing.assert_identical(
            analysis_of(configuration, "trajectories", day), analysis_of(fresh, "trajectories", day)
        )


@pytest.mark.parametrize(("unseen", "same"), [(5, True), (6, False)])
def test_gap_is_bridged_up_to_the_configured_days(
    configure: Configure, days: dict[dt.date, Places], unseen: int, same: bool
) -> None:
    configuration = configure(eddies__gap_days=5)
    for n in range(1, unseen + 1):
        days[FIRST + dt.timedelta(days=n)] = []
    link(configuration, days)
    again = identifiers(configuration, FIRST + dt.timedelta(days=unseen + 1))
    assert (again == identifiers(configuration, FIRST)) == same


def test_gate_is_the_configured_one(configure: Configure, days: dict[dt.date, Places]) -> None:
    second = FIRST + dt.timedelta(days=1)
    days[second] = [(longitude - 0.8, latitude, polarity) for longitude, latitude, polarity in STEADY]
    for gate, same in ((150, True), (50, False)):
        configuration = configure(eddies__gate_km=gate)
        link(configuration, days)
        assert (identifiers(configuration, second) == identifiers(configuration, FIRST)) == same


def test_no_eddies_on_any_day(configure: Configure) -> None:
    configuration = configure()
    link(configuration, {day: [] for day in days_between(FIRST, LAST)})
    found = analysis_of(configuration, "trajectories", LAST)
    assert found["trajectory"].dtype == np.int64
    assert found.sizes["eddy"] == 0
    assert sorted(read_record(configuration.work / "trajectories" / "links.json")["days"]) == [
        str(day) for day in days_between(FIRST, LAST)
    ]


def test_earlier_start_links_all_again_and_later_end_only_the_new(
    configure: Configure, days: dict[dt.date, Places]
) -> None:
    configuration = configure()
    link(configuration, {day: days[day] for day in days_between(FIRST + dt.timedelta(days=1), LAST)})
    assert link(configuration, days) == [str(day) for day in days]
    after = LAST + dt.timedelta(days=1)
    assert link(configuration, days | {after: drifting(8)}) == [str(after)]
    assert identifiers(configuration, after) == identifiers(configuration, FIRST)


def test_damaged_eddies_are_told(configure: Configure, days: dict[dt.date, Places]) -> None:
    configuration = configure()
    link(configuration, days)
    DayStore(configuration.work / "eddies").path(LAST).write_bytes(b"CDF")
    DayStore(configuration.work / "trajectories").path(LAST).unlink()
    with pytest.raises(SetdriftError, match=r"eddies/2031-03-08\.nc: is missing or damaged; delete the \.json"):
        link_trajectories(configuration, silent)
