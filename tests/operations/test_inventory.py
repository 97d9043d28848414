"""The inventory: which files there are and what their change touches."""

from __future__ import annotations

import datetime as dt
import errno
import json
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr
from altimeter_files import seconds, write_land, write_mean, write_plain

from setdrift.data.configuration import Configuration
from setdrift.errors import SetdriftError
from setdrift.operations import inventory
from setdrift.operations.inventory import matching_files, take_inventory

Configure = Callable[..., Configuration]


def silent(_: str) -> None:
    """Tell nobody."""


@pytest.fixture
def sea(tmp_path: Path) -> Path:
    """Give a folder with fixed files, and heron's from 27 February to 4 March 2031."""
    write_land(tmp_path / "land.nc")
    write_mean(tmp_path / "mean.nc")
    for n in range(6):
        day = dt.date(2031, 2, 27) + dt.timedelta(days=n)
        write_plain(tmp_path / "heron" / f"{day}.nc", start=seconds(day) + 3600.0)
    return tmp_path


def manifests(configuration: Configuration) -> dict[str, Any]:
    folder = configuration.work / "manifests"
    return {path.stem: json.loads(path.read_text()) for path in folder.glob("*.json")}


def marks(configuration: Configuration) -> dict[str, tuple[int, bytes]]:
    folder = configuration.work / "manifests"
    return {path.name: (path.stat().st_mtime_ns, path.read_bytes()) for path in folder.glob("*.json")}


def test_days_blocks_and_manifests(sea: Path, configure: Configure) -> None:
    configuration = configure()
    taken = take_inventory(configuration, silent)
    assert taken.days == [dt.date(2031, 3, d) for d in (1, 2, 3)]
    first = [str(block.first) for block in taken.observation_blocks]
    assert first == ["2031-02-26", "2031-02-28", "2031-03-02", "2031-03-04"]
    assert [str(block.first) for block in taken.analysis_blocks] == ["2031-02-28", "2031-03-02"]
    assert taken.counts == {"used": 6, "examined": 8, "set_aside": 0, "repeated": 0}
    found = manifests(configuration)
    assert set(found) == {*first, "fixed", "set_aside", "period"}
    # the window reaches back to 27 February and on to 5 March
    assert found["2031-02-26"]["first_day"] == "2031-02-27"
    assert found["2031-03-04"]["last_day"] == "2031-03-05"
    assert [Path(f["path"]).name for f in found["2031-02-28"]["files"]] == ["2031-02-28.nc", "2031-03-01.nc"]
    assert found["period"] == {"first": "2031-03-01", "last": "2031-03-03"}
    assert {name for name, seen in found["fixed"].items() if seen} == {"land", "mean_dynamic_topography"}


def test_touching_a_file_changes_no_manifest(sea: Path, configure: Configure) -> None:
    configuration = configure()
    take_inventory(configuration, silent)
    before = marks(configuration)
    for path in [*(sea / "heron").iterdir(), sea / "land.nc"]:
        os.utime(path, (2e9, 2e9))
    assert take_inventory(configuration, silent).counts["examined"] == 7
    assert marks(configuration) == before


def test_unchanged_files_are_not_opened(sea: Path, configure: Configure, monkeypatch: pytest.MonkeyPatch) -> None:
    configuration = configure()
    (sea / "heron" / "bad.nc").write_text("no")
    expected = take_inventory(configuration, silent)
    before = marks(configuration)

    def refuse(*_: Any) -> None:
        raise AssertionError("opened")

    monkeypatch.setattr(inventory, "file_digest", refuse)
    monkeypatch.setattr(inventory, "read_time_span", refuse)
    again = take_inventory(configuration, silent)
    assert again.counts == expected.counts | {"examined": 0}
    assert again.set_aside == expected.set_aside
    assert marks(configuration) == before


def test_late_file_changes_only_its_blocks(sea: Path, configure: Configure) -> None:
    configuration = configure()
    take_inventory(configuration, silent)
    before = marks(configuration)
    write_plain(sea / "heron" / "late.nc", start=seconds(dt.date(2031, 3, 2)) + 50000.0)
    assert take_inventory(configuration, silent).counts["examined"] == 1
    after = marks(configuration)
    assert {name for name in after if after[name] != before[name]} == {"2031-03-02.json"}


