"""However observations are arranged in a file, they are read as the same series."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
from altimeter_files import MARCH_FIRST, PLAIN, plain_columns, write, write_plain

from setdrift.data.alongtrack import AlongTrack, read_alongtrack, read_time_span
from setdrift.data.configuration import Altimeter
from setdrift.errors import SetdriftError

ROWS, LENGTH = 4, 10
NUMBERED = Altimeter(files="*.nc", variables={"pass_number": "p", "cycle_number": "c"})
OFFSET = Altimeter(files="*.nc", variables={"time_offset": "later"})
COLUMNS = {name: (values, dict(attributes)) for name, (values, attributes) in plain_columns(ROWS * LENGTH).items()}


def put(file: Any, name: str, dimensions: dict[str, int], values: Any, **attributes: Any) -> None:
    """Add a variable, and its dimensions where they are new."""
    for dimension, size in dimensions.items():
        if dimension not in file.dimensions:
            file.createDimension(dimension, size)
    variable = file.createVariable(name, np.asarray(values).dtype, tuple(dimensions))
    variable.setncatts(attributes)
    variable[...] = np.reshape(values, tuple(dimensions.values()))


def same_track(path: Path, altimeter: Altimeter = PLAIN, order: Any = slice(None)) -> AlongTrack:
    """Read a file and require the observations of the plain one."""
    track = read_alongtrack(path, altimeter)
    for role, name in {"time": "clock", "latitude": "y", "sea_level_anomaly": "level"}.items():
        np.testing.assert_array_equal(getattr(track, role), COLUMNS[name][0][order])
    np.testing.assert_allclose(track.longitude, COLUMNS["x"][0][order], atol=1e-12)
    assert track.flagged.shape == track.time.shape
    assert read_time_span(path, altimeter) == (dt.date(2031, 3, 1), dt.date(2031, 3, 1))
    return track


def put_all(file: Any, dimensions: dict[str, int], but: tuple[str, ...] = ()) -> None:
    for name, (values, attributes) in COLUMNS.items():
        if name not in but:
            put(file, name, dimensions, values, **attributes)


@pytest.mark.parametrize(
    "dimensions",
    [
        {"trajectory": ROWS, "sample": LENGTH},
        {"one": 1, "sample": ROWS * LENGTH},
        {"sample": ROWS * LENGTH, "one": 1, "beam": 1},
        {"one": 1, "record": ROWS, "fast": LENGTH},
        {"record": ROWS, "block": 2, "fast": LENGTH // 2},
    ],
)
def test_tables_are_read_row_by_row(tmp_path: Path, dimensions: dict[str, int]) -> None:
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        put_all(file, dimensions)
    same_track(tmp_path / "a.nc")


def test_a_variable_along_rows_counts_for_all_of_a_row(tmp_path: Path) -> None:
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        put_all(file, {"trajectory": ROWS, "sample": LENGTH})
        put(file, "p", {"trajectory": ROWS}, np.array([7, 8, 9, 10]))
        put(file, "c", {}, np.array(3))
    track = same_track(tmp_path / "a.nc", NUMBERED)
    np.testing.assert_array_equal(track.pass_number, np.repeat([7, 8, 9, 10], LENGTH))
    np.testing.assert_array_equal(track.cycle_number, np.full(ROWS * LENGTH, 3))


def test_dimensions_in_another_order_are_turned(tmp_path: Path) -> None:
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        put_all(file, {"record": ROWS, "fast": LENGTH}, but=("x",))
        values, attributes = COLUMNS["x"]
        put(file, "x", {"fast": LENGTH, "record": ROWS}, values.reshape(ROWS, LENGTH).T, **attributes)
    same_track(tmp_path / "a.nc")


def test_the_filling_of_short_rows_is_no_observation(tmp_path: Path) -> None:
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        for name, (values, attributes) in COLUMNS.items():
            table = np.full((2, ROWS * LENGTH), np.nan)
            table[0, :25], table[1, :15] = values[:25], values[25:]
            put(file, name, {"trajectory": 2, "sample": ROWS * LENGTH}, table, **attributes)
        file["level"][0, 3] = np.nan  # a gap in the sea level alone is an observation, to be dropped by editing
    track = read_alongtrack(tmp_path / "a.nc", PLAIN)
    np.testing.assert_array_equal(track.time, COLUMNS["clock"][0])
    assert np.flatnonzero(np.isnan(track.sea_level_anomaly)).tolist() == [3]


@pytest.mark.parametrize("offset", [{"fast": LENGTH}, {"record": ROWS, "fast": LENGTH}])
def test_offsets_add_to_the_time_of_a_record(tmp_path: Path, offset: dict[str, int]) -> None:
    milliseconds = np.broadcast_to(1e3 * np.arange(LENGTH), tuple(offset.values()))
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        put_all(file, {"record": ROWS, "fast": LENGTH}, but=("clock",))
        values, attributes = COLUMNS["clock"]
        put(file, "clock", {"record": ROWS}, values[::LENGTH], **attributes)
        put(file, "later", offset, milliseconds, units="ms")
    same_track(tmp_path / "a.nc", OFFSET)
    with pytest.raises(SetdriftError, match=r"level has 2 dimensions \(record, fast\), but variable clock has 1 dim"):
        read_alongtrack(tmp_path / "a.nc", PLAIN)


def ragged(path: Path, kind: str, rows: Any) -> Path:
    with netCDF4.Dataset(path, "w") as file:
        put_all(file, {"obs": ROWS * LENGTH})
        put(file, "p", {"track": 3}, np.array([7, 8, 9]))
        put(file, "c", {"track": 3}, np.array([1, 1, 2]))
        if kind == "contiguous":
            put(file, "row_size", {"track": 3}, np.asarray(rows), sample_dimension="obs")
        else:
            put(file, "row", {"obs": ROWS * LENGTH}, np.asarray(rows), instance_dimension="track")
    return path


def test_contiguous_ragged_rows_are_spread(tmp_path: Path) -> None:
    track = same_track(ragged(tmp_path / "a.nc", "contiguous", [5, 0, 35]), NUMBERED)
    np.testing.assert_array_equal(track.pass_number, np.repeat([7, 9], [5, 35]))


def test_indexed_ragged_rows_are_looked_up(tmp_path: Path) -> None:
    rows = np.arange(ROWS * LENGTH) % 3
    track = same_track(ragged(tmp_path / "a.nc", "indexed", rows), NUMBERED)
    np.testing.assert_array_equal(track.pass_number, 7 + rows)
    np.testing.assert_array_equal(track.cycle_number, np.array([1, 1, 2])[rows])


@pytest.mark.parametrize(
    ("kind", "rows", "message"),
    [
        ("contiguous", [5, 5, 35], "row_size counts 45 observations, but there are 40"),
        ("contiguous", [50, -5, -5], "row_size, which tells what belongs together, holds values that are not 0 to 40"),
        ("contiguous", [5.0, np.nan, 35.0], "row_size, which tells"),
        ("indexed", np.arange(40) % 4, "row, which tells what belongs together, holds values that are not 0 to 2"),
        ("indexed", np.arange(40) % 3 - 1, "row, which tells"),
    ],
)
def test_rows_that_cannot_be_are_refused(tmp_path: Path, kind: str, rows: Any, message: str) -> None:
    with pytest.raises(SetdriftError, match=message):
        read_alongtrack(ragged(tmp_path / "a.nc", kind, rows), NUMBERED)


def gridded(file: Any) -> None:
    for name, size in (("time", 3), ("latitude", 4), ("longitude", 5)):
        units = {"time": "days since 2031-01-01"}.get(name, "degrees")
        put(file, name, {name: size}, np.arange(float(size)), standard_name=name, units=units)
    sizes = {"time": 3, "latitude": 4, "longitude": 5}
    put(file, "level", sizes, np.zeros((3, 4, 5)), **COLUMNS["level"][1])


def positions_of_rows(file: Any) -> None:
    put_all(file, {"record": ROWS, "fast": LENGTH}, but=("y",))
    put(file, "y", {"record": ROWS}, np.arange(float(ROWS)), **COLUMNS["y"][1])


def covariance(file: Any) -> None:
    put_all(file, {"obs": 40}, but=("level",))
    file.createVariable("level", "f8", ("obs", "obs")).setncatts(COLUMNS["level"][1])


def another_size(file: Any) -> None:
    put_all(file, {"record": ROWS, "fast": LENGTH}, but=("x",))
    put(file, "x", {"record": ROWS, "slow": LENGTH}, COLUMNS["x"][0], **COLUMNS["x"][1])


def no_rows(file: Any) -> None:
    put_all(file, {"record": ROWS, "fast": LENGTH}, but=tuple(COLUMNS))
    file.createDimension("none", 0)
    for name, (_, attributes) in COLUMNS.items():
        file.createVariable(name, "f8", ("none",)).setncatts(attributes)


def positions_of_tracks(file: Any) -> None:
    put_all(file, {"obs": ROWS * LENGTH}, but=("y",))
    put(file, "y", {"track": 2}, np.array([1.0, 2.0]), **COLUMNS["y"][1])
    put(file, "row_size", {"track": 2}, np.array([20, 20]), sample_dimension="obs")


REFUSED: dict[str, tuple[Callable[[Any], None], str]] = {
    "gridded": (gridded, r"level has 3 dimensions .*, but variable time has 1 dimension \(time\)"),
    "positions": (positions_of_rows, r"level has 2 dimensions .*, but variable y has 1 dimension \(record\)"),
    "twice": (covariance, r"level has one dimension twice \(obs, obs\)"),
    "size": (another_size, r"x has 2 dimensions \(record, slow\), but level has 2 dimensions \(record, fast\)"),
    "empty": (no_rows, "holds no records"),
    "ragged": (positions_of_tracks, r"level has 1 dimension \(obs\), but variable y has 1 dimension \(track\)"),
}


@pytest.mark.parametrize("kind", REFUSED)
def test_other_arrangements_are_refused(tmp_path: Path, kind: str) -> None:
    make, message = REFUSED[kind]
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        make(file)
    for read in (read_alongtrack, read_time_span):
        with pytest.raises(SetdriftError, match=message) as raised:
            read(tmp_path / "a.nc", PLAIN)
        assert "\n" not in str(raised.value)


def test_one_observation_in_any_shape(tmp_path: Path) -> None:
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        for n, (name, (values, attributes)) in enumerate(COLUMNS.items()):
            put(file, name, dict([("a", 1), ("b", 1)][: n % 3]), values[:1], **attributes)
    track = read_alongtrack(tmp_path / "a.nc", PLAIN)
    np.testing.assert_array_equal(track.time, [MARCH_FIRST + 3600.0])
    np.testing.assert_array_equal(track.latitude, [8.0])


def test_standard_names_are_found_in_groups(tmp_path: Path) -> None:
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        put_all(file.createGroup("data"), {"obs": ROWS * LENGTH}, but=("level",))
        put_all(file.createGroup("data/fine"), {"obs": ROWS * LENGTH}, but=("clock", "x", "y"))
    track = same_track(tmp_path / "a.nc")
    assert track.found["time"] == "data/clock"
    assert track.found["sea_level_anomaly"] == "data/fine/level"


def test_candidates_in_two_groups_are_both_named(tmp_path: Path) -> None:
    write_plain(tmp_path / "a.nc")
    with netCDF4.Dataset(tmp_path / "a.nc", "a") as file:
        put_all(file.createGroup("fast/inner"), {"obs": ROWS * LENGTH}, but=("level",))
    with pytest.raises(SetdriftError, match=r"several variables for time: clock, fast/inner/clock; name one under"):
        read_alongtrack(tmp_path / "a.nc", PLAIN)
    chosen = {"time": "clock", "latitude": "fast/inner/y", "longitude": "x"}
    same_track(tmp_path / "a.nc", Altimeter(files="*", variables=chosen))


def test_series_on_two_dimensions_of_one_length(tmp_path: Path) -> None:
    write(tmp_path / "a.nc", {name: COLUMNS[name] for name in ("clock", "level")}, "sample")
    with netCDF4.Dataset(tmp_path / "a.nc", "a") as file:
        put_all(file, {"other": ROWS * LENGTH}, but=("clock", "level"))
    same_track(tmp_path / "a.nc")
