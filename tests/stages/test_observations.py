"""Gathering the observations of a block of days."""

from __future__ import annotations

import datetime as dt
import errno
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
from altimeter_files import plain_columns, seconds, write, write_land, write_mean, write_plain

from setdrift.data.configuration import Configuration
from setdrift.data.day_store import DayStore
from setdrift.data.editing import REASONS
from setdrift.errors import SetdriftError
from setdrift.operations.inventory import take_inventory
from setdrift.stages import observations
from setdrift.stages.observations import gather_observations

Configure = Callable[..., Configuration]
FIRST = dt.date(2031, 2, 27)


def silent(_: str) -> None:
    """Tell nobody."""


@pytest.fixture
def sea(tmp_path: Path) -> Path:
    """Give a folder with fixed files and a week of two altimeters, one of them in centimetres."""
    write_land(tmp_path / "land.nc")
    write_mean(tmp_path / "mean.nc")
    for n in range(7):
        day = FIRST + dt.timedelta(days=n)
        write_plain(tmp_path / "heron" / f"{day}.nc", start=seconds(day) + 3600.0)
        write_plover(tmp_path / "plover" / f"{day}.nc", seconds(day) + 3610.0)
    return tmp_path


def write_plover(path: Path, start: float) -> Path:
    columns = plain_columns(start=start)
    height, _ = columns.pop("level")
    columns["height"] = (100.0 * height, {"units": "cm"})
    columns["tide"] = (np.full(40, 5.0), {"units": "mm"})
    columns["quality"] = (np.repeat(np.array([0, 1], np.int8), [35, 5]), {})
    return write(path, columns)


PLOVER = {
    "files": "plover/*.nc",
    "variables": {"sea_level_anomaly": "height"},
    "subtract": ["tide"],
    "good": {"variable": "quality", "values": [0]},
}


def gather(configuration: Configuration) -> dict[str, Any]:
    """Take the inventory and gather every block; return the receipts' days, set_aside under its own key."""
    days: dict[str, Any] = {"set_aside": []}
    for block in take_inventory(configuration, silent).observation_blocks:
        receipt = gather_observations(configuration, block, silent)
        days |= receipt["days"]
        days["set_aside"] = days["set_aside"] + receipt["set_aside"]
    return days


def day_marks(configuration: Configuration) -> dict[str, int]:
    folder = configuration.work / "observations"
    return {path.stem: path.stat().st_mtime_ns for path in folder.glob("*.nc")}


def rewritten(configuration: Configuration) -> set[str]:
    """Gather again, and return the days that were made."""
    before = day_marks(configuration)
    gather(configuration)
    after = day_marks(configuration)
    return {day for day in after if after[day] != before.get(day)}


def test_days_hold_both_altimeters_in_order(sea: Path, configure: Configure) -> None:
    configuration = configure(altimeters__plover=PLOVER)
    days = gather(configuration)
    assert sorted(set(days) - {"set_aside"}) == [str(FIRST + dt.timedelta(days=n)) for n in range(7)]
    data = DayStore(configuration.work / "observations").load(dt.date(2031, 3, 1))
    assert data.attrs["altimeters"] == "heron plover"
    assert data.sizes["observation"] == 40 + 35
    time, altimeter = data["time"].values, data["altimeter"].values
    assert np.all(np.lexsort((altimeter, time)) == np.arange(time.size))
    assert data["time"].attrs["units"] == "seconds since 1970-01-01 00:00:00"
    assert altimeter.dtype == np.int16
    assert data["pass_number"].dtype == np.int64
    expected = plain_columns()["level"][0]
    np.testing.assert_array_equal(data["sea_level_anomaly"].values[altimeter == 0], expected)
    np.testing.assert_allclose(data["sea_level_anomaly"].values[altimeter == 1], expected[:35] - 0.005)
    assert set(data["pass_number"].values[altimeter == 1]) == {seconds(dt.date(2031, 3, 1)) + 3610}


