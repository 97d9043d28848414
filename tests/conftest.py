"""Rules and fixtures shared by all tests."""

from __future__ import annotations

import copy
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
import yaml
from small_analysis import SMALL_ANALYSIS

from setdrift.data.configuration import Configuration, load_configuration


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Refuse a check in tests/published/ that does not name its source."""
    for item in items:
        if "published" in item.path.parts and item.get_closest_marker("source") is None:
            raise pytest.UsageError(f"{item.nodeid}: add @pytest.mark.source('paper, equation')")


@pytest.fixture
def configure(tmp_path: Path) -> Callable[..., Configuration]:
    """Return a function that makes a configuration in a temporary folder, some keys changed."""

    def make(**changes: Any) -> Configuration:
        content = yaml.safe_load(yaml.safe_dump(SMALL_ANALYSIS))
        for key, value in changes.items():
            section, _, last = key.rpartition("__")
            target = content
            for part in section.split("__") if section else []:
                target = target.setdefault(part, {})
            target[last] = value
        path = tmp_path / "small_sea.yaml"
        path.write_text(yaml.safe_dump(content))
        return load_configuration(path)

    return make


@pytest.fixture(scope="session")
def finished_sea(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give a folder with a small sea and its whole analysis, made once; use `analysed_sea` for a copy to change."""
    from tiny_analysis import BOX, run_chain, write_sea  # noqa: PLC0415 - costs seconds that few tests need

    folder = tmp_path_factory.mktemp("finished_sea")
    write_sea(folder)
    path = folder / "small_sea.yaml"
    path.write_text(yaml.safe_dump(SMALL_ANALYSIS | copy.deepcopy(BOX)))
    run_chain(load_configuration(path))
    return folder


@pytest.fixture
def analysed_sea(finished_sea: Path, tmp_path: Path) -> Path:
    """Give a copy of the small sea and its analysis, in the folder that `configure` uses."""
    shutil.copytree(finished_sea, tmp_path, dirs_exist_ok=True)
    return tmp_path
