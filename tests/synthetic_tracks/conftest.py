from __future__ import annotations

from datetime import date
from pathlib import Path

import pytest
import yaml

from synthetic_tracks import ocean, scenario

DAY = date(2031, 3, 5)


@pytest.fixture(scope="session")
def tiny_file(tmp_path_factory) -> Path:
    """The packaged scenario made small: three days of observations, few eddies, a coarse truth."""
    values = yaml.safe_load(scenario.PACKAGED.read_text())
    values["period"] = {"start": DAY, "end": DAY}
    values["margin_days"] = 1
    values["truth"]["spacing"] = 0.5
    values["eddies"]["count"] = 150
    values["altimeters"]["curlew"]["missing_days"] = [date(2031, 3, 4)]
    values["altimeters"]["dunlin"]["cut_short"] = [date(2031, 3, 6)]
    path = tmp_path_factory.mktemp("scenario") / "tiny.yaml"
    path.write_text(yaml.safe_dump(values, sort_keys=False))
    return path


@pytest.fixture(scope="session")
def tiny(tiny_file) -> scenario.Scenario:
    return scenario.load(tiny_file)


@pytest.fixture(scope="session")
def sea(tiny) -> ocean.Ocean:
    return ocean.build(tiny)