def test_receipts_add_up(sea: Path, configure: Configure) -> None:
    configuration = configure(altimeters__plover=PLOVER)
    days = gather(configuration)
    for day in set(days) - {"set_aside"}:
        receipt = days[day]
        assert receipt["in"] == 80
        assert receipt["in"] == receipt["kept"] + sum(receipt["dropped"].values())
        assert set(receipt["dropped"]) == set(REASONS)
        assert receipt["dropped"]["flagged"] == 5
        assert receipt["altimeters"]["heron"] == {"in": 40, "kept": 40, "dropped": {}, "noise": None}
        assert receipt["files"] == 2
    written = json.loads((configuration.work / "observations" / "2031-02-28.json").read_text())
    assert written["days"]["2031-03-01"] == days["2031-03-01"]
    assert (written["stage"], written["block"]) == ("observations", "2031-02-28")


def test_empty_day_is_a_sound_file(sea: Path, configure: Configure) -> None:
    (sea / "heron" / "2031-03-01.nc").unlink()
    configuration = configure()
    days = gather(configuration)
    assert days["2031-03-01"]["in"] == 0
    data = DayStore(configuration.work / "observations").load(dt.date(2031, 3, 1))
    assert data.sizes["observation"] == 0
    assert data["pass_number"].dtype == np.int64
    assert data["time"].dtype == np.float64


def test_nothing_changed_reads_nothing(sea: Path, configure: Configure, monkeypatch: pytest.MonkeyPatch) -> None:
    configuration = configure(altimeters__plover=PLOVER)
    first = gather(configuration)

    def refuse(*_: Any) -> None:
        raise AssertionError("read")

    for name in ("read_alongtrack", "file_digest", "land_mask"):
        monkeypatch.setattr(observations, name, refuse)
    before = day_marks(configuration)
    assert gather(configuration) == first
    assert day_marks(configuration) == before


def test_late_file_makes_its_own_day_again(sea: Path, configure: Configure) -> None:
    configuration = configure()
    gather(configuration)
    write_plain(sea / "heron" / "late.nc", start=seconds(dt.date(2031, 3, 2)) + 50000.0)
    assert rewritten(configuration) == {"2031-03-02"}
    assert rewritten(configuration) == set()


def test_only_what_matters_makes_days_again(sea: Path, configure: Configure) -> None:
    gather(configure())
    assert rewritten(configure(altimeters__heron__noise_m=0.07)) == set()
    assert rewritten(configure(altimeters__heron__files="heron/2*.nc")) == set()
    assert rewritten(configure(mapping__time_scale_days=9.0)) == set()
    assert len(rewritten(configure(editing={"largest_anomaly_m": 0.05}))) == 7


def test_changed_land_makes_days_again(sea: Path, configure: Configure) -> None:
    configuration = configure()
    kept = gather(configuration)["2031-03-01"]["kept"]
    write_land(sea / "land.nc", west_of=-28.3)
    days = gather(configuration)
    assert days["2031-03-01"]["kept"] < kept
    assert days["2031-03-01"]["dropped"]["land"] == kept - days["2031-03-01"]["kept"]


def test_changed_depth_makes_observation_days_again(sea: Path, configure: Configure) -> None:
    deep, bank = np.full((2, 2), 4000.0), np.full((2, 2), 20.0)
    write_depth(sea / "depth.nc", deep)
    configuration = configure(depth={"file": "depth.nc"})
    assert gather(configuration)["2031-03-01"]["dropped"]["shallow"] == 0
    assert rewritten(configuration) == set()
    write_depth(sea / "depth.nc", bank)
    assert len(rewritten(configuration)) == 7
    assert gather(configuration)["2031-03-01"]["dropped"]["shallow"] == 40
    assert len(rewritten(configure(depth={"file": "depth.nc"}, editing={"least_depth_m": 10}))) == 7
    assert gather(configuration)["2031-03-01"]["dropped"]["shallow"] == 40
    assert len(rewritten(configure())) == 7


def write_depth(path: Path, depth: np.ndarray) -> None:
    """Write depths on cells of 20 degrees round the sea."""
    with netCDF4.Dataset(path, "w") as file:
        for name, values, units in (("y", [0.0, 20.0], "degrees_north"), ("x", [-40.0, -20.0], "degrees_east")):
            file.createDimension(name, 2)
            file.createVariable(name, "f8", (name,)).units = units
            file[name][:] = values
        file.createVariable("floor", "f8", ("y", "x")).setncatts({"units": "m", "positive": "down"})
        file["floor"][:] = depth


