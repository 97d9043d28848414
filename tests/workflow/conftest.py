"""Runs that several tests look at: they are made once, side by side."""

from __future__ import annotations

import os
import signal
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import invented_sea
import pytest
from station import LATE, FirstRuns, KilledRun, Snapshot, Station, wait_for

COVE = {
    "analysis": "cove",
    "period": {"start": "2031-03-05", "end": "latest"},
    "grid": {"west": -28, "east": -20, "south": 22, "north": 30, "spacing": 1.0},
    "altimeters": {"heron": {"files": "../heron/2031-03-0[2-5].nc"}, "curlew": {"files": "../none/*.nc"}},
    "block_days": 30,
}


@pytest.fixture(scope="session")
def all_runs(tmp_path_factory: pytest.TempPathFactory) -> tuple[FirstRuns, KilledRun]:
    """Make the shared runs; together, because most of a run's jobs wait for each other."""
    folder = tmp_path_factory.mktemp("workflow")
    # written before the threads begin: the NetCDF library is not made for several
    stations = [Station(folder / name) for name in ("first", "killed")]
    for station in stations:
        invented_sea.write_inputs(station.folder)
    with ThreadPoolExecutor(2) as pool:
        first, killed = pool.submit(_first_runs, stations[0]), pool.submit(_killed_run, stations[1])
        return first.result(), killed.result()


@pytest.fixture
def first_runs(all_runs: tuple[FirstRuns, KilledRun]) -> FirstRuns:
    """The two analyses, the folder as it was after them."""
    all_runs[0].snapshot.restore()
    return all_runs[0]


@pytest.fixture(scope="session")
def killed_run(all_runs: tuple[FirstRuns, KilledRun]) -> KilledRun:
    """The run that was killed and run again."""
    return all_runs[1]


def _first_runs(station: Station) -> FirstRuns:
    folder = station.folder
    (folder / "heron" / f"{LATE}.nc").unlink()
    whole = (folder / "heron" / "2031-03-05.nc").read_bytes()
    (folder / "heron" / "2031-03-05_cut.nc").write_bytes(whole[: len(whole) // 2])
    (folder / "curlew" / "notes.nc").write_text("the antenna was cleaned today\n")
    inlet, cove = station.configure(), station.configure("cove", **COVE)
    with ThreadPoolExecutor(2) as pool:
        runs = [pool.submit(station.run, "--configfile", name, cores=1) for name in (inlet, cove)]
        outcomes = [run.result() for run in runs]
    return FirstRuns(station, *outcomes, Snapshot(folder, folder.with_name("kept")))


def _killed_run(station: Station) -> KilledRun:
    name = station.configure(block_days=30)
    process = station.launch("--configfile", name)
    maps = station.work() / "maps"
    # a day of the maps' only job is done, and the job goes on
    wait_for(lambda: any(maps.glob("2*.nc")), process)
    os.killpg(process.pid, signal.SIGKILL)
    process.communicate()
    mapped = station.day_marks()["maps"]
    calls = [station.run("--configfile", name, *more) for more in ((), ("--unlock",), ())]
    return KilledRun(station, mapped, *calls)


@pytest.fixture
def empty_station(tmp_path: Path) -> Station:
    """A folder without any observations."""
    return Station(tmp_path / "station")