def test_changed_file_of_the_same_size_is_seen(sea: Path, configure: Configure) -> None:
    configuration = configure()
    take_inventory(configuration, silent)
    before = manifests(configuration)
    path = sea / "heron" / "2031-03-01.nc"
    content = bytearray(path.read_bytes())
    content[-1] ^= 1
    path.write_bytes(content)
    os.utime(path, (2e9, 2e9))
    take_inventory(configuration, silent)
    assert manifests(configuration)["2031-02-28"] != before["2031-02-28"]


def test_unreadable_files_are_set_aside_once(sea: Path, configure: Configure) -> None:
    write_plain(sea / "heron" / "no_time.nc", clock=np.full(40, np.nan))
    (sea / "heron" / "empty.nc").touch()
    (sea / "heron" / "folder.nc").mkdir()
    write_plain(sea / "heron" / ".hidden.nc")
    os.mkfifo(sea / "heron" / "pipe.nc")
    told: list[str] = []
    configuration = configure()
    taken = take_inventory(configuration, told.append)
    assert [Path(entry["path"]).name for entry in taken.set_aside] == ["empty.nc", "no_time.nc"]
    assert "no time that can be believed" in taken.set_aside[1]["reason"]
    assert manifests(configuration)["set_aside"] == taken.set_aside
    assert taken.counts["used"] == 6
    assert sum("empty.nc" in line for line in told) == 1
    # mended, it is used
    write_plain(sea / "heron" / "empty.nc", start=seconds(dt.date(2031, 3, 3)))
    assert len(take_inventory(configuration, silent).set_aside) == 1


def test_repeated_content_counts_once(sea: Path, configure: Configure) -> None:
    (sea / "heron" / "copy.nc").write_bytes((sea / "heron" / "2031-03-01.nc").read_bytes())
    configuration = configure()
    assert take_inventory(configuration, silent).counts["repeated"] == 1
    names = [Path(f["path"]).name for f in manifests(configuration)["2031-02-28"]["files"]]
    assert names == ["2031-02-28.nc", "2031-03-01.nc"]


def test_file_over_several_days_is_in_all_their_blocks(sea: Path, configure: Configure) -> None:
    clock = seconds(dt.date(2031, 2, 20)) + np.linspace(0, 11 * 86400.0, 40)
    write_plain(sea / "heron" / "long.nc", clock=clock)
    configuration = configure()
    take_inventory(configuration, silent)
    holding = [name for name, m in manifests(configuration).items() if "long.nc" in json.dumps(m)]
    assert sorted(holding) == ["2031-02-26", "2031-02-28", "2031-03-02"]


def test_latest_is_the_newest_day_with_observations(sea: Path, configure: Configure) -> None:
    configuration = configure(period__end="latest")
    assert take_inventory(configuration, silent).days[-1] == dt.date(2031, 3, 4)
    clock = seconds(dt.date(2031, 3, 6)) + np.arange(40.0)
    clock[3] = 5e9  # a stray time makes no newest day
    write_plain(sea / "heron" / "new.nc", clock=clock)
    assert take_inventory(configuration, silent).days[-1] == dt.date(2031, 3, 6)
    assert manifests(configuration)["period"]["last"] == "2031-03-06"


def test_latest_before_the_start_is_told(sea: Path, configure: Configure) -> None:
    with pytest.raises(SetdriftError, match="newest observations are of 2031-03-04"):
        take_inventory(configure(period={"start": "2031-05-01", "end": "latest"}), silent)


def test_latest_without_any_sound_file_is_told(sea: Path, configure: Configure) -> None:
    for path in (sea / "heron").iterdir():
        path.write_text("no")
    with pytest.raises(SetdriftError, match="no file could be read"):
        take_inventory(configure(period__end="latest"), silent)


def test_no_file_at_all_names_the_pattern(sea: Path, configure: Configure) -> None:
    with pytest.raises(SetdriftError, match=r"altimeters: no file matches .*/nowhere/\*\*/\*\.nc"):
        take_inventory(configure(altimeters__heron__files="nowhere/**/*.nc"), silent)


def test_one_altimeter_without_files_is_a_warning(sea: Path, configure: Configure) -> None:
    told: list[str] = []
    taken = take_inventory(configure(altimeters__plover={"files": "plover/*.nc"}), told.append)
    assert taken.counts["used"] == 6
    assert any(line.startswith("warning: altimeter plover") for line in told)


