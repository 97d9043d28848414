"""What is wrong before a run begins stops it at once, in one line, and leaves nothing behind."""

from __future__ import annotations

import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor

import invented_sea
import pytest
from station import Outcome, Station

WRONG = {"grid": {"south": 33}}
CASES = {
    "wrong value": ["config/wrong.yaml: grid", "south (33.0) must be below north (32.0)", "change one of them"],
    "no configuration": ["one configuration is needed", "add --configfile config/NAME.yaml"],
    "two configurations": ["one configuration is needed", "add --configfile config/NAME.yaml"],
    "no mean": ["mean_dynamic_topography.file", "nowhere.nc", "No such file", "correct the path or fetch the file"],
    "no files": ["altimeters", "no file matches", "nothing/*.nc", "correct the patterns or fetch the files"],
}


@pytest.fixture(scope="module")
def refused(tmp_path_factory: pytest.TempPathFactory) -> tuple[Station, dict[str, Outcome]]:
    station = Station(tmp_path_factory.mktemp("refusals") / "station")
    invented_sea.write_heron(station.folder, invented_sea.FIRST)
    nothing = {name: {"files": "../nothing/*.nc"} for name in ("heron", "curlew")}
    calls = {
        "wrong value": ["--configfile", station.configure("wrong", **WRONG)],
        "no configuration": [],
        "two configurations": ["--configfile", station.configure("one"), station.configure("two")],
        "no mean": ["--configfile", station.configure("no_mean", mean_dynamic_topography={"file": "../nowhere.nc"})],
        "no files": ["--configfile", station.configure("no_files", altimeters=nothing)],
    }
    with ThreadPoolExecutor(2) as pool:
        outcomes = pool.map(lambda words: station.run(*words), calls.values())
        return station, dict(zip(calls, outcomes, strict=True))


@pytest.mark.parametrize("case", CASES)
def test_it_stops_with_one_line(refused: tuple[Station, dict[str, Outcome]], case: str) -> None:
    station, outcomes = refused
    outcome = outcomes[case]
    assert outcome.code != 0
    assert len(outcome.refusals) == 1, outcome.text
    for text in CASES[case]:
        assert text in outcome.refusals[0]
    assert "Traceback" not in outcome.text
    assert not outcome.jobs
    assert not (station.folder / "results").exists()


def test_only_the_rules_of_the_workflow_are_jobs(empty_station: Station) -> None:
    config = empty_station.folder / empty_station.configure()
    command = [sys.executable, "-m", "setdrift.cli", "job", "map_sea_levels", str(config)]
    ended = subprocess.run(command, check=False, capture_output=True, text=True)
    assert ended.returncode == 1
    assert ended.stderr.startswith("setdrift: job map_sea_levels: is not a rule; choose one of gather_observations")
    assert not (empty_station.folder / "results").exists()
