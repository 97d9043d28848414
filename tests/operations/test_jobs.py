"""Jobs: which function a rule calls, and what its log tells."""

from __future__ import annotations

import datetime as dt
import importlib
import re
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from setdrift.data.configuration import Configuration
from setdrift.data.days import Block
from setdrift.errors import SetdriftError
from setdrift.operations.jobs import RULES, Job, run_job

Configure = Callable[..., Configuration]
BLOCK = Block.holding(dt.date(2031, 3, 1), 2)
STAGES = {
    "gather_observations": "observations.gather_observations",
    "prepare_fixed_fields": "fixed_fields.prepare_fixed_fields",
    "map_sea_level": "mapping.map_block",
    "add_mean_topography": "dynamic_topography.add_mean_block",
    "compute_currents": "currents.currents_block",
    "detect_eddies": "eddies.eddies_block",
    "link_trajectories": "trajectories.link_trajectories",
    "publish_daily": "publish.publish_daily",
    "publish_eddies": "publish.publish_eddies",
    "draw_bulletin": "bulletin.draw_bulletin",
}
IN_BLOCKS = {"gather_observations", "map_sea_level", "add_mean_topography", "compute_currents", "detect_eddies"}


def silent(_: str) -> None:
    """Tell nobody."""


def test_every_rule_of_the_workflow_is_a_job() -> None:
    rules = Path(__file__).parents[2] / "workflow" / "rules"
    called = {rule for path in rules.glob("*.smk") for rule in re.findall(r"\{JOB\} (\w+) ", path.read_text())}
    assert called == set(RULES) == set(STAGES)


@pytest.mark.parametrize("rule", STAGES)
def test_rule_calls_its_stage(rule: str, configure: Configure, monkeypatch: pytest.MonkeyPatch) -> None:
    module, _, function = STAGES[rule].partition(".")
    stage = importlib.import_module(f"setdrift.stages.{module}")
    calls: list[Any] = []
    monkeypatch.setattr(stage, function, lambda *given: calls.append(given))
    configuration = configure()
    run_job(Job(configuration, rule, BLOCK), None, silent)
    assert calls[0][0] is configuration
    assert (BLOCK in calls[0]) == (rule in IN_BLOCKS)
    if rule.startswith("publish"):
        assert abs((dt.datetime.now(dt.UTC) - calls[0][1]).total_seconds()) < 60


@pytest.mark.parametrize("rule", sorted(IN_BLOCKS))
def test_rule_that_works_in_blocks_needs_one(rule: str, configure: Configure) -> None:
    with pytest.raises(SetdriftError, match=f"{rule}: works on a block of days and was given none; add --block"):
        run_job(Job(configure(), rule, None), None, silent)


def test_unexpected_error_is_one_line_with_the_traceback_in_the_log(
    configure: Configure, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(*_: Any) -> None:
        raise ZeroDivisionError("by nought")

    monkeypatch.setitem(RULES, "compute_currents", fail)
    log = tmp_path / "logs" / "deep" / "currents.log"
    job = Job(configure(), "compute_currents", BLOCK)
    with pytest.raises(SetdriftError) as caught:
        run_job(job, log, silent)
    assert str(caught.value) == (
        f"small_sea compute_currents 2031-02-28: failed (ZeroDivisionError: by nought); see the log {log}"
    )
    text = log.read_text()
    assert "ERROR small_sea compute_currents 2031-02-28: by nought\nTraceback (most recent call last):\n" in text
    assert text.rstrip().endswith("ZeroDivisionError: by nought")
    assert "ends" not in text
    with pytest.raises(SetdriftError, match="run again with --log FILE"):
        run_job(job, None, silent)
    # a second run adds to the log
    monkeypatch.setitem(RULES, "compute_currents", lambda *_: None)
    run_job(job, log, silent)
    assert log.read_text().startswith(text)


def test_problem_the_user_can_act_on_stays_as_it_is(
    configure: Configure, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    problem = SetdriftError("land.nc", "cannot be read", "replace it")

    def fail(*_: Any) -> None:
        raise problem

    monkeypatch.setitem(RULES, "prepare_fixed_fields", fail)
    with pytest.raises(SetdriftError) as caught:
        run_job(Job(configure(), "prepare_fixed_fields", None), tmp_path / "x.log", silent)
    assert caught.value is problem
    assert (
        "ERROR small_sea prepare_fixed_fields: land.nc: cannot be read; replace it" in (tmp_path / "x.log").read_text()
    )


def test_lines_carry_the_time_in_the_log_only(
    configure: Configure, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(RULES, "link_trajectories", lambda _, announce: announce("2031-03-01 done"))
    shown: list[str] = []
    run_job(Job(configure(), "link_trajectories", None), tmp_path / "x.log", shown.append)
    assert shown == ["link_trajectories: 2031-03-01 done"]
    stamp = r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ INFO small_sea link_trajectories: "
    lines = (tmp_path / "x.log").read_text().splitlines()
    assert all(re.match(stamp, line) for line in lines)
    assert len(lines) == 3
