"""A look at a file tells what is read and what is missing, and what it proposes reads the file."""

from __future__ import annotations

import glob
from collections.abc import Callable
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
import yaml
from altimeter_files import plain_columns, write, write_land, write_mean, write_plain

from setdrift.cli import FAILED, main
from setdrift.data.alongtrack import read_alongtrack
from setdrift.data.configuration import Altimeter, Configuration
from setdrift.errors import SetdriftError
from setdrift.operations.look import look_lines
from synthetic_tracks import dialects, ocean, sampling, scenario

NAMES = ("heron", "plover", "curlew", "dunlin")


@pytest.fixture(scope="module")
def sea(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Give a folder with one file of each dialect of the Tarn Sea, with few eddies."""
    folder = tmp_path_factory.mktemp("sea")
    values = yaml.safe_load(scenario.PACKAGED.read_text())
    values["eddies"]["count"] = 20
    (folder / "few.yaml").write_text(yaml.safe_dump(values, sort_keys=False))
    chosen = scenario.load(folder / "few.yaml")
    water, day = ocean.build(chosen), chosen.observed_days[20]
    for altimeter in chosen.altimeters:
        observations = sampling.observe(chosen, water, altimeter, day)
        dialects.write(folder / altimeter.name / "a.nc", altimeter, day, observations)
    return folder


def proposed(lines: list[str]) -> tuple[str, Altimeter]:
    """Read the proposal the way a configuration is read."""
    content = yaml.safe_load("\n".join(lines[lines.index("in a configuration") + 1 :]))
    ((name, values),) = content["altimeters"].items()
    return name, Altimeter.model_validate(values)


@pytest.mark.parametrize("name", NAMES)
def test_what_is_proposed_reads_the_dialects(sea: Path, name: str) -> None:
    path = sea / name / "a.nc"
    lines = look_lines(path)
    called, altimeter = proposed(lines)
    assert called == name
    assert altimeter.files == str(sea / name / "*.nc")
    track = read_alongtrack(path, altimeter)
    assert len(track) > 1000
    if name == "curlew":
        assert any("cannot be read yet: has no variable with standard_name time" in line for line in lines)
    else:
        assert f"  {len(track)} records, 0 of them flagged" in lines
        assert any(line.startswith("  spacing ") and " km" in line for line in lines)


def test_lines_of_a_file_with_standard_names(sea: Path) -> None:
    text = "\n".join(look_lines(sea / "plover" / "a.nc"))
    assert "time               utc, by standard name time, seconds since 2000-01-01 00:00:00 read as seconds" in text
    assert "layout             points (point " in text
    assert "flag               quality: value 0 good, value 1 suspect, value 2 land" in text
    assert "# TODO which are good? value 0 good" in text
    assert "# TODO pass_number may be: pass_number" in text


def test_choices_of_a_file_without_standard_names(sea: Path) -> None:
    text = "\n".join(look_lines(sea / "curlew" / "a.nc"))
    assert "variables: {time: epoch, latitude: lats, longitude: lons, sea_level_anomaly: ssh_raw}" in text
    for name in ("ssh_raw (cm, sea level above", "air_pressure_effect (cm, static", "sea_tide (cm, sea level of"):
        assert name in text
    assert "such as good: {variable: bits, mask: 7, equals: 0}" in text


def test_the_facts_are_those_of_the_file(tmp_path: Path) -> None:
    level = plain_columns()["level"][0]
    level[4] = np.nan
    text = "\n".join(look_lines(write_plain(tmp_path / "a.nc", level=level)))
    assert "  40 records, 0 of them flagged" in text
    assert "time               2031-03-01 01:00:00.000Z to 2031-03-01 01:00:39.000Z\n" in text
    assert "latitude           8.0000 to 9.9500\n" in text
    assert "longitude          -28.7800 to -28.0000\n" in text
    assert f"{np.nanmin(level):.4f} to {np.nanmax(level):.4f} m, 1 missing" in text
    # 0.05 degrees north and 0.02 west, a second each: 5.53 and 2.18 km
    assert "spacing            1 s, 5.95 km" in text


@pytest.fixture
def configured(tmp_path: Path, configure: Callable[..., Configuration]) -> Configuration:
    write_land(tmp_path / "land.nc", west_of=-28.5)
    write_mean(tmp_path / "mean.nc")
    return configure(altimeters__heron__good={"variable": "fit", "values": [0]})


def test_editing_is_counted_and_rules_are_kept(tmp_path: Path, configured: Configuration) -> None:
    columns: dict[str, Any] = plain_columns()
    columns["fit"] = (np.r_[np.zeros(35), np.ones(5)].astype(np.int8), {})
    columns["level"][0][3] = 9.0
    lines = look_lines(write(tmp_path / "a.nc", columns), configured, "heron")
    section = lines[lines.index("editing") + 1 : lines.index("in a configuration") - 1]
    counts = dict(line.split()[:2] for line in section)
    assert (counts["flagged"], counts["implausible"]) == ("5", "1")
    assert int(counts["land"]) > 0
    kept = int(counts["kept"])
    assert f"  {'kept':<18} {kept} of 40" in lines
    assert proposed(lines)[1].good == configured.altimeters["heron"].good


def test_a_file_in_another_unit_would_be_set_aside(tmp_path: Path, configured: Configuration) -> None:
    columns: dict[str, Any] = plain_columns(400)
    columns["y"] = (8.0 + 0.005 * np.arange(400), columns["y"][1])
    columns["x"] = (-28.0 + 0.001 * np.arange(400), columns["x"][1])
    columns["fit"] = (np.zeros(400, np.int8), {})
    sound = look_lines(write(tmp_path / "a.nc", columns), configured, "heron")
    assert not any("set aside" in line for line in sound)
    columns["level"] = (1000.0 * columns["level"][0], columns["level"][1])
    lines = look_lines(write(tmp_path / "b.nc", columns), configured, "heron")
    assert sum("would be set aside: has sea level with a robust spread of" in line for line in lines) == 1


def test_times_of_records_want_offsets(tmp_path: Path) -> None:
    with netCDF4.Dataset(tmp_path / "a.nc", "w") as file:
        file.createDimension("record", 4)
        file.createDimension("fast", 10)
        for name, (values, attributes) in plain_columns().items():
            kept = ("record",) if name == "clock" else ("record", "fast")
            variable = file.createVariable(name, "f8", kept)
            variable.setncatts(attributes)
            variable[...] = values[::10] if name == "clock" else values.reshape(4, 10)
        file.createVariable("offset", "f8", ("fast",)).units = "s"
    text = "\n".join(look_lines(tmp_path / "a.nc"))
    assert "cannot be read yet: variable level has 2 dimensions (record, fast), but variable clock has 1" in text
    assert "# TODO time_offset may be: offset" in text


def test_a_file_of_something_else_is_told_so(tmp_path: Path) -> None:
    path = write(tmp_path / "a b.nc", {"temperature": (np.arange(3.0), {"units": "K", "long_name": "<b>\n{}"})})
    lines = look_lines(path)
    assert sum("missing: has no variable with standard_name" in line for line in lines) == 4
    assert any("no variable has fitting units" in line for line in lines)
    assert proposed(lines)[1].files == str(tmp_path / "*.nc")


@pytest.mark.parametrize("kind", ["flag_masks", "flag_values"])
def test_flags_explained_by_text_are_no_obstacle(tmp_path: Path, kind: str) -> None:
    columns = plain_columns() | {"fit": (np.zeros(40, np.int8), {kind: "0b, 1b", "flag_meanings": "good bad"})}
    lines = look_lines(write(tmp_path / "a.nc", columns))
    assert "  40 records, 0 of them flagged" in lines
    assert not any("flag  " in line for line in lines)


@pytest.mark.parametrize("folder", ["a [b] c", "x: y", "line\nbreak", "{}", "'quoted\""])
def test_hostile_names_of_folders_are_quoted(tmp_path: Path, folder: str) -> None:
    path = write_plain(tmp_path / folder / "a.nc")
    name, altimeter = proposed(look_lines(path))
    assert name
    assert glob.glob(altimeter.files) == [str(path)]  # noqa: PTH207 - as the inventory does


@pytest.mark.parametrize(
    ("words", "line"),
    [
        (["none.nc"], "none.nc: cannot be read as NetCDF (No such file"),
        (["FILE", "--altimeter", "heron"], "look-at: has one of --config and --altimeter; give both or neither"),
        (["FILE", "--config", "CONFIG"], "look-at: has one of --config and --altimeter; give both or neither"),
        (["FILE", "--config", "CONFIG", "--altimeter", "owl"], "altimeters: has no 'owl'; choose one of heron"),
        (["FILE", "--config", "none.yaml", "--altimeter", "owl"], "none.yaml: cannot be read"),
    ],
)
def test_wrong_use_is_one_line(
    words: list[str], line: str, tmp_path: Path, configured: Configuration, capsys: pytest.CaptureFixture[str]
) -> None:
    places = {"FILE": str(write_plain(tmp_path / "a.nc")), "CONFIG": str(configured.path)}
    assert main(["look-at", *(places.get(word, word) for word in words)]) == FAILED
    out, err = capsys.readouterr()
    assert out == ""
    assert err.count("\n") == 1
    assert line in err


def test_the_command_prints_the_lines(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = write_plain(tmp_path / "a.nc")
    assert main(["look-at", str(path)]) == 0
    assert capsys.readouterr().out.splitlines() == look_lines(path)


def test_one_of_two_is_refused() -> None:
    with pytest.raises(SetdriftError, match="give both or neither"):
        look_lines(Path("a.nc"), None, "heron")
