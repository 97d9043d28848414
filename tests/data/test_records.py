"""Records are written whole or not at all."""

from __future__ import annotations

import datetime as dt
import stat
from pathlib import Path

import pytest

from setdrift.data.records import read_record, replacing, write_record, write_record_if_changed
from setdrift.errors import SetdriftError


def test_record_reads_back(tmp_path: Path) -> None:
    path = tmp_path / "deep" / "er" / "record.json"
    write_record(path, {"first": dt.date(2031, 3, 1), "é": [1, None]})
    assert read_record(path) == {"first": "2031-03-01", "é": [1, None]}
    assert path.read_text(encoding="utf-8").endswith("}\n")
    assert stat.S_IMODE(path.stat().st_mode) == 0o644


@pytest.mark.parametrize("error", [KeyboardInterrupt, OSError])
def test_interrupted_writing_leaves_what_was_there(tmp_path: Path, error: type[BaseException]) -> None:
    path = tmp_path / "record.json"
    write_record(path, 1)

    def interrupted() -> None:
        with replacing(path) as temporary:
            temporary.write_text("half")
            assert temporary.parent == path.parent
            assert temporary.name.startswith(".")
            raise error

    with pytest.raises(error):
        interrupted()
    assert read_record(path) == 1
    assert [p.name for p in tmp_path.iterdir()] == ["record.json"]


def test_reader_keeps_the_file_it_opened(tmp_path: Path) -> None:
    path = tmp_path / "record.json"
    write_record(path, "old")
    with path.open() as reader:
        write_record(path, "new")
        assert reader.read() == '"old"\n'
    assert read_record(path) == "new"


def test_unchanged_record_is_not_written(tmp_path: Path) -> None:
    path = tmp_path / "record.json"
    assert write_record_if_changed(path, {"a": 1})
    mark = path.stat().st_ino, path.stat().st_mtime_ns
    assert not write_record_if_changed(path, {"a": 1})
    assert (path.stat().st_ino, path.stat().st_mtime_ns) == mark
    assert write_record_if_changed(path, {"a": 2})
    assert read_record(path) == {"a": 2}


@pytest.mark.parametrize("content", [None, b"", b"{", b"\xff\xfe"])
def test_damaged_record_is_told(tmp_path: Path, content: bytes | None) -> None:
    path = tmp_path / "record.json"
    if content is not None:
        path.write_bytes(content)
    with pytest.raises(SetdriftError, match=r"record\.json: is missing or damaged; delete it and run the workflow ag"):
        read_record(path)
