"""Receipts tell the next stage what its days depend on."""

from __future__ import annotations

import datetime as dt
import json
from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr

from setdrift.data.configuration import Configuration
from setdrift.data.days import Block
from setdrift.data.receipts import analysed_days, analysed_period, contents_between, receipt_path, refresh_block
from setdrift.data.records import write_record
from setdrift.errors import SetdriftError

Configure = Callable[..., Configuration]
FIRST, LAST = dt.date(2031, 3, 1), dt.date(2031, 3, 3)


@pytest.fixture
def configuration(configure: Configure) -> Configuration:
    configuration = configure()
    write_record(configuration.work / "manifests" / "period.json", {"first": FIRST, "last": LAST})
    return configuration


def refresh(configuration: Configuration, label: str) -> dict[str, object]:
    block = Block.named(label, 2)
    return refresh_block(
        configuration,
        "maps",
        block,
        analysed_days(configuration, block),
        str,
        lambda day: xr.Dataset({"height": ("x", np.array([float(day.day)]))}),
        lambda _: None,
    )


def test_period_is_the_inventorys(configuration: Configuration) -> None:
    assert analysed_period(configuration) == (FIRST, LAST)
    (configuration.work / "manifests" / "period.json").unlink()
    with pytest.raises(SetdriftError, match=r"period\.json: is missing or damaged"):
        analysed_period(configuration)


def test_block_has_its_analysed_days(configuration: Configuration) -> None:
    assert analysed_days(configuration, Block.named("2031-02-28", 2)) == [FIRST]
    with pytest.raises(SetdriftError, match=r"block 2031-03-04: holds no analysed day \(2031-03-01 to 2031-03-03\); "):
        analysed_days(configuration, Block.named("2031-03-04", 2))


def test_contents_of_several_blocks(configuration: Configuration) -> None:
    receipts = [refresh(configuration, label) for label in ("2031-02-28", "2031-03-02")]
    contents = contents_between(configuration, "maps", FIRST, LAST)
    assert list(contents) == [FIRST, dt.date(2031, 3, 2), LAST]
    assert len(set(contents.values())) == 3
    path = receipt_path(configuration, "maps", Block.named("2031-03-02", 2))
    assert path == configuration.work / "maps" / "2031-03-02.json"
    assert json.loads(path.read_text()) == receipts[1]
    assert receipts[1]["days"] == {str(day): {"content": contents[day]} for day in list(contents)[1:]}


def test_lacking_receipts_and_days_are_told(configuration: Configuration) -> None:
    refresh(configuration, "2031-02-28")
    with pytest.raises(SetdriftError, match=r"maps/2031-03-02\.json: is missing or damaged; delete it and run the w"):
        contents_between(configuration, "maps", FIRST, LAST)
    with pytest.raises(SetdriftError, match=r"maps: receipts lack 1 day\(s\), first 2031-02-28; run the workflow aga"):
        contents_between(configuration, "maps", dt.date(2031, 2, 28), FIRST)
