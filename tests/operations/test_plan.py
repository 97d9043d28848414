"""Which receipts a job waits for."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from pathlib import Path

import pytest

from setdrift.data.configuration import Configuration
from setdrift.data.days import Block
from setdrift.operations.plan import Plan

FIRST, LAST = dt.date(2031, 3, 1), dt.date(2031, 3, 3)


@pytest.fixture
def plan(configure: Callable[..., Configuration]) -> Plan:
    return Plan(configure(), FIRST, LAST)


def names(paths: list[str]) -> list[str]:
    return [Path(path).stem for path in paths]


def test_receipts_cover_the_analysed_days(plan: Plan) -> None:
    # blocks of two days are counted from 1970: 1 March 2031 is the second day of its block
    assert names(plan.receipts("maps")) == ["2031-02-28", "2031-03-02"]
    assert all(str(plan.configuration.work / "maps") in path for path in plan.receipts("maps"))


def test_maps_wait_for_the_observations_in_reach(plan: Plan) -> None:
    # 1 March alone is analysed of its block; its window of 2 days reaches from 27 February to 3 March
    assert names(plan.observation_receipts("2031-02-28")) == ["2031-02-26", "2031-02-28", "2031-03-02"]
    assert names(plan.observation_receipts("2031-03-02")) == ["2031-02-28", "2031-03-02", "2031-03-04"]


def test_span_tells_the_days_a_job_handles(plan: Plan) -> None:
    assert plan.span("2031-02-28") == "2031-03-01 to 2031-03-01"
    assert plan.span("2031-03-02") == "2031-03-02 to 2031-03-03"
    assert plan.span("2031-02-26", 2) == "2031-02-27 to 2031-02-27"


def test_longer_period_leaves_earlier_blocks_as_they_are(plan: Plan) -> None:
    longer = Plan(plan.configuration, FIRST, dt.date(2031, 3, 9))
    assert longer.receipts("maps")[:2] == plan.receipts("maps")
    assert longer.span("2031-02-28") == plan.span("2031-02-28")
    assert Block.named("2031-03-04", 2).days_within(FIRST, LAST) == []