@pytest.mark.parametrize("name", ["land", "mean", "depth"])
def test_missing_fixed_file_is_named(sea: Path, configure: Configure, name: str) -> None:
    (sea / f"{name}.nc").unlink(missing_ok=True)
    with pytest.raises(SetdriftError, match=rf"{name}.*\.file: .*{name}\.nc cannot be read"):
        take_inventory(configure(**{"depth": {"file": "depth.nc"}} if name == "depth" else {}), silent)


def test_changed_reading_of_an_altimeter_looks_again(sea: Path, configure: Configure) -> None:
    take_inventory(configure(), silent)
    assert take_inventory(configure(altimeters__heron__noise_m=0.05), silent).counts["examined"] == 0
    mapped = configure(altimeters__heron__variables={"time": "nothing"})
    assert len(take_inventory(mapped, silent).set_aside) == 6


def test_damaged_memory_is_made_again(sea: Path, configure: Configure) -> None:
    configuration = configure()
    take_inventory(configuration, silent)
    before = marks(configuration)
    for damage in ("{", "[]", '{"a": 3}'):
        (configuration.work / "inventory.json").write_text(damage)
        assert take_inventory(configuration, silent).counts["examined"] == 8
        assert marks(configuration) == before


@pytest.mark.parametrize("name", ["file_digest", "read_time_span"])
def test_trouble_of_the_machine_is_not_remembered(
    sea: Path, configure: Configure, monkeypatch: pytest.MonkeyPatch, name: str
) -> None:
    def refuse(path: Path, *_: Any) -> None:
        trouble = OSError(errno.EIO, "Input/output error")
        if name == "file_digest":
            raise trouble
        raise SetdriftError(str(path), "cannot be read (Input/output error)", "replace it") from trouble

    configuration = configure(land=None)
    with monkeypatch.context() as patch:
        patch.setattr(inventory, name, refuse)
        patch.setattr(inventory, "_fixed_digests", lambda *_: {})
        taken = take_inventory(configuration, silent)
    assert len(taken.set_aside) == 6
    assert "Input/output error" in taken.set_aside[0]["reason"]
    assert take_inventory(configuration, silent).set_aside == []


def test_folders_below_and_brackets_in_names(sea: Path, configure: Configure) -> None:
    deep = sea / "odd [1]" / "2031" / "03"
    write_plain(deep / "a.nc", start=seconds(dt.date(2031, 3, 1)))
    taken = take_inventory(configure(altimeters__heron__files="odd [[]1]/**/*.nc"), silent)
    assert taken.counts["used"] == 1


@pytest.mark.parametrize("pattern", ["heron/*", "heron/**/*", "heron/*.zarr"])
def test_zarr_stores_are_files_and_their_objects_are_none(sea: Path, configure: Configure, pattern: str) -> None:
    whole = (sea / "heron" / "2031-03-02.nc").rename(sea / "whole.nc")
    with xr.open_dataset(whole, decode_cf=False) as data:
        data.to_zarr(sea / "heron" / "a.zarr", zarr_format=3, consolidated=False)
        data.to_zarr(sea / "heron" / "a.folder", zarr_format=3, consolidated=False)
    configuration = configure(altimeters__heron__files=pattern)
    files = matching_files(configuration, configuration.altimeters["heron"])
    names = [path.name for path in files if "a.folder" not in path.parts]
    assert names == sorted([path.name for path in (sea / "heron").glob("*.nc") if pattern[-1] == "*"] + ["a.zarr"])
    assert sea / "heron" / "a.folder" not in files


def test_a_changed_object_makes_a_store_new(sea: Path, configure: Configure) -> None:
    with xr.open_dataset(sea / "heron" / "2031-03-02.nc", decode_cf=False) as data:
        data.to_zarr(sea / "heron" / "a.zarr", zarr_format=3, consolidated=False)
    configuration = configure(altimeters__heron__files="heron/*.zarr")
    assert take_inventory(configuration, silent).counts["used"] == 1
    assert take_inventory(configuration, silent).counts["examined"] == 0
    before = marks(configuration)
    os.utime(sea / "heron" / "a.zarr" / "level" / "c" / "0", (2e9, 2e9))
    assert take_inventory(configuration, silent).counts["examined"] == 1
    assert marks(configuration) == before
    (sea / "heron" / "a.zarr" / "note").write_text("more")
    assert take_inventory(configuration, silent).counts["examined"] == 1
    assert marks(configuration) != before
