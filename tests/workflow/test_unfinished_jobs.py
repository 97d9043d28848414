"""The summary after a run that failed is right about what happened in it."""

from __future__ import annotations

import datetime as dt
import os
from pathlib import Path

import pytest

from setdrift.operations.jobs import unfinished_jobs

BEGUN = dt.datetime(2031, 3, 21, 6, 0, tzinfo=dt.UTC)
STAMP = "2031-03-21T06:00:05Z"
BEGINS, ENDS = "INFO inlet map_sea_level 2031-03-02: begins", "INFO inlet map_sea_level 2031-03-02: ends"
FAILED = "ERROR inlet map_sea_level 2031-03-02: /a/b.nc: is damaged; mend it\nTraceback (most recent call last):\n  ..."


@pytest.mark.parametrize(
    ("lines", "told"),
    [
        ([BEGINS, ENDS], None),
        ([BEGINS, FAILED, BEGINS, ENDS], None),
        ([BEGINS, FAILED], "/a/b.nc: is damaged; mend it"),
        ([BEGINS, ENDS, BEGINS, FAILED], "/a/b.nc: is damaged; mend it"),
        ([BEGINS, FAILED, BEGINS], "was stopped from outside: by someone, or by the system for lack of memory"),
    ],
)
def test_the_last_attempt_counts(tmp_path: Path, lines: list[str], told: str | None) -> None:
    log = write_log(tmp_path, lines, BEGUN + dt.timedelta(seconds=5))
    expected = [] if told is None else [f"map_sea_level 2031-03-02: {told}\n  log: {log}"]
    assert unfinished_jobs(tmp_path, BEGUN) == expected


def test_what_failed_in_an_earlier_run_is_not_told_again(tmp_path: Path) -> None:
    write_log(tmp_path, [BEGINS, FAILED], BEGUN - dt.timedelta(seconds=5))
    assert unfinished_jobs(tmp_path, BEGUN) == []


def write_log(work: Path, lines: list[str], when: dt.datetime) -> Path:
    log = work / "logs" / "map_sea_level" / "2031-03-02.log"
    log.parent.mkdir(parents=True)
    log.write_text("".join(f"{STAMP} {line}\n" for line in lines))
    os.utime(log, (when.timestamp(), when.timestamp()))
    return log
