"""Runs after the first: what changed is made again, and nothing else."""

from __future__ import annotations

import datetime as dt
import re
from concurrent.futures import ThreadPoolExecutor

import invented_sea
import xarray as xr
from station import LATE, ROOT, FirstRuns, KilledRun, assert_same_products, names, remade, touch_all, tree

TO_THE_END = {"link_trajectories": 1, "publish_eddies": 1, "draw_bulletin": 1}
AFTER_MAPS = TO_THE_END | {"detect_eddies": 2, "compute_currents": 2, "add_mean_topography": 2, "publish_daily": 1}


def test_a_second_run_does_nothing_however_it_is_called(first_runs: FirstRuns) -> None:
    station = first_runs.station
    before = tree(station.folder / "results")
    outcome = station.run(
        *("--snakefile", str(ROOT / "workflow" / "Snakefile")),
        *("--workflow-profile", str(ROOT / "workflow" / "profiles" / "default")),
        *("--directory", str(station.folder)),
        *("--configfile", str(station.folder / "config" / "inlet.yaml")),
        directory=station.folder.parent,
    )
    assert outcome.code == 0, outcome.text
    assert "Nothing to be done" in outcome.text
    assert "0 examined" in outcome.text
    assert tree(station.folder / "results") == before


def test_touched_files_start_nothing(first_runs: FirstRuns) -> None:
    station = first_runs.station
    results = station.folder / "results"
    before = tree(results)
    for folder in ("heron", "curlew"):
        touch_all(station.folder / folder, dt.datetime.now(dt.UTC))
    for name in ("mean.nc", "land.nc"):
        (station.folder / name).touch()
    outcome = station.run("--configfile", "config/inlet.yaml")
    assert outcome.code == 0, outcome.text
    assert "Nothing to be done" in outcome.text
    assert " 0 examined" not in outcome.text
    changed = {name for name, mark in tree(results).items() if before.get(name) != mark}
    assert changed == {"work/inlet/inventory.json"}


def test_a_changed_setting_starts_its_own_stage_and_those_after(first_runs: FirstRuns) -> None:
    station = first_runs.station
    names_ = [
        station.configure("detection", eddies={"minimum_amplitude_m": 0.03}),
        station.configure("tracking", eddies={"gate_km": 100}),
        station.configure("mapping", mapping={"signal_m": 0.2}),
    ]
    with ThreadPoolExecutor(2) as pool:
        planned = list(pool.map(lambda name: station.run("--dry-run", "--configfile", name).jobs, names_))
    assert planned == [TO_THE_END | {"detect_eddies": 2}, TO_THE_END, AFTER_MAPS | {"map_sea_level": 2}]


def test_a_late_file_remakes_the_days_whose_window_holds_it(first_runs: FirstRuns, killed_run: KilledRun) -> None:
    station = first_runs.station
    before = station.day_marks()
    others = [station.products("cove"), station.work("cove")]
    others_before = [tree(folder) for folder in others]
    invented_sea.write_heron(station.folder, LATE)
    outcome = station.run("--configfile", "config/inlet.yaml")
    assert outcome.code == 0, outcome.text
    assert outcome.jobs == AFTER_MAPS | {"gather_observations": 1, "map_sea_level": 2}
    # the file is of the first day, and the window reaches two days
    affected = names(0, 1, 2)
    assert remade(before, station.day_marks()) == {
        "observations": names(0),
        "maps": affected,
        "dynamic_topography": affected,
        "currents": affected,
        "eddies": affected,
    }
    with xr.open_zarr(station.products() / "daily.zarr") as daily:
        assert daily.revision.values.tolist() == [2, 2, 2, 0]
    assert [tree(folder) for folder in others] == others_before
    # that run began with all files and without the bad ones, was killed, and had one block instead of two
    assert_same_products(station.products(), killed_run.station.products())


def test_a_longer_period_is_appended(first_runs: FirstRuns) -> None:
    station = first_runs.station
    daily = station.products() / "daily.zarr"
    before, days_before = tree(daily), station.day_marks()
    outcome = station.run("--configfile", station.configure(period={"end": names(4)[0]}))
    assert outcome.code == 0, outcome.text
    made = remade(days_before, station.day_marks())
    assert made == dict.fromkeys(made, names(4)) | {"observations": names(6)}
    after = tree(daily)
    chunks = {name for name in before if re.fullmatch(r"\w+/c/[0-3]/0/0", name)}
    assert len(chunks) > 4 * 10
    assert {name: after[name] for name in chunks} == {name: before[name] for name in chunks}
    assert "publish_daily: 1 days added, 0 days rewritten, 0 days retired" in outcome.text
    with xr.open_zarr(daily) as published:
        assert list(published.time.dt.strftime("%Y-%m-%d").values) == names(0, 1, 2, 3, 4)


def test_a_receipt_taken_away_is_missed(first_runs: FirstRuns) -> None:
    # as after a failed job, whose receipt is removed while the products stand
    station = first_runs.station
    (station.work() / "trajectories" / "links.json").unlink()
    assert station.run("--dry-run", "--configfile", "config/inlet.yaml").jobs == TO_THE_END
