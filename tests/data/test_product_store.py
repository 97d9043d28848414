"""Putting stores in place: whatever moment a reader comes, or the writer dies, the days are whole."""

from __future__ import annotations

import contextlib
import ctypes
import datetime as dt
import multiprocessing
import os
import shutil
import stat
import time
from collections.abc import Callable, Iterator
from multiprocessing.connection import Connection
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from setdrift.data import product_store
from setdrift.data.configuration import Configuration, load_configuration
from setdrift.data.conventions import DAILY_VARIABLES
from setdrift.data.daily_product import DailyProduct
from setdrift.data.days import days_between
from setdrift.data.grids import analysis_grid
from setdrift.data.product_store import commit_objects, is_chunk, replace_store
from setdrift.errors import SetdriftError

NOW = dt.datetime(2031, 3, 21, 6, 0, tzinfo=dt.UTC)
DAYS = days_between(dt.date(2031, 3, 1), dt.date(2031, 3, 3))
FIELDS = [variable.name for variable in DAILY_VARIABLES if variable.stage != "fixed"]
replacing = product_store.replacing


def value(day: dt.date, version: int) -> int:
    """Return the number that fills all fields of a day, so that any mixture or hole shows."""
    return day.day + 10 * version


def product(configuration: Configuration, versions: dict[dt.date, int]) -> DailyProduct:
    shape = analysis_grid(configuration).shape
    fixed = {name: np.full(shape, 0.5) for name in ("mean_dynamic_topography", "land_fraction")}
    return DailyProduct(
        configuration, fixed, lambda day: {name: np.full(shape, value(day, versions[day])) for name in FIELDS}, NOW
    )


def publish(configuration: Configuration, versions: dict[dt.date, int]) -> dict[str, list[dt.date]]:
    sources = {day: f"{day} {version}" for day, version in versions.items()}
    return product(configuration, versions).publish(sources)


def seen(store: Path) -> tuple[list[int], dict[str, list[set[int]]]]:
    """Open the store as anybody would, and return each day's revision and the values of each field."""
    with xr.open_zarr(store, chunks=None) as opened:
        data = opened.load()
    assert not any(np.isnan(data[name].values).any() for name in FIELDS)
    assert [str(t)[:10] for t in data.time.values] == [str(day) for day in DAYS[: data.sizes["time"]]]
    return data.revision.values.tolist(), {
        name: [set(np.unique(day).tolist()) for day in data[name].values] for name in FIELDS
    }


def whole(versions: dict[dt.date, int]) -> dict[str, list[set[int]]]:
    return {name: [{value(day, version)} for day, version in versions.items()] for name in FIELDS}