def test_file_over_midnight_is_read_once_a_block(
    sea: Path, configure: Configure, monkeypatch: pytest.MonkeyPatch
) -> None:
    for path in (sea / "heron").iterdir():
        path.unlink()
    write_plain(sea / "heron" / "night.nc", start=seconds(dt.date(2031, 3, 1)) - 15.0)
    reads: list[Path] = []
    read = observations.read_alongtrack
    monkeypatch.setattr(observations, "read_alongtrack", lambda path, a: (reads.append(path), read(path, a))[1])
    configuration = configure()
    days = gather(configuration)
    assert (days["2031-02-28"]["in"], days["2031-03-01"]["in"]) == (15, 25)
    assert len(reads) == 1
    # midnight cuts the pass in two, named by their first seconds
    store = DayStore(configuration.work / "observations")
    numbers = [np.unique(store.load(dt.date.fromisoformat(d))["pass_number"]) for d in ("2031-02-28", "2031-03-01")]
    np.testing.assert_array_equal(numbers, [[seconds(dt.date(2031, 3, 1)) - 15], [seconds(dt.date(2031, 3, 1))]])


def test_overlapping_files_give_each_observation_once(sea: Path, configure: Configure) -> None:
    start = seconds(dt.date(2031, 3, 1)) + 3620.0
    columns = plain_columns(60, start - 20.0)
    write(sea / "heron" / "overlap.nc", {name: (values[20:], a) for name, (values, a) in columns.items()})
    day = gather(configure())["2031-03-01"]
    assert (day["in"], day["kept"], day["dropped"]["duplicate"]) == (80, 60, 20)


def test_observation_without_time_counts_on_the_first_day(sea: Path, configure: Configure) -> None:
    clock = seconds(dt.date(2031, 3, 1)) - 15.0 + np.arange(40.0)
    clock[30] = np.nan
    write_plain(sea / "heron" / "night.nc", clock=clock)
    days = gather(configure())
    assert days["2031-02-28"]["dropped"]["bad_time"] == 1
    assert days["2031-02-28"]["in"] + days["2031-03-01"]["in"] == 120
    assert days["2031-03-01"]["dropped"]["bad_time"] == 0


def test_file_that_fails_when_read_is_set_aside(sea: Path, configure: Configure) -> None:
    path = sea / "heron" / "2031-03-01.nc"
    with netCDF4.Dataset(path, "a") as file:
        file["level"].units = "kg"
    configuration = configure()
    days = gather(configuration)
    assert days["2031-03-01"]["kept"] == 0
    assert days["2031-03-02"]["kept"] == 40
    assert [entry["path"] for entry in days["set_aside"]] == [str(path)]
    assert "level has units 'kg'" in days["2031-03-01"]["set_aside"][0]["reason"]
    assert rewritten(configuration) == set()
    with netCDF4.Dataset(path, "a") as file:
        file["level"].units = "m"
    assert gather(configuration)["2031-03-01"]["kept"] == 40


def test_receipt_names_files_that_could_not_be_opened(sea: Path, configure: Configure) -> None:
    (sea / "heron" / "broken.nc").write_text("not NetCDF")
    configuration = configure()
    days = gather(configuration)
    assert {Path(entry["path"]).name for entry in days["set_aside"]} == {"broken.nc"}
    assert all("cannot be read" in entry["reason"] for entry in days["set_aside"])


def test_noise_is_estimated_and_compared(sea: Path, configure: Configure) -> None:
    rng = np.random.default_rng(3)
    for n in range(7):
        day = FIRST + dt.timedelta(days=n)
        level = 0.1 * np.sin(np.arange(150) / 20.0) + 0.02 * rng.standard_normal(150)
        north = 8.0 + 0.02 * np.arange(150)
        start = seconds(day) + 3600.0
        write_plain(sea / "heron" / f"{day}.nc", 150, start, level=level, y=north, x=np.full(150, -28.0))
    days = gather(configure())
    entry = days["2031-03-01"]["altimeters"]["heron"]["noise"]
    assert entry["differences"] == 147
    assert entry["standard_deviation_m"] == pytest.approx(0.02, rel=0.4)
    # the estimates of one block, of two days, within four of their standard errors
    for noise_m, warned in ((0.02, False), (0.05, True), (0.009, True)):
        told: list[str] = []
        configuration = configure(altimeters__heron__noise_m=noise_m)
        block = take_inventory(configuration, silent).observation_blocks[1]
        receipt = gather_observations(configuration, block, told.append)
        assert receipt["noise"]["heron"]["differences"] == 294
        assert receipt["noise"]["heron"]["standard_deviation_m"] == pytest.approx(0.02, rel=0.36)
        lines = [line for line in told if line.startswith("warning: altimeter heron: noise_m is")]
        assert len(lines) == warned


