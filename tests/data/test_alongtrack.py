"""Along-track files of several dialects, sound and damaged."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
from altimeter_files import BARE, MARCH_FIRST, PACKED, PLAIN, plain_columns, write, write_plain

from setdrift.data.alongtrack import concatenate, read_alongtrack, read_time_span
from setdrift.data.configuration import Altimeter
from setdrift.errors import SetdriftError


def test_standard_names_in_metres(tmp_path: Path) -> None:
    track = read_alongtrack(write_plain(tmp_path / "a.nc"), PLAIN)
    expected = plain_columns()
    np.testing.assert_array_equal(track.time, expected["clock"][0])
    np.testing.assert_array_equal(track.latitude, expected["y"][0])
    np.testing.assert_allclose(track.longitude, expected["x"][0], atol=1e-12)
    np.testing.assert_array_equal(track.sea_level_anomaly, expected["level"][0])
    assert not track.flagged.any()
    assert track.found["sea_level_anomaly"] == "level"
    assert track.pass_number is None


def packed_file(path: Path, **attributes: Any) -> Path:
    level = np.ma.masked_equal(np.array([100, -200, 999, 2001, 50], np.int16), 999)
    return write(
        path,
        {
            "t": (np.arange(5, dtype=np.int32), {"axis": "T", "units": "days since 2031-03-01 12:00:00"}),
            "la": (np.array([10, 20, 30, 40, -50], np.int32), {"units": "degrees_north", "standard_name": "latitude"}),
            "lo": (
                np.array([3315, 3599, 0, 1800, 900], np.int32),
                {"units": "degrees_east", "standard_name": "longitude", "scale_factor": 0.1},
            ),
            "h": (
                level,
                {
                    "standard_name": "sea_surface_height_above_sea_level",
                    "units": "mm",
                    "scale_factor": 0.5,
                    "add_offset": 10.0,
                    "_FillValue": np.int16(999),
                    "valid_max": np.int16(2000),
                },
            ),
            "quality": (np.array([0, 1, 0, 3, -1], np.int8), attributes),
        },
    )


def test_packed_integers_and_longitudes_to_360(tmp_path: Path) -> None:
    track = read_alongtrack(packed_file(tmp_path / "a.nc"), PACKED)
    np.testing.assert_allclose(track.time, MARCH_FIRST + 43200.0 + 86400.0 * np.arange(5))
    np.testing.assert_allclose(track.longitude, [-28.5, -0.1, 0.0, -180.0, 90.0], atol=1e-9)
    # 999 is the fill value, and 2001 lies beyond the packed valid_max
    np.testing.assert_allclose(track.sea_level_anomaly, [0.06, -0.09, np.nan, np.nan, 0.035])
    np.testing.assert_array_equal(track.flagged, [False, True, False, False, True])


def bare_file(path: Path) -> Path:
    return write(
        path,
        {
            "when": (np.array([60.0, 61.0, 62.0, 63.0]), {"units": "hours since 2031-02-27", "calendar": "gregorian"}),
            "north": (np.array([1.0, 2.0, 95.0, 4.0]), {"units": "degrees_north"}),
            "east": (np.array([1.0, 2.0, 3.0, 400.0]), {"units": "degrees_east"}),
            "height": (np.array([30.0, 31.0, 32.0, 33.0], np.float32), {"units": "cm"}),
            "tide": (np.array([10.0, np.nan, 10.0, 10.0]), {"units": "cm"}),
            "bias": (np.array([0.5, 0.5, 0.5, 0.5]), {"units": "m"}),
            "bits": (np.ma.masked_equal(np.array([2, 4, 7, 9], np.int16), 9), {"_FillValue": np.int16(9)}),
        },
    )


def test_centimetres_corrections_and_bits(tmp_path: Path) -> None:
    track = read_alongtrack(bare_file(tmp_path / "a.nc"), BARE)
    np.testing.assert_allclose(track.time, MARCH_FIRST + 43200.0 + 3600.0 * np.arange(4))
    np.testing.assert_allclose(track.sea_level_anomaly, [0.70, np.nan, 0.72, 0.73], rtol=1e-6)
    # bit 2 does no harm; a missing flag speaks against the observation
    np.testing.assert_array_equal(track.flagged, [False, True, True, True])
    np.testing.assert_array_equal(np.isnan(track.latitude), [False, False, True, False])
    np.testing.assert_array_equal(np.isnan(track.longitude), [False, False, False, True])


def test_pass_numbers_as_mapped(tmp_path: Path) -> None:
    altimeter = Altimeter(files="*.nc", variables={"pass_number": "p", "cycle_number": "c"})
    columns = plain_columns(3)
    columns |= {"p": (np.array([7, 7, 8], np.int16), {}), "c": (np.array([3, 3, 3], np.int16), {})}
    track = read_alongtrack(write(tmp_path / "a.nc", columns), altimeter)
    np.testing.assert_array_equal(track.pass_number, [7, 7, 8])
    columns["p"] = (np.ma.masked_equal(np.array([7, 7, 99], np.int16), 99), {"_FillValue": np.int16(99)})
    partly = read_alongtrack(write(tmp_path / "b.nc", columns), altimeter)
    assert partly.pass_number is None
    both = concatenate([track, partly])
    assert both.pass_number is None
    np.testing.assert_array_equal(both.cycle_number, np.full(6, 3))


def test_variables_in_groups(tmp_path: Path) -> None:
    write_plain(tmp_path / "a.nc", 3)
    with netCDF4.Dataset(tmp_path / "a.nc", "a") as file:
        group = file.createGroup("extra").createGroup("deep")
        group.createVariable("tide", "f8", ("sample",))[:] = [1.0, 2.0, 3.0]
        group["tide"].units = "mm"
    track = read_alongtrack(tmp_path / "a.nc", Altimeter(files="*", subtract=["extra/deep/tide"]))
    np.testing.assert_allclose(plain_columns(3)["level"][0] - track.sea_level_anomaly, [0.001, 0.002, 0.003])


@pytest.mark.parametrize(
    ("units", "calendar", "expected"),
    [
        ("days since 1950-01-01", "standard", (29643 - 7305) * 86400.0),
        ("days since 1950-01-01 00:00:00 UTC", "proleptic_gregorian", (29643 - 7305) * 86400.0),
        ("hours since 1970-01-01 00:00:00 +02:00", "gregorian", 29643 * 3600.0 - 7200.0),
        ("milliseconds since 2031-03-01T00:00:00Z", "standard", MARCH_FIRST + 29.643),
    ],
)
def test_units_of_time(tmp_path: Path, units: str, calendar: str, expected: float) -> None:
    attributes = {"standard_name": "time", "units": units, "calendar": calendar}
    columns = plain_columns(1) | {"clock": (np.array([29643], np.int32), attributes)}
    track = read_alongtrack(write(tmp_path / "a.nc", columns), PLAIN)
    # microseconds are what the calendar library resolves
    np.testing.assert_allclose(track.time, [expected], rtol=0, atol=2e-6)


@pytest.mark.parametrize(
    ("attributes", "message"),
    [
        ({"standard_name": "time"}, "clock has units None"),
        ({"standard_name": "time", "units": "m"}, "clock has units 'm'"),
        ({"standard_name": "time", "units": "seconds"}, "not a time since an epoch"),
        ({"standard_name": "time", "units": "months since 2000-01-01"}, "not a time since an epoch"),
        ({"standard_name": "time", "units": "gibberish since when"}, "not a time since an epoch"),
        ({"standard_name": "time", "units": 7}, "clock has units None"),
        ({"standard_name": "time", "units": "days since 2000-01-01", "calendar": "noleap"}, "calendar 'noleap'"),
        ({"standard_name": "height"}, "no variable with standard_name time"),
    ],
)
def test_nonsense_times_are_refused(tmp_path: Path, attributes: dict[str, Any], message: str) -> None:
    columns = plain_columns()
    path = write(tmp_path / "a.nc", columns | {"clock": (columns["clock"][0], attributes)})
    for read in (read_alongtrack, read_time_span):
        with pytest.raises(SetdriftError, match=message) as raised:
            read(path, PLAIN)
        assert raised.value.where == str(path)


@pytest.mark.parametrize("units", [None, "kg", "furlongs per", "seconds since 2000-01-01"])
def test_nonsense_heights_are_refused(tmp_path: Path, units: str | None) -> None:
    columns = plain_columns()
    columns["level"][1].pop("units")
    if units:
        columns["level"][1]["units"] = units
    path = write(tmp_path / "a.nc", columns)
    with pytest.raises(SetdriftError, match="level has units"):
        read_alongtrack(path, PLAIN)


def test_two_candidates_are_refused(tmp_path: Path) -> None:
    columns = plain_columns()
    path = write(tmp_path / "a.nc", columns | {"smoothed": columns["level"]})
    with pytest.raises(SetdriftError, match="several variables for sea_level_anomaly: level, smoothed"):
        read_alongtrack(path, PLAIN)
    chosen = Altimeter(files="*", variables={"sea_level_anomaly": "smoothed"})
    assert read_alongtrack(path, chosen).found["sea_level_anomaly"] == "smoothed"


def test_missing_correction_is_named(tmp_path: Path) -> None:
    path = write_plain(tmp_path / "a.nc")
    with pytest.raises(SetdriftError, match=r"no variable tide .*it holds clock, y, x, level"):
        read_alongtrack(path, Altimeter(files="*", subtract=["tide"]))


def instead(path: Path, name: str, kind: Any, dimensions: dict[str, int], standard_name: str, units: str) -> None:
    """Write a plain file with one variable replaced by another of other type or dimensions."""
    write_plain(path)
    with netCDF4.Dataset(path, "a") as file:
        file.renameVariable(name, "old")
        file["old"].standard_name = "other"
        for dimension, size in dimensions.items():
            if dimension not in file.dimensions:
                file.createDimension(dimension, size)
        variable = file.createVariable(name, kind, tuple(dimensions))
        variable.setncatts({"standard_name": standard_name, "units": units})


def truncated(path: Path) -> None:
    write_plain(path, 5000)
    path.write_bytes(path.read_bytes()[: path.stat().st_size * 3 // 5])


LEVEL = "sea_surface_height_above_mean_sea_level"
DAMAGE: dict[str, tuple[Callable[[Path], object], str]] = {
    "missing": (lambda path: path.with_suffix(".other").touch(), "cannot be read"),
    "folder": (Path.mkdir, "cannot be read"),
    "empty": (Path.touch, "cannot be read"),
    "text": (lambda path: path.write_text("time, latitude\n1, 2\n"), "cannot be read"),
    "truncated": (truncated, "cannot be read"),
    "foreign": (
        lambda path: write(path, {"temperature": (np.arange(3.0), {"units": "K"})}),
        "no variable with standard_name time .it holds temperature",
    ),
    "no_records": (lambda path: write_plain(path, 0), "holds no records"),
    "two_dimensions": (
        lambda path: instead(path, "level", "f8", {"sample": 40, "fast": 20}, LEVEL, "m"),
        r"level has 2 dimensions \(sample, fast\), but variable clock has 1 dimension \(sample\); name",
    ),
    "scalar": (lambda path: instead(path, "x", "f8", {}, "longitude", "degrees"), "variable x has 0 dimensions"),
    "lengths": (
        lambda path: instead(path, "y", "f8", {"other": 3}, "latitude", "degrees"),
        "y has 3 values for 40 of level",
    ),
    "words": (lambda path: instead(path, "level", str, {"sample": 40}, LEVEL, "m"), "cannot be read"),
}


@pytest.mark.parametrize("kind", DAMAGE)
def test_damaged_files_are_refused(tmp_path: Path, kind: str) -> None:
    path = tmp_path / f"{kind}.nc"
    make, message = DAMAGE[kind]
    make(path)
    with pytest.raises(SetdriftError, match=message) as raised:
        read_alongtrack(path, PLAIN)
    assert raised.value.where == str(path)
    assert raised.value.remedy


@pytest.mark.parametrize("damage", ["cut", "scrambled"])
def test_any_damage_ends_in_our_error_or_a_track(tmp_path: Path, damage: str) -> None:
    whole = write_plain(tmp_path / "whole.nc", 300).read_bytes()
    used = np.flatnonzero(np.frombuffer(whole, np.uint8))
    rng = np.random.default_rng(11)
    told: list[str] = []
    for n in range(150):
        # a new name each time: the library may remember a file that it failed to open
        path = tmp_path / f"{n}.nc"
        content = bytearray(whole[: rng.integers(0, len(whole))] if damage == "cut" else whole)
        if damage == "scrambled":
            for place in rng.choice(used, 20):
                content[place] = rng.integers(0, 256)
        path.write_bytes(content)
        try:
            assert len(read_alongtrack(path, PLAIN)) > 0
        except SetdriftError as error:
            told.append(error.where)
    assert len(told) > 100
    assert all(Path(where).parent == tmp_path for where in told)


def test_masked_and_infinite_values_become_nan(tmp_path: Path) -> None:
    columns = plain_columns(4)
    for name in columns:
        columns[name][0][1] = np.nan
    columns["level"][0][2] = np.inf
    track = read_alongtrack(write(tmp_path / "a.nc", columns), PLAIN)
    for values in (track.time, track.latitude, track.longitude, track.sea_level_anomaly):
        assert np.isnan(values[1])
    assert len(track) == 4
    assert np.isinf(track.sea_level_anomaly[2])


def test_span_of_days(tmp_path: Path) -> None:
    path = write_plain(tmp_path / "a.nc", 100, MARCH_FIRST + 86400.0 - 50.0)
    assert read_time_span(path, PLAIN) == (dt.date(2031, 3, 1), dt.date(2031, 3, 2))
    assert read_time_span(write_plain(tmp_path / "b.nc", clock=np.full(40, np.nan)), PLAIN) is None


@pytest.mark.parametrize("stray", [0.0, -5e9, 1e19, MARCH_FIRST + 1e9, MARCH_FIRST - 40 * 86400.0])
def test_stray_time_stretches_no_span(tmp_path: Path, stray: float) -> None:
    clock = plain_columns()["clock"][0]
    clock[7] = stray
    path = write_plain(tmp_path / "a.nc", clock=clock)
    assert read_time_span(path, PLAIN) == (dt.date(2031, 3, 1), dt.date(2031, 3, 1))
    np.testing.assert_array_equal(np.flatnonzero(np.isnan(read_alongtrack(path, PLAIN).time)), [7])