@contextlib.contextmanager
def every_step(store: Path, folder: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[list[Path]]:
    """Keep the store as it is after each object that is put in place."""
    steps: list[Path] = []

    @contextlib.contextmanager
    def noting(path: Path) -> Iterator[Path]:
        with replacing(path) as temporary:
            yield temporary
        steps.append(folder / f"{len(steps):03d}")
        # objects are replaced, never changed, so links keep what they were
        shutil.copytree(store, steps[-1], copy_function=os.link)

    monkeypatch.setattr(product_store, "replacing", noting)
    yield steps
    monkeypatch.undo()


@pytest.fixture(params=[3, 2])
def configuration(request: pytest.FixtureRequest, configure: Callable[..., Configuration]) -> Configuration:
    return configure(publish__zarr_format=request.param)


def put_back(step: Path, store: Path) -> None:
    shutil.rmtree(store)
    shutil.copytree(step, store)


def test_added_day_appears_whole_at_the_last_object(
    configuration: Configuration, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    store = configuration.products / "daily.zarr"
    before, after = dict.fromkeys(DAYS[:2], 0), dict.fromkeys(DAYS, 0)
    publish(configuration, before)
    with every_step(store, tmp_path / "steps", monkeypatch) as steps:
        publish(configuration, after)
    assert len(steps) > 2 * len(FIELDS)
    for step in steps[:-1]:
        assert seen(step) == ([0, 0], whole(before))
    assert seen(steps[-1]) == ([0, 0, 0], whole(after))
    for step in steps[len(steps) // 3 :: len(steps) // 3]:
        put_back(step, store)
        publish(configuration, after)
        assert seen(store) == ([0, 0, 0], whole(after))


def test_rewritten_day_is_whole_whenever_its_revision_is_even(
    configuration: Configuration, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    store = configuration.products / "daily.zarr"
    before = dict.fromkeys(DAYS[:2], 0)
    after = {DAYS[0]: 0, DAYS[1]: 1, DAYS[2]: 0}
    publish(configuration, before)
    with every_step(store, tmp_path / "steps", monkeypatch) as steps:
        assert publish(configuration, after) == {"added": [DAYS[2]], "rewritten": [DAYS[1]], "retired": []}
    mixed = 0
    for step in steps[:-1]:
        revisions, values = seen(step)
        assert revisions in ([0, 1], [0, 1, 0])
        assert all(days[0] == {value(DAYS[0], 0)} for days in values.values())
        assert all(days[1] <= {value(DAYS[1], 0), value(DAYS[1], 1)} for days in values.values())
        assert all(days[2:] in ([], [{value(DAYS[2], 0)}]) for days in values.values())
        mixed += len({frozenset(days[1]) for days in values.values()}) > 1
    assert mixed > len(FIELDS)
    assert seen(steps[-1]) == ([0, 2, 0], whole(after))


@pytest.mark.parametrize("wanted", ["the new", "the old again"])
def test_interrupted_rewriting_is_mended_whatever_comes_next(
    configuration: Configuration, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, wanted: str
) -> None:
    store = configuration.products / "daily.zarr"
    old, new = dict.fromkeys(DAYS, 0), {DAYS[0]: 0, DAYS[1]: 1, DAYS[2]: 0}
    publish(configuration, old)
    with every_step(store, tmp_path / "steps", monkeypatch) as steps:
        publish(configuration, new)
    versions = new if wanted == "the new" else old
    chunks = len(FIELDS)
    # after the mark, amid the fields, after the last of them, and after the metadata
    for number in (0, chunks // 2, chunks, len(steps) - 2):
        put_back(steps[number], store)
        assert publish(configuration, versions)["rewritten"] == [DAYS[1]]
        revisions, values = seen(store)
        assert values == whole(versions)
        assert revisions == [0, 2, 0]
        assert publish(configuration, versions)["rewritten"] == []


def test_failure_at_any_object_leaves_no_temporary_file(
    configuration: Configuration, monkeypatch: pytest.MonkeyPatch
) -> None:
    store = configuration.products / "daily.zarr"
    publish(configuration, dict.fromkeys(DAYS[:2], 0))

    class DeadError(Exception):
        pass

    before = store.with_name("before")
    shutil.copytree(store, before)
    for survived in (0, 1, 7, 20):
        put_back(before, store)
        left = iter(range(survived))

        @contextlib.contextmanager
        def dying(path: Path, left: Iterator[int] = left) -> Iterator[Path]:
            with replacing(path) as temporary:
                yield temporary
                if next(left, None) is None:
                    raise DeadError

        monkeypatch.setattr(product_store, "replacing", dying)
        with pytest.raises(DeadError):
            publish(configuration, dict.fromkeys(DAYS, 0))
        monkeypatch.undo()
        assert not list(store.rglob("*.part"))
        assert seen(store) == ([0, 0], whole(dict.fromkeys(DAYS[:2], 0)))


def publish_and_hang(config: Path, half_done: Connection) -> None:
    """Publish a third day, and wait for ever amid an object."""

    @contextlib.contextmanager
    def hanging(path: Path) -> Iterator[Path]:
        with replacing(path) as temporary:
            yield temporary
            half_done.send(temporary.name)
            time.sleep(600)

    product_store.replacing = hanging  # type: ignore[assignment]
    publish(load_configuration(config), dict.fromkeys(DAYS, 0))


def test_killed_publisher_leaves_nothing_for_good(configure: Callable[..., Configuration]) -> None:
    configuration = configure()
    store = configuration.products / "daily.zarr"
    publish(configuration, dict.fromkeys(DAYS[:2], 0))
    context = multiprocessing.get_context("spawn")
    here, there = context.Pipe(duplex=False)
    publisher = context.Process(target=publish_and_hang, args=(configuration.path, there), daemon=True)
    publisher.start()
    there.close()
    left = here.recv()
    publisher.kill()
    publisher.join()
    publisher.close()
    here.close()
    assert [path.name for path in store.rglob(".*.part")] == [left]
    assert seen(store) == ([0, 0], whole(dict.fromkeys(DAYS[:2], 0)))
    publish(configuration, dict.fromkeys(DAYS, 0))
    assert not list(store.rglob(".*.part"))
    assert seen(store) == ([0, 0, 0], whole(dict.fromkeys(DAYS, 0)))


def test_failure_while_a_store_is_built_leaves_the_old_one(
    configuration: Configuration, monkeypatch: pytest.MonkeyPatch
) -> None:
    store = configuration.products / "daily.zarr"
    publish(configuration, dict.fromkeys(DAYS, 0))

    def fail(*_: Any) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(product_store, "_exchange", fail)
    with pytest.raises(KeyboardInterrupt):
        publish(configuration, dict.fromkeys(DAYS[:2], 0))
    monkeypatch.undo()
    assert seen(store) == ([0, 0, 0], whole(dict.fromkeys(DAYS, 0)))
    publish(configuration, dict.fromkeys(DAYS[:2], 0))
    assert seen(store) == ([0, 0], whole(dict.fromkeys(DAYS[:2], 0)))
    assert [path.name for path in configuration.products.iterdir()] == ["daily.zarr"]


def test_attributes_follow_the_configuration(configure: Callable[..., Configuration]) -> None:
    publish(configure(), dict.fromkeys(DAYS, 0))
    configuration = configure(publish={"licence": "as you like"})
    assert publish(configuration, dict.fromkeys(DAYS, 0)) == {"added": [], "rewritten": [], "retired": []}
    with xr.open_zarr(configuration.products / "daily.zarr") as data:
        assert data.attrs["license"] == "as you like"
    assert seen(configuration.products / "daily.zarr")[0] == [0, 0, 0]


ROWS_OF_OBJECTS = [
    ("height/c/0/0/0", "time/c/0"),
    ("height/zarr.json",),
    ("time/zarr.json",),
    ("zarr.json",),
]
OBJECTS_OF_FORMAT_2 = [
    ("height/0.0.0", "time/0"),
    ("height/.zarray", "height/.zattrs"),
    ("time/.zarray", "time/.zattrs"),
    (".zattrs", ".zgroup"),
    (".zmetadata",),
]


@pytest.mark.parametrize("ranks", [ROWS_OF_OBJECTS, OBJECTS_OF_FORMAT_2])
def test_order_is_chunks_arrays_time_root(
    ranks: list[tuple[str, ...]], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    order: list[str] = []

    @contextlib.contextmanager
    def noting(path: Path) -> Iterator[Path]:
        with replacing(path) as temporary:
            yield temporary
        order.append(path.relative_to(tmp_path).as_posix())

    monkeypatch.setattr(product_store, "replacing", noting)
    keys = [key for rank in ranks for key in rank]
    assert commit_objects(tmp_path, {key: key.encode() for key in reversed(keys)}) == len(keys)
    assert order == keys
    assert {key for key in keys if is_chunk(key)} == set(ranks[0])


def test_what_is_in_place_is_left_alone(tmp_path: Path) -> None:
    commit_objects(tmp_path, {"a/c/0": b"1", "zarr.json": b"{}"})
    mark = (tmp_path / "a/c/0").stat().st_ino
    assert commit_objects(tmp_path, {"a/c/0": b"1", "zarr.json": b"{ }"}) == 1
    assert (tmp_path / "a/c/0").stat().st_ino == mark
    assert (tmp_path / "zarr.json").read_bytes() == b"{ }"


def test_everybody_may_read(tmp_path: Path) -> None:
    before = os.umask(0o022)
    try:
        replace_store(tmp_path / "s.zarr", {"a/c/0": b"1", "zarr.json": b"{}"})
    finally:
        os.umask(before)
    for path in [tmp_path / "s.zarr", *(tmp_path / "s.zarr").rglob("*")]:
        assert stat.S_IMODE(path.stat().st_mode) == (0o755 if path.is_dir() else 0o644)


def test_exchange_takes_away_what_the_new_store_lacks(tmp_path: Path) -> None:
    store = tmp_path / "s.zarr"
    replace_store(store, {"a/c/0": b"1", "b/c/0": b"1", "zarr.json": b"{}"})
    (tmp_path / ".s.zarr.new").mkdir()
    (tmp_path / ".s.zarr.new" / "left by a dead writer").touch()
    with (store / "a/c/0").open("rb") as reader:
        replace_store(store, {"a/c/0": b"2", "zarr.json": b"{}"})
        assert reader.read() == b"1"
    assert sorted(p.relative_to(tmp_path).as_posix() for p in tmp_path.rglob("*") if p.is_file()) == [
        "s.zarr/a/c/0",
        "s.zarr/zarr.json",
    ]
    assert (store / "a/c/0").read_bytes() == b"2"


def test_file_system_without_exchange_is_told(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    store = tmp_path / "s.zarr"
    replace_store(store, {"zarr.json": b"1"})

    class Library:
        @staticmethod
        def renameat2(*_: Any) -> int:
            ctypes.set_errno(22)
            return -1

    monkeypatch.setattr(ctypes, "CDLL", lambda *_, **__: Library)
    with pytest.raises(SetdriftError, match=r"s\.zarr: cannot be exchanged in one step \(Invalid argument\); put `out"):
        replace_store(store, {"zarr.json": b"2"})
    assert (store / "zarr.json").read_bytes() == b"1"
