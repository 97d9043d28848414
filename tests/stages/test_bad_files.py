"""A bad file has the verdict it deserves, and changes no observation of the good file beside it."""

from __future__ import annotations

from pathlib import Path

import bad_files
import pytest


@pytest.fixture(scope="module")
def alone(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    observations = bad_files.without_any(tmp_path_factory.mktemp("alone"))
    # six columns of 40 observations, one of them of two bytes
    assert len(observations) == 40 * (5 * 8 + 2)
    return observations


@pytest.mark.parametrize("kind", bad_files.BAD)
def test_verdict_and_unchanged_neighbour(kind: str, alone: bytes, tmp_path: Path) -> None:
    row = bad_files.judged(kind, tmp_path)
    assert row.good == alone
    assert "\n" not in row.reason
    if row.verdict == "skipped":
        pytest.skip(row.reason)
    if (expected := bad_files.BAD[kind].verdict) is not None:
        assert (row.verdict, bool(row.reason)) == (expected, True)


def test_a_wrong_verdict_fails_the_table(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    kinds = {"empty": bad_files.BAD["empty"], "text": bad_files.Bad(Path.touch, "read")}
    monkeypatch.setattr(bad_files, "BAD", kinds)
    assert bad_files.main() == 1
    lines = capsys.readouterr().out.splitlines()
    assert [line.endswith("<- WRONG") for line in lines] == [False, False, True]
