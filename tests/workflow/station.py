"""A folder laid out like the project's, in which the real workflow is run as its users run it."""

from __future__ import annotations

import copy
import datetime as dt
import hashlib
import os
import re
import shutil
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import invented_sea
import xarray as xr
import yaml

ROOT = Path(__file__).parents[2]
DAILY_STAGES = ("observations", "maps", "dynamic_topography", "currents", "eddies")
LATE = invented_sea.FIRST
"""The day whose heron file comes late."""
PATIENCE_S = 400.0
"""Longest a call may take: only a hanging one takes longer, on a busy machine too."""


@dataclass(frozen=True)
class Outcome:
    """What a call of the workflow came to: exit code and what the terminal showed."""

    code: int
    text: str

    @property
    def jobs(self) -> dict[str, int]:
        """Number of jobs of each rule that were planned."""
        table = re.search(r"^job +count\n[-\s]+\n(.*?)^total", self.text, re.DOTALL | re.MULTILINE)
        rows = [line.split() for line in table[1].splitlines()] if table else []
        return {rule: int(count) for rule, count in rows if rule != "all"}

    @property
    def refusals(self) -> list[str]:
        """Lines in which setdrift says what stopped it."""
        return [line for line in self.text.splitlines() if line.startswith("setdrift: ")]


class Station:
    """The folder, its configurations and its runs."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        (folder / "config").mkdir(parents=True)
        (folder / "workflow").symlink_to(ROOT / "workflow")

    def configure(self, name: str = "inlet", **changes: Any) -> str:
        """Write a configuration, sections updated by `changes`; return its path as a user would give it."""
        content = copy.deepcopy(invented_sea.CONFIGURATION)
        for key, value in changes.items():
            content[key] = content[key] | value if isinstance(content.get(key), dict) else value
        (self.folder / "config" / f"{name}.yaml").write_text(yaml.safe_dump(content, sort_keys=False))
        return f"config/{name}.yaml"

    def run(self, *words: str, cores: int = 2, directory: Path | None = None) -> Outcome:
        """Call snakemake and wait for its end."""
        process = self.launch(*words, cores=cores, directory=directory)
        try:
            text, _ = process.communicate(timeout=PATIENCE_S)
        except subprocess.TimeoutExpired:
            os.killpg(process.pid, signal.SIGKILL)
            raise
        return Outcome(process.returncode, text)

    def launch(self, *words: str, cores: int = 2, directory: Path | None = None) -> subprocess.Popen[str]:
        """Call snakemake in a process group of its own."""
        return subprocess.Popen(
            [sys.executable, "-m", "snakemake", "--cores", str(cores), *words],
            cwd=directory or self.folder,
            stdout=subprocess.PIPE,
            stderr=subprocess.STDOUT,
            text=True,
            start_new_session=True,
            env=os.environ | {"OPENBLAS_NUM_THREADS": "1"},
        )

    def work(self, analysis: str = "inlet") -> Path:
        """Folder of an analysis's work files."""
        return self.folder / "results" / "work" / analysis

    def products(self, analysis: str = "inlet") -> Path:
        """Folder of an analysis's products."""
        return self.folder / "results" / "products" / analysis

    def day_marks(self, analysis: str = "inlet") -> dict[str, dict[str, int]]:
        """When each stage's file of each day was written."""
        return {
            stage: {path.stem: path.stat().st_mtime_ns for path in (self.work(analysis) / stage).glob("*.nc")}
            for stage in DAILY_STAGES
        }


def remade(before: dict[str, dict[str, int]], after: dict[str, dict[str, int]]) -> dict[str, list[str]]:
    """Days of each stage whose files were written between two sets of marks."""
    return {
        stage: sorted(day for day, mark in marks.items() if before[stage].get(day) != mark)
        for stage, marks in after.items()
    }


def names(*numbers: int) -> list[str]:
    """Analysed days of these numbers, as they are called in files."""
    return [invented_sea.day_of_period(number).isoformat() for number in numbers]


def tree(folder: Path) -> dict[str, tuple[int, str]]:
    """Time of writing and digest of every file below a folder."""
    return {
        str(path.relative_to(folder)): (path.stat().st_mtime_ns, hashlib.sha256(path.read_bytes()).hexdigest())
        for path in folder.rglob("*")
        if path.is_file()
    }


def assert_same_products(first: Path, second: Path) -> None:
    """Compare two analyses' products array for array; how often a day was rewritten does not count."""
    with xr.open_zarr(first / "daily.zarr") as one, xr.open_zarr(second / "daily.zarr") as other:
        xr.testing.assert_equal(one.drop_vars("revision"), other.drop_vars("revision"))
    with (
        xr.open_datatree(first / "eddies.zarr", engine="zarr") as one,
        xr.open_datatree(second / "eddies.zarr", engine="zarr") as other,
    ):
        for group in ("detections", "trajectories"):
            assert one[group].sizes
            xr.testing.assert_equal(one[group].to_dataset(), other[group].to_dataset())


def wait_for(condition: Callable[[], bool], process: subprocess.Popen[str]) -> None:
    """Wait until a condition holds; the process must not end before."""
    begun = time.monotonic()
    while not condition():
        assert process.poll() is None, process.communicate()[0]
        assert time.monotonic() - begun < PATIENCE_S
        time.sleep(0.05)


def touch_all(folder: Path, when: dt.datetime) -> None:
    """Give every file of a folder a new time of writing."""
    for path in folder.rglob("*.nc"):
        os.utime(path, (when.timestamp(), when.timestamp()))


class Snapshot:
    """A folder as it was: put back in the same place, because the workflow knows its files by their full paths."""

    def __init__(self, folder: Path, kept: Path) -> None:
        self._folder, self._kept = folder, kept
        shutil.copytree(folder, kept, symlinks=True)

    def restore(self) -> None:
        """Put the folder back as it was, times of writing included."""
        shutil.rmtree(self._folder)
        shutil.copytree(self._kept, self._folder, symlinks=True)


@dataclass(frozen=True)
class FirstRuns:
    """Two analyses run at the same time in one folder, bad files among the good."""

    station: Station
    inlet: Outcome
    cove: Outcome
    snapshot: Snapshot


@dataclass(frozen=True)
class KilledRun:
    """A run of all files, killed and run again."""

    station: Station
    mapped_before: dict[str, int]
    refused: Outcome
    unlocked: Outcome
    finished: Outcome
