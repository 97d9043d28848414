"""Runs that fail or are killed: what is published stands, and the next run mends."""

from __future__ import annotations

import xarray as xr
from station import FirstRuns, KilledRun, Outcome, names, remade, tree


def test_a_failing_day_leaves_the_products_as_they_were(first_runs: FirstRuns) -> None:
    station = first_runs.station
    products, marks = tree(station.products()), station.day_marks()
    damaged = station.work() / "currents" / f"{names(2)[0]}.nc"
    damaged.write_bytes(damaged.read_bytes()[:1000])
    changed = station.configure(eddies={"minimum_amplitude_m": 0.03})

    failed = station.run("--configfile", changed)
    assert failed.code != 0
    assert tree(station.products()) == products
    log = station.work() / "logs" / "detect_eddies" / "2031-03-06.log"
    assert_summary_names(failed, "detect_eddies 2031-03-06", str(log), str(damaged))
    assert "Traceback (most recent call last)" in log.read_text()
    # the other block went on, and is not made again
    assert remade(marks, station.day_marks())["eddies"] == names(0, 1)

    # as the message says
    for receipt in damaged.parent.glob("*.json"):
        receipt.unlink()
    marks = station.day_marks()
    mended = station.run("--configfile", changed)
    assert mended.code == 0, mended.text
    made = remade(marks, station.day_marks())
    assert made == {
        "observations": [],
        "maps": [],
        "dynamic_topography": [],
        "currents": names(2),
        "eddies": names(2, 3),
    }
    with xr.open_zarr(station.products() / "daily.zarr") as daily:
        assert daily.revision.values.tolist() == [0, 0, 0, 0]


def assert_summary_names(outcome: Outcome, *told: str) -> None:
    """The last lines say which job failed, why, and where its log is."""
    summary = outcome.text[outcome.text.index("setdrift: the run of inlet did not finish") :]
    for text in told:
        assert text in summary
    assert "what was published before stands" in summary


def test_a_killed_run_leaves_a_lock_and_says_how_to_remove_it(killed_run: KilledRun) -> None:
    assert killed_run.refused.code != 0
    assert "--unlock" in killed_run.refused.text
    assert not killed_run.refused.jobs
    assert killed_run.unlocked.code == 0, killed_run.unlocked.text


def test_a_killed_run_goes_on_where_it_was(killed_run: KilledRun) -> None:
    assert killed_run.finished.code == 0, killed_run.finished.text
    assert "gather_observations" not in killed_run.finished.jobs
    marks = killed_run.station.day_marks()["maps"]
    assert killed_run.mapped_before
    assert {day: marks[day] for day in killed_run.mapped_before} == killed_run.mapped_before
    assert sorted(marks) == names(0, 1, 2, 3)
    assert not list(killed_run.station.products().rglob("*.part"))
