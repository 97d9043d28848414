"""Running one stage by its name, with a log that tells what happened and when."""

from __future__ import annotations

import datetime as dt
import re
import traceback
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from setdrift.data.configuration import Configuration
from setdrift.data.days import Block
from setdrift.errors import SetdriftError

Announce = Callable[[str], None]


@dataclass(frozen=True)
class Job:
    """One job of the workflow.

    Attributes
    ----------
    configuration : Configuration
        The analysis.
    rule : str
        The rule's name.
    block : Block or None
        The days the job handles, for rules that work in blocks.
    """

    configuration: Configuration
    rule: str
    block: Block | None

    @property
    def label(self) -> str:
        """How the job is called in logs and on the terminal."""
        return f"{self.rule} {self.block.label}" if self.block else self.rule

    def required_block(self) -> Block:
        """Return the block.

        Returns
        -------
        Block
            The days the job handles.

        Raises
        ------
        SetdriftError
            The job was given none.
        """
        if self.block is None:
            raise SetdriftError(self.rule, "works on a block of days and was given none", "add --block YYYY-MM-DD")
        return self.block


def _gather_observations(job: Job, announce: Announce) -> None:
    from setdrift.stages.observations import gather_observations

    gather_observations(job.configuration, job.required_block(), announce)


def _prepare_fixed_fields(job: Job, announce: Announce) -> None:
    from setdrift.stages.fixed_fields import prepare_fixed_fields

    prepare_fixed_fields(job.configuration, announce)


def _map_sea_level(job: Job, announce: Announce) -> None:
    from setdrift.stages.mapping import map_block

    map_block(job.configuration, job.required_block(), announce)


def _add_mean_topography(job: Job, announce: Announce) -> None:
    from setdrift.stages.dynamic_topography import add_mean_block

    add_mean_block(job.configuration, job.required_block(), announce)


def _compute_currents(job: Job, announce: Announce) -> None:
    from setdrift.stages.currents import currents_block

    currents_block(job.configuration, job.required_block(), announce)


def _detect_eddies(job: Job, announce: Announce) -> None:
    from setdrift.stages.eddies import eddies_block

    eddies_block(job.configuration, job.required_block(), announce)


def _link_trajectories(job: Job, announce: Announce) -> None:
    from setdrift.stages.trajectories import link_trajectories

    link_trajectories(job.configuration, announce)


def _publish_daily(job: Job, announce: Announce) -> None:
    from setdrift.stages.publish import publish_daily

    publish_daily(job.configuration, dt.datetime.now(dt.UTC), announce)


def _publish_eddies(job: Job, announce: Announce) -> None:
    from setdrift.stages.publish import publish_eddies

    publish_eddies(job.configuration, dt.datetime.now(dt.UTC), announce)


def _draw_bulletin(job: Job, announce: Announce) -> None:
    from setdrift.stages.bulletin import draw_bulletin

    draw_bulletin(job.configuration, announce)


RULES: dict[str, Callable[[Job, Announce], None]] = {
    "gather_observations": _gather_observations,
    "prepare_fixed_fields": _prepare_fixed_fields,
    "map_sea_level": _map_sea_level,
    "add_mean_topography": _add_mean_topography,
    "compute_currents": _compute_currents,
    "detect_eddies": _detect_eddies,
    "link_trajectories": _link_trajectories,
    "publish_daily": _publish_daily,
    "publish_eddies": _publish_eddies,
    "draw_bulletin": _draw_bulletin,
}


def unfinished_jobs(work: Path, since: dt.datetime) -> list[str]:
    """Tell which jobs began and did not end well, from the logs.

    Parameters
    ----------
    work : Path
        Folder of the analysis's work files.
    since : datetime
        Logs that were last written before are left out.

    Returns
    -------
    list of str
        For each job its name, what stopped it, and its log.
    """
    logs = work / "logs"
    written = sorted(log for log in logs.rglob("*.log") if log.stat().st_mtime >= since.timestamp())
    told = []
    for log in written:
        # earlier runs are in the same log
        last = log.read_text(encoding="utf-8").rpartition(": begins\n")[2]
        if last.endswith(": ends\n"):
            continue
        error = re.search(r" ERROR \S+ [^:]*: (.*)", last)
        reason = error[1] if error else "was stopped from outside: by someone, or by the system for lack of memory"
        told.append(f"{log.relative_to(logs).with_suffix('').as_posix().replace('/', ' ')}: {reason}\n  log: {log}")
    return told


def run_job(job: Job, log: Path | None, show: Announce) -> None:
    """Run a job; its lines go to the log with the time, and to the terminal.

    Parameters
    ----------
    job : Job
        What to run.
    log : Path or None
        File the lines are added to.
    show : callable
        Prints a line on the terminal.

    Raises
    ------
    SetdriftError
        The job failed; the log holds the traceback.
    """
    if log is not None:
        log.parent.mkdir(parents=True, exist_ok=True)

    def note(level: str, message: str) -> None:
        if log is not None:
            stamp = dt.datetime.now(dt.UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
            with log.open("a", encoding="utf-8") as stream:
                stream.write(f"{stamp} {level} {job.configuration.analysis} {job.label}: {message}\n")

    def announce(message: str) -> None:
        note("INFO", message)
        show(f"{job.label}: {message}")

    note("INFO", "begins")
    try:
        RULES[job.rule](job, announce)
    except Exception as error:
        note("ERROR", f"{error}\n{traceback.format_exc()}")
        if isinstance(error, SetdriftError):
            raise
        where = f"log {log}" if log else "run again with --log FILE"
        raise SetdriftError(
            f"{job.configuration.analysis} {job.label}", f"failed ({type(error).__name__}: {error})", f"see the {where}"
        ) from error
    note("INFO", "ends")
