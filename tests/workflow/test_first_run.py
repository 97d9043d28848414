"""A first run: what it leaves behind, and what it says about files it cannot use."""

from __future__ import annotations

import json

import invented_sea
import numpy as np
import pytest
import xarray as xr
from station import DAILY_STAGES, FirstRuns, names

EVERY_RULE = {
    "gather_observations",
    "prepare_fixed_fields",
    "map_sea_level",
    "add_mean_topography",
    "compute_currents",
    "detect_eddies",
    "link_trajectories",
    "publish_daily",
    "publish_eddies",
    "draw_bulletin",
}


def test_a_run_publishes_maps_eddies_and_a_picture(first_runs: FirstRuns) -> None:
    assert first_runs.inlet.code == 0, first_runs.inlet.text
    products = first_runs.station.products()
    shown = {path.name for path in products.iterdir() if not path.name.startswith(".")}
    assert shown == {"daily.zarr", "eddies.zarr", "bulletin"}
    assert [path.name for path in (products / "bulletin").iterdir()] == ["2031-03-07.png"]
    assert (products / "bulletin" / "2031-03-07.png").read_bytes().startswith(b"\x89PNG")


def test_every_rule_leaves_a_log_and_a_benchmark(first_runs: FirstRuns) -> None:
    assert set(first_runs.inlet.jobs) == EVERY_RULE
    work = first_runs.station.work()
    for rule, count in first_runs.inlet.jobs.items():
        logs = list((work / "logs").rglob(f"{rule}*/*.log" if count > 1 else f"{rule}*.log"))
        assert len(logs) == count, rule
        for log in logs:
            lines = log.read_text().splitlines()
            assert " INFO inlet " in lines[0]
            assert lines[0].endswith("begins")
            assert lines[-1].endswith("ends")
        tables = list((work / "benchmarks").rglob(f"{rule}*/*.tsv" if count > 1 else f"{rule}*.tsv"))
        assert len(tables) == count, rule
        assert all(table.read_text().startswith("s\t") for table in tables)


@pytest.mark.parametrize("stage", DAILY_STAGES)
def test_receipts_tell_the_days_that_were_made(first_runs: FirstRuns, stage: str) -> None:
    receipts = [json.loads(path.read_text()) for path in sorted((first_runs.station.work() / stage).glob("*.json"))]
    days = [day for receipt in receipts for day in receipt["days"]]
    margin = invented_sea.WINDOW if stage == "observations" else 0
    assert days == names(*range(-margin, invented_sea.DAYS + margin))
    assert {receipt["block"] for receipt in receipts} == {"2031-03-02", "2031-03-06"}


@pytest.mark.parametrize("consolidated", [True, False])
def test_products_open_with_and_without_consolidated_metadata(first_runs: FirstRuns, consolidated: bool) -> None:
    products = first_runs.station.products()
    with xr.open_zarr(products / "daily.zarr", consolidated=consolidated) as daily:
        assert list(daily.time.dt.strftime("%Y-%m-%d %H").values) == [f"{day} 12" for day in names(0, 1, 2, 3)]
        assert daily.revision.values.tolist() == [0, 0, 0, 0]
        level = daily.sea_level_anomaly.isel(time=3).values
        assert daily.velocity_method.max() > 0
        truth = invented_sea.sea_level(*np.meshgrid(daily.longitude, daily.latitude), invented_sea.day_of_period(3))
    sea = np.isfinite(level)
    assert sea.mean() > 0.9
    # the high is 25 cm: a wrong day, a swapped axis or a forgotten tide would be far outside
    assert np.sqrt(np.mean((level - truth)[sea] ** 2)) < 0.03
    with xr.open_datatree(products / "eddies.zarr", engine="zarr", consolidated=consolidated) as eddies:
        assert set(eddies["detections"].polarity.values.tolist()) == {-1, 1}
        assert eddies["trajectories"].row_size.values.max() == invented_sea.DAYS


def test_files_that_cannot_be_used_are_named_with_the_reason(first_runs: FirstRuns) -> None:
    entries = json.loads((first_runs.station.work() / "manifests" / "set_aside.json").read_text())
    aside = {entry["path"].rsplit("/", 1)[1]: entry for entry in entries}
    assert set(aside) == {"notes.nc", "2031-03-05_cut.nc"}
    assert aside["notes.nc"]["altimeter"] == "curlew"
    for entry in entries:
        assert entry["path"] in entry["reason"]
        assert f"set aside: {entry['reason']}" in first_runs.inlet.text
    assert "2 set aside" in first_runs.inlet.text


def test_two_analyses_run_side_by_side_in_one_folder(first_runs: FirstRuns) -> None:
    assert first_runs.cove.code == 0, first_runs.cove.text
    station = first_runs.station
    with xr.open_zarr(station.products("cove") / "daily.zarr") as cove:
        assert cove.sizes["latitude"] == 8
    with xr.open_zarr(station.products() / "daily.zarr") as inlet:
        assert inlet.sizes["latitude"] == 18
    assert {path.name for path in (station.folder / "results" / "work").iterdir()} == {"inlet", "cove"}


def test_the_period_may_end_with_the_newest_observations(first_runs: FirstRuns) -> None:
    with xr.open_zarr(first_runs.station.products("cove") / "daily.zarr") as cove:
        assert list(cove.time.dt.strftime("%Y-%m-%d").values) == ["2031-03-05"]
    assert "warning: altimeter curlew: no file matches" in first_runs.cove.text