@pytest.mark.parametrize("name", ["land", "depth"])
def test_a_bad_grid_stops_the_job_and_sets_no_file_aside(sea: Path, configure: Configure, name: str) -> None:
    configuration = configure(depth={"file": "depth.nc"})
    write_depth(sea / "depth.nc", np.full((2, 2), 4000.0))
    (sea / f"{name}.nc").write_text("no grid")
    with pytest.raises(SetdriftError, match=rf"{name}\.nc: cannot be read"):
        gather(configuration)


def test_file_in_the_wrong_unit_is_set_aside(sea: Path, configure: Configure) -> None:
    path = sea / "heron" / "2031-03-01.nc"
    level = 0.1 * np.sin(np.arange(60) / 9.0)
    start = seconds(dt.date(2031, 3, 1)) + 3600.0
    write_plain(path, 60, start, level=1000.0 * level)
    told: list[str] = []
    configuration = configure()
    for block in take_inventory(configuration, silent).observation_blocks:
        gather_observations(configuration, block, told.append)
    assert sum("millimetres for metres" in line for line in told) == 1
    days = gather(configuration)
    assert days["2031-03-01"]["kept"] == 0
    assert "robust spread" in days["2031-03-01"]["set_aside"][0]["reason"]
    assert days["2031-03-02"]["kept"] == 40
    write_plain(path, 60, start, level=level)
    assert rewritten(configuration) == {"2031-03-01"}
    assert gather(configuration)["2031-03-01"]["kept"] == 60


@pytest.mark.parametrize("happening", ["changes", "vanishes"])
def test_file_that_changes_under_way_is_made_good_next_time(sea: Path, configure: Configure, happening: str) -> None:
    configuration = configure()
    blocks = take_inventory(configuration, silent).observation_blocks
    path = sea / "heron" / "2031-03-01.nc"
    if happening == "changes":
        write_plain(path, 30, start=seconds(dt.date(2031, 3, 1)))
    else:
        path.unlink()
    told: list[str] = []
    receipts = [gather_observations(configuration, block, told.append) for block in blocks]
    assert sum(len(receipt["set_aside"]) for receipt in receipts) == 1
    assert any("run the workflow again" in line for line in told)
    days = gather(configuration)
    assert days["2031-03-01"]["kept"] == (30 if happening == "changes" else 0)
    assert days["set_aside"] == []


def test_trouble_of_the_machine_is_not_taken_for_a_bad_file(
    sea: Path, configure: Configure, monkeypatch: pytest.MonkeyPatch
) -> None:
    configuration = configure()
    blocks = take_inventory(configuration, silent).observation_blocks

    def refuse(*_: Any) -> None:
        raise OSError(errno.EIO, "Input/output error")

    with monkeypatch.context() as patch:
        patch.setattr(observations, "file_digest", refuse)
        with pytest.raises(SetdriftError, match="Input/output error"):
            gather_observations(configuration, blocks[0], silent)
        patch.undo()
        patch.setattr(netCDF4, "Dataset", refuse)
        with pytest.raises(SetdriftError, match="Input/output error"):
            gather_observations(configuration, blocks[0], silent)
    assert gather(configuration)["2031-02-27"]["kept"] == 40


def test_result_depends_on_content_not_on_place(sea: Path, configure: Configure) -> None:
    first = gather(configure())
    (sea / "heron").rename(sea / "moved")
    moved = configure(altimeters__heron__files="moved/*.nc")
    assert rewritten(moved) == set()
    assert {d: first[d] for d in first} == gather(moved)


def test_same_input_gives_the_same_content(sea: Path, configure: Configure) -> None:
    first = gather(configure(altimeters__plover=PLOVER))
    again = gather(configure(altimeters__plover=PLOVER, output="elsewhere"))
    assert first == again
