"""Zarr stores are read as the NetCDF files they were made from."""

from __future__ import annotations

import dataclasses
import json
import shutil
from pathlib import Path

import netCDF4
import numpy as np
import pytest
import xarray as xr
import zarr
from altimeter_files import BARE, PACKED, PLAIN, write_plain
from test_alongtrack import bare_file, packed_file
from test_alongtrack_layouts import NUMBERED, ragged

from setdrift.data.alongtrack import AlongTrack, read_alongtrack, read_time_span
from setdrift.data.configuration import Altimeter
from setdrift.errors import SetdriftError

pytestmark = pytest.mark.filterwarnings("ignore::zarr.errors.ZarrUserWarning")


def as_store(source: Path, zarr_format: int, group: str = "") -> Path:
    """Copy a file to a store by way of xarray, its packed values as they are."""
    store = source.with_name(f"{source.stem}_{zarr_format}.zarr")
    with xr.open_dataset(source, decode_cf=False) as data:
        for variable in data.variables.values():
            # undecoded, xarray would keep these where it keeps ordinary attributes
            if zarr_format == 2 and "_FillValue" in variable.attrs:
                variable.encoding["_FillValue"] = variable.attrs.pop("_FillValue")
        data.to_zarr(store, group=group or None, zarr_format=zarr_format, consolidated=False)
    return store


def assert_same(one: AlongTrack, other: AlongTrack) -> None:
    for field in dataclasses.fields(AlongTrack):
        a, b = getattr(one, field.name), getattr(other, field.name)
        if isinstance(a, np.ndarray):
            np.testing.assert_array_equal(a, b, err_msg=field.name)
        elif field.name != "found":
            assert a == b


@pytest.mark.parametrize("zarr_format", [2, 3])
@pytest.mark.parametrize("dialect", ["plain", "packed", "bare", "ragged"])
def test_a_store_gives_what_its_file_gives(tmp_path: Path, dialect: str, zarr_format: int) -> None:
    path = tmp_path / "a.nc"
    altimeter = {"plain": PLAIN, "packed": PACKED, "bare": BARE, "ragged": NUMBERED}[dialect]
    make = {"plain": write_plain, "packed": packed_file, "bare": bare_file}
    make[dialect](path) if dialect in make else ragged(path, "contiguous", [5, 0, 35])
    store = as_store(path, zarr_format)
    expected = read_alongtrack(path, altimeter)
    assert_same(read_alongtrack(store, altimeter), expected)
    assert read_alongtrack(store, altimeter).found == expected.found
    assert read_time_span(store, altimeter) == read_time_span(path, altimeter)


@pytest.mark.parametrize("zarr_format", [2, 3])
def test_a_decoded_store_with_encoded_fill_values(tmp_path: Path, zarr_format: int) -> None:
    """Written the usual way, floats have their fill value in base 64 in format 3."""
    write_plain(tmp_path / "a.nc")
    with xr.open_dataset(tmp_path / "a.nc") as data:
        data["level"][3] = np.nan
        data["level"].encoding = {"_FillValue": -9999.0}
        data.to_zarr(tmp_path / "a.zarr", zarr_format=zarr_format, consolidated=True)
    track = read_alongtrack(tmp_path / "a.zarr", PLAIN)
    assert np.flatnonzero(np.isnan(track.sea_level_anomaly)).tolist() == [3]


def test_groups_within_a_store(tmp_path: Path) -> None:
    store = as_store(write_plain(tmp_path / "a.nc"), 3, "data/fine")
    track = read_alongtrack(store, PLAIN)
    assert_same(track, read_alongtrack(tmp_path / "a.nc", PLAIN))
    assert track.found["time"] == "data/fine/clock"


def test_valid_ranges_and_unsigned_bytes(tmp_path: Path) -> None:
    store = as_store(write_plain(tmp_path / "a.nc", 4), 3)
    group = zarr.open_group(str(store), mode="a")
    tide = group.create_array("tide", data=np.array([-1, 5, 100, 7], np.int8), dimension_names=("sample",))
    tide.attrs.update({"units": "m", "_Unsigned": "true", "valid_range": [6, 255], "missing_value": [100, 101]})
    track = read_alongtrack(store, Altimeter(files="*", add=["tide"]))
    level = read_alongtrack(store, PLAIN).sea_level_anomaly
    np.testing.assert_allclose(track.sea_level_anomaly - level, [255.0, np.nan, np.nan, 7.0])


def test_arrays_without_names_of_dimensions_are_series(tmp_path: Path) -> None:
    write_plain(tmp_path / "a.nc")
    group = zarr.open_group(str(tmp_path / "a.zarr"), mode="w", zarr_format=3)
    with netCDF4.Dataset(tmp_path / "a.nc") as file:
        for name, variable in file.variables.items():
            group.create_array(name, data=variable[:].data).attrs.update(variable.__dict__)
    assert_same(read_alongtrack(tmp_path / "a.zarr", PLAIN), read_alongtrack(tmp_path / "a.nc", PLAIN))


def no_metadata(store: Path) -> None:
    (store / "zarr.json").unlink()


def text_for_metadata(store: Path) -> None:
    (store / "level" / "zarr.json").write_text("{no")


def cut_chunk(store: Path) -> None:
    chunk = store / "level" / "c" / "0"
    chunk.write_bytes(chunk.read_bytes()[:30])


def names_amiss(store: Path) -> None:
    path = store / "level" / "zarr.json"
    content = json.loads(path.read_text())
    content["attributes"]["_ARRAY_DIMENSIONS"] = ["sample", "other"]
    path.write_text(json.dumps(content))


def an_array(store: Path) -> None:
    shutil.rmtree(store)
    zarr.create_array(str(store), data=np.arange(3.0))


@pytest.mark.parametrize("damage", [no_metadata, text_for_metadata, cut_chunk, names_amiss, an_array])
def test_damaged_stores_are_refused(tmp_path: Path, damage: object) -> None:
    store = as_store(write_plain(tmp_path / "a.nc"), 3)
    damage(store)  # type: ignore[operator]
    with pytest.raises(SetdriftError, match=r"cannot be read as Zarr|has no variable with standard_name") as raised:
        read_alongtrack(store, PLAIN)
    assert raised.value.where == str(store)
    assert "\n" not in str(raised.value)
