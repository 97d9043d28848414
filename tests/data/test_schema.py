"""The schema that editors read says what the model checks."""

from __future__ import annotations

import copy
import json
import runpy
from pathlib import Path
from typing import Any

import jsonschema
import pytest
from small_analysis import SMALL_ANALYSIS

from setdrift.data.schema import PATH, configuration_schema
from setdrift.data.yaml_files import read_yaml

ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def validator() -> Any:
    schema = json.loads(configuration_schema())
    jsonschema.Draft202012Validator.check_schema(schema)
    return jsonschema.Draft202012Validator(schema)


def test_committed_schema_is_the_models() -> None:
    committed = (ROOT / PATH).read_text(encoding="utf-8")
    assert committed == configuration_schema(), "out of date: run `python -m setdrift.data.schema`, and commit the file"


def test_command_writes_it(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / PATH).parent.mkdir(parents=True)
    monkeypatch.chdir(tmp_path)
    monkeypatch.delitem(__import__("sys").modules, "setdrift.data.schema")
    runpy.run_module("setdrift.data.schema", run_name="__main__")
    assert (tmp_path / PATH).read_text() == configuration_schema()


@pytest.mark.parametrize("path", sorted((ROOT / "config").glob("*.yaml")), ids=lambda path: path.name)
def test_configurations_of_the_project_fit(path: Path, validator: Any) -> None:
    assert not list(validator.iter_errors(read_yaml(path)))


@pytest.mark.parametrize(
    ("key", "value"),
    [
        ("grid.spacing", 3),
        ("grid.spacing", "0.5 degrees"),
        ("grid.wset", 1),
        ("mapping.window_days", 2.5),
        ("altimeters.Heron", {"files": "x"}),
        ("altimeters", {}),
        ("publish.zarr_format", 4),
        ("block_days", 0),
        ("period.end", 5),
    ],
)
def test_what_the_model_refuses_the_schema_refuses(key: str, value: Any, validator: Any) -> None:
    content = copy.deepcopy(SMALL_ANALYSIS)
    assert not list(validator.iter_errors(content))
    *sections, last = key.split(".")
    section = content
    for part in sections:
        section = section.setdefault(part, {})
    section[last] = value
    assert len(list(validator.iter_errors(content))) == 1
