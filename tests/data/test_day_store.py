"""A stage's days: kept one by one, made again only when they must be."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr

from setdrift.data.day_store import DayStore, content_digest, refresh_days
from setdrift.errors import SetdriftError

DAY = dt.date(2031, 3, 1)
DAYS = [DAY + dt.timedelta(days=n) for n in range(3)]


def dataset(value: float = 1.0) -> xr.Dataset:
    return xr.Dataset({"height": ("x", np.array([value, np.nan])), "count": ("x", np.array([1, 2], np.int32))})


@pytest.fixture
def store(tmp_path: Path) -> DayStore:
    return DayStore(tmp_path / "maps")


def refresh(
    store: DayStore, made_from: Callable[[dt.date], str], value: float = 1.0
) -> tuple[dict[str, str], list[str]]:
    lines: list[str] = []
    return refresh_days(store, DAYS, made_from, lambda _: dataset(value), lines.append), lines


def test_day_reads_back_with_what_it_was_made_from(store: DayStore) -> None:
    content = store.save(DAY, dataset(), "source")
    assert store.path(DAY).name == "2031-03-01.nc"
    xr.testing.assert_equal(store.load(DAY), dataset())
    assert store.attribute(DAY, "made_from") == "source"
    assert store.attribute(DAY, "content") == content == content_digest(dataset())
    assert store.attribute(DAY, "colour") is None


def test_only_days_of_another_source_are_made(store: DayStore) -> None:
    contents, lines = refresh(store, str)
    assert lines == [f"{day} done" for day in DAYS]
    marks = [store.path(day).stat().st_ino for day in DAYS]
    again, lines = refresh(store, str, value=2.0)
    assert (again, lines) == (contents, [f"{day} unchanged" for day in DAYS])
    assert [store.path(day).stat().st_ino for day in DAYS] == marks
    changed, lines = refresh(store, lambda day: "other" if day == DAYS[1] else str(day), value=2.0)
    assert lines == [f"{DAYS[0]} unchanged", f"{DAYS[1]} done", f"{DAYS[2]} unchanged"]
    assert {day for day in contents if contents[day] != changed[day]} == {str(DAYS[1])}


def test_days_made_before_a_failure_are_kept(store: DayStore) -> None:
    def fail_on_the_second(day: dt.date) -> xr.Dataset:
        if day == DAYS[1]:
            raise OSError("disk full")
        return dataset()

    with pytest.raises(OSError, match="disk full"):
        refresh_days(store, DAYS, str, fail_on_the_second, lambda _: None)
    assert [path.name for path in store.folder.iterdir()] == ["2031-03-01.nc"]
    assert refresh(store, str)[1][0] == "2031-03-01 unchanged"


@pytest.mark.parametrize("damage", [None, b"", b"CDF\x01", b"\x89HDF\r\n\x1a\nrest", b"text"])
def test_damaged_day_is_told_and_made_again(store: DayStore, damage: bytes | None) -> None:
    contents, _ = refresh(store, str)
    store.path(DAY).unlink()
    if damage is not None:
        store.path(DAY).write_bytes(damage)
    assert store.attribute(DAY, "made_from") is None
    with pytest.raises(SetdriftError, match=r"2031-03-01\.nc: is missing or damaged; delete the \.json receipts in"):
        store.load(DAY)
    again, lines = refresh(store, str)
    assert lines[0] == "2031-03-01 done"
    assert again == contents


def test_day_damaged_in_the_middle_is_told(store: DayStore) -> None:
    large = xr.Dataset({"height": ("x", np.random.default_rng(1).normal(size=50_000))})
    for k in range(20):
        large[f"more_{k}"] = ("x", np.arange(50_000.0))
    store.save(DAY, large, "source")
    whole = store.path(DAY).read_bytes()
    told = 0
    for start in range(0, len(whole), len(whole) // 40):
        store.path(DAY).write_bytes(whole[:start] + b"\xa5" * 4096 + whole[start + 4096 :])
        assert store.attribute(DAY, "made_from") in {"source", None}
        try:
            store.load(DAY)
        except SetdriftError:
            told += 1
    # values alone carry no checksum; whatever breaks the file's structure must not end in another error
    assert told > 0


def test_content_digest_counts_what_matters() -> None:
    digest = content_digest(dataset())
    assert content_digest(dataset(2.0)) != digest
    assert content_digest(dataset().rename(height="depth")) != digest
    assert content_digest(dataset().rename(x="y")) != digest
    assert content_digest(dataset().assign_attrs(altimeters="heron")) != digest
    assert content_digest(dataset().astype(np.float32)) != digest
    assert content_digest(dataset()[["count", "height"]]) == digest
    assert content_digest(dataset().assign_attrs(receipt="{}")) == digest


def test_empty_day_keeps_its_types(store: DayStore) -> None:
    empty = xr.Dataset({"time": ("n", np.empty(0)), "number": ("n", np.empty(0, np.int64))})
    store.save(DAY, empty, "source")
    loaded = store.load(DAY)
    assert loaded.sizes["n"] == 0
    assert (loaded["time"].dtype, loaded["number"].dtype) == (np.float64, np.int64)
    with netCDF4.Dataset(store.path(DAY)) as file:
        assert file.getncattr("made_from") == "source"
