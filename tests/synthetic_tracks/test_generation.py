from __future__ import annotations

import ast
import sys
from pathlib import Path

import numpy as np
import pytest
import yaml
from netCDF4 import Dataset

import synthetic_tracks
from synthetic_tracks import files, scenario, truth
from synthetic_tracks.__main__ import main


@pytest.fixture(scope="module")
def folder(tiny_file, tmp_path_factory):
    """Everything the command writes for the tiny scenario."""
    output = tmp_path_factory.mktemp("output")
    assert main(["--output", str(output), "--scenario", str(tiny_file)]) == 0
    return output


def contents(folder):
    return {p.relative_to(folder): p.read_bytes() for p in sorted(folder.rglob("*")) if p.is_file()}


def test_the_same_scenario_gives_the_same_bytes(folder, tiny_file, tmp_path):
    assert main(["--output", str(tmp_path), "--scenario", str(tiny_file)]) == 0
    assert contents(tmp_path) == contents(folder)


def test_the_files(folder):
    names = {str(path) for path in contents(folder)}
    tracks = {f"{a}/{a}_203103{d:02}.nc" for a in ("heron", "plover", "curlew", "dunlin") for d in (4, 5, 6)}
    fields = {"truth.nc", "truth_eddies.nc", "truth_errors.nc", "mean_dynamic_topography.nc", "land.nc", "stamp.json"}
    assert names == (tracks - {"curlew/curlew_20310304.nc"}) | fields


def test_the_file_cut_short_cannot_be_read_and_its_neighbour_can(folder):
    with pytest.raises(OSError, match="HDF"):
        Dataset(folder / "dunlin/dunlin_20310306.nc")
    assert Dataset(folder / "dunlin/dunlin_20310305.nc")["clock"].size > 500


def test_truth_file(folder):
    with Dataset(folder / "truth.nc") as data:
        for name, (units, standard_name) in truth.FIELDS.items():
            variable = data[name]
            assert (variable.units, variable.standard_name, variable.shape) == (units, standard_name, (1, 57, 53))
            values = variable[0].filled(np.nan)
            assert 0.05 < np.isnan(values).mean() < 0.2
            assert np.nanstd(values) > 0.01
        assert data["time"][0] % 1 == 0.5
        mean = data["dynamic_topography"][0] - data["sea_level_anomaly"][0]
        lat = data["latitude"][:]
    with Dataset(folder / "mean_dynamic_topography.nc") as data:
        assert not hasattr(data["mean_dynamic_topography"], "standard_name")
        column = np.argmin(np.abs(data["longitude"][:] + 25))
        there = np.interp(lat, data["latitude"][:], data["mean_dynamic_topography"][:, column])
    np.testing.assert_allclose(mean[:, 32], there, atol=2e-3)  # linear interpolation over a sixth of a degree
    with Dataset(folder / "land.nc") as data:
        assert data["land"].standard_name == "land_binary_mask"
        assert set(np.unique(data["land"][:])) == {0, 1}


def test_a_second_run_returns_at_once(folder, tiny_file, capsys):
    before = {p: p.stat().st_mtime_ns for p in folder.rglob("*.nc")}
    assert main(["--output", str(folder), "--scenario", str(tiny_file)]) == 0
    assert "nothing to do" in capsys.readouterr().out
    assert before == {p: p.stat().st_mtime_ns for p in folder.rglob("*.nc")}


def test_a_missing_or_shortened_file_is_noticed(tmp_path):
    whole = tmp_path / "a.nc"
    whole.write_bytes(b"12345")
    files.finish(tmp_path, "digest", [whole], set())
    assert files.is_current(tmp_path, "digest")
    assert not files.is_current(tmp_path, "other digest")
    whole.write_bytes(b"123")
    assert not files.is_current(tmp_path, "digest")
    whole.unlink()
    assert not files.is_current(tmp_path, "digest")


def test_files_of_an_earlier_scenario_go(tmp_path):
    old, kept, foreign = (tmp_path / f"{name}.nc" for name in ("old", "kept", "foreign"))
    for path in (old, kept, foreign):
        path.write_bytes(b"x")
    files.finish(tmp_path, "first", [old, kept], set())
    named = files.begin(tmp_path)
    assert not (tmp_path / files.STAMP).exists()
    files.finish(tmp_path, "second", [kept], named)
    assert [p.exists() for p in (old, kept, foreign)] == [False, True, True]


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("seed:", "tides: {}\nseed:", "unknown key tides"),
        ("margin_days:", "margin:", "unknown key margin"),
        ("  waves: 60\n", "", "background: waves is missing"),
        ("    noise_m: 0.017\n", "", "altimeters: heron: noise_m is missing"),
        ("box:", "box: [", "spoilt.yaml"),
        ("box:\n", "box: here\nbooks:\n", "unknown key books"),
    ],
)
def test_a_spoilt_scenario_is_explained(tiny_file, tmp_path, capsys, old, new, said):
    text, spoilt = tiny_file.read_text(), tmp_path / "spoilt.yaml"
    assert old in text
    spoilt.write_text(text.replace(old, new, 1))
    assert main(["--output", str(tmp_path / "out"), "--scenario", str(spoilt)]) == 1
    assert said in capsys.readouterr().err
    assert not (tmp_path / "out").exists()


def test_an_altimeter_may_be_left_out(tiny_file, tmp_path):
    values = yaml.safe_load(tiny_file.read_text())
    del values["altimeters"]["curlew"]
    fewer = tmp_path / "fewer.yaml"
    fewer.write_text(yaml.safe_dump(values))
    assert [a.name for a in scenario.load(fewer).altimeters] == ["dunlin", "heron", "plover"]


def test_the_truth_is_independent_of_setdrift():
    sources = sorted(Path(synthetic_tracks.__file__).parent.glob("*.py"))
    assert len(sources) > 10
    for source in sources:
        for node in ast.walk(ast.parse(source.read_text())):
            names = [a.name for a in node.names] if isinstance(node, ast.Import) else []
            names += [node.module or ""] if isinstance(node, ast.ImportFrom) else []
            assert not any(name.split(".")[0] == "setdrift" for name in names)
            assert all(name.split(".")[0] in {*sys.stdlib_module_names, "numpy", "scipy", "netCDF4", "yaml",
                                              "synthetic_tracks"} for name in names)  # fmt: skip
