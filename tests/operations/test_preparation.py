"""Compiling ahead."""

from __future__ import annotations

import importlib
import re
import time
from pathlib import Path

import pytest

import setdrift.numerics
from setdrift.operations.preparation import compile_kernels


def test_every_numerics_module_is_imported(monkeypatch: pytest.MonkeyPatch) -> None:
    imported: list[str] = []
    monkeypatch.setattr(importlib, "import_module", imported.append)
    compile_kernels(lambda _: None)
    files = {path.stem for path in Path(setdrift.numerics.__path__[0]).glob("*.py")} - {"__init__"}
    assert {name.removeprefix("setdrift.numerics.") for name in imported} == files


def test_only_what_took_noticeable_time_is_told(monkeypatch: pytest.MonkeyPatch) -> None:
    now = 0.0

    def ticking() -> float:
        return now

    def importing(name: str) -> None:
        nonlocal now
        now += 2.0 if name.endswith(".passes") else 0.1

    monkeypatch.setattr(importlib, "import_module", importing)
    monkeypatch.setattr(time, "monotonic", ticking)
    lines: list[str] = []
    compile_kernels(lines.append)
    assert len(lines) == 1
    assert re.fullmatch(r"  setdrift\.numerics\.passes ready after 2\.0 s", lines[0])
