"""Zarr stores go through inventory and gathering as files do."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from altimeter_files import write_land, write_mean, write_plain

from setdrift.data.configuration import Configuration
from setdrift.data.day_store import DayStore
from setdrift.operations.inventory import take_inventory
from setdrift.stages.observations import gather_observations

Configure = Callable[..., Configuration]


@pytest.fixture
def store(tmp_path: Path) -> Path:
    """Give a store made from a file, which stays beside it in a folder of its own."""
    write_land(tmp_path / "land.nc")
    write_mean(tmp_path / "mean.nc")
    with xr.open_dataset(write_plain(tmp_path / "files" / "a.nc"), decode_cf=False) as data:
        data.to_zarr(tmp_path / "stores" / "a.zarr", zarr_format=3, consolidated=False)
    return tmp_path / "stores" / "a.zarr"


def test_a_store_gives_the_days_of_its_file(store: Path, configure: Configure) -> None:
    days = []
    for pattern in ("files/*.nc", "stores/*"):
        configuration = configure(altimeters__heron__files=pattern)
        for block in take_inventory(configuration, lambda _: None).observation_blocks:
            gather_observations(configuration, block, lambda _: None)
        days.append(DayStore(configuration.work / "observations").load(date(2031, 3, 1)).load())
    assert days[0].sizes["observation"] == 40
    for name in days[0].variables:
        np.testing.assert_array_equal(days[0][name].values, days[1][name].values)


def test_a_store_that_changes_after_the_inventory_is_set_aside(store: Path, configure: Configure) -> None:
    configuration = configure(altimeters__heron__files="stores/*")
    blocks = take_inventory(configuration, lambda _: None).observation_blocks
    (store / "level" / "c" / "0").unlink()
    receipts = [gather_observations(configuration, block, lambda _: None) for block in blocks]
    reasons = [entry["reason"] for receipt in receipts for entry in receipt["set_aside"]]
    assert reasons == [f"{store}: changed since the inventory was taken; run the workflow again"]
