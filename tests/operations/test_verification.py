"""The table of errors: a perfect truth has none, and known errors come out as they are."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from tiny_analysis import run_chain, tiny, write_day, write_mean, write_sea

from setdrift.cli import main
from setdrift.data.configuration import Configuration
from setdrift.data.days import days_between
from setdrift.errors import SetdriftError
from setdrift.operations.verification import verification_lines

Configure = Callable[..., Configuration]
NAMES = ["sea_level_anomaly", "eastward_velocity", "northward_velocity"]


def write_truth(configuration: Configuration, level: float = 0.0, eastward: float = 0.0, **how: object) -> Path:
    """Write what is published as the truth, some fields off by a constant."""
    with xr.open_zarr(configuration.products / "daily.zarr", chunks=None) as store:
        truth = store[NAMES].load().astype(np.float64)
    truth["sea_level_anomaly"] = truth["sea_level_anomaly"] + level
    truth["eastward_velocity"] = truth["eastward_velocity"] + eastward
    with xr.open_zarr(configuration.products / "daily.zarr", chunks=None) as store:
        for name in NAMES:
            truth[name].attrs = {"standard_name": store[name].attrs["standard_name"]}
    truth = truth.assign_coords(longitude=truth["longitude"] + float(str(how.get("turned", 0))))
    truth = truth.rename({name: f"true_{name}" for name in NAMES}).drop_vars(
        str(how.get("without", ())), errors="ignore"
    )
    for variable in truth.variables.values():
        variable.encoding.clear()
    path = configuration.path.parent / "truth.nc"
    truth.to_netcdf(path, engine="netcdf4")
    return path


def figures(lines: list[str], start: str) -> list[list[float]]:
    """Return the numbers of the rows that begin so, in the order of the tables."""
    return [[float(word) for word in line[26:].split()] for line in lines if line.startswith(start)]


def test_perfect_truth_has_no_error(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    lines = list(verification_lines(configuration, write_truth(configuration)))
    assert lines[0] == f"small_sea: 3 days compared with {analysed_sea / 'truth.nc'}"
    for band in ("20 to 30", "30 to 45", "beyond 5"):
        (deviation, rmse, ratio, one, two), velocity = figures(lines, band)
        assert (rmse, ratio, one, two) == (0.0, 0.0, 100.0, 100.0)
        assert deviation > 0.5
        assert (velocity[1], velocity[2], velocity[4], velocity[5]) == (0.0, 0.0, 0.0, 0.0)
    assert not any(line.startswith(("0 to", "10 to", "45 to")) for line in lines)


def test_known_errors_come_out_as_they_are(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    (level, velocity) = figures(
        list(verification_lines(configuration, write_truth(configuration, level=0.012, eastward=0.05))), "beyond 5"
    )
    assert level[1] == pytest.approx(1.2, abs=0.005)
    with xr.open_zarr(configuration.products / "daily.zarr", chunks=None) as store:
        error = store["sea_level_anomaly_error"].values
    assert level[3:] == pytest.approx([100.0 * np.mean(k * error >= 0.012) for k in (1, 2)], abs=0.05)
    assert level[3] < level[4]
    assert velocity[1] == pytest.approx(0.05, abs=0.0005)
    assert velocity[4] == 0.0


def test_command_prints_the_table(analysed_sea: Path, configure: Configure, capsys: pytest.CaptureFixture[str]) -> None:
    configuration = tiny(configure)
    assert main(["verify", str(configuration.path), "--truth", str(write_truth(configuration))]) == 0
    out = capsys.readouterr().out.splitlines()
    assert out == list(verification_lines(configuration, analysed_sea / "truth.nc"))


@pytest.mark.parametrize(
    ("how", "line"),
    [
        ({"turned": 360}, "--truth: has no value at any sea point of the product; give a truth of the same area"),
        (
            {"without": "true_eastward_velocity"},
            "--truth: holds no variable with standard name surface_geostrophic_eastward_sea_water_velocity; give the",
        ),
    ],
)
def test_truth_of_something_else_is_told(
    analysed_sea: Path, configure: Configure, how: dict[str, object], line: str
) -> None:
    configuration = tiny(configure)
    with pytest.raises(SetdriftError) as caught:
        list(verification_lines(configuration, write_truth(configuration, **how)))  # type: ignore[arg-type]
    assert str(caught.value).startswith(line)


def test_other_days_missing_truth_and_missing_product_are_told(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    path = write_truth(configuration)
    with xr.open_dataset(path) as file:
        later = file.load()
    later.assign_coords(time=later["time"] + np.timedelta64(30, "D")).to_netcdf(analysed_sea / "later.nc")
    with pytest.raises(SetdriftError, match="--truth: shares no time with the product; give a truth for the analysed"):
        list(verification_lines(configuration, analysed_sea / "later.nc"))
    with pytest.raises(SetdriftError, match=r"none\.nc: cannot be read; give a NetCDF file with the true fields"):
        list(verification_lines(configuration, analysed_sea / "none.nc"))
    shutil.rmtree(configuration.products)
    with pytest.raises(SetdriftError, match=r"daily\.zarr: cannot be read; run the workflow first"):
        list(verification_lines(configuration, path))


def test_band_of_land_is_left_out(configure: Configure, tmp_path: Path) -> None:
    write_sea(tmp_path, land=lambda _, lat: lat > 29.9)
    configuration = tiny(configure, period__end="2031-03-01")
    run_chain(configuration)
    lines = list(verification_lines(configuration, write_truth(configuration)))
    assert len(figures(lines, "20 to 30")) == 2
    assert figures(lines, "30 to 45") == []


def test_rows_at_the_edges_of_the_equatorial_band_are_compared(configure: Configure, tmp_path: Path) -> None:
    for day in days_between(tiny(configure).period.start, tiny(configure).period.start):
        write_day(tmp_path / "heron", day, (), (-38.0, 20.0, -10.0, 16.0), apart=2.0, step=0.5)
    write_mean(tmp_path / "mean.nc", np.arange(-45.0, -10.0, 0.5), np.arange(-20.0, 25.0, 0.5), slope=0.01)
    box = {"west": -32, "east": -24, "south": 0, "north": 9, "spacing": 0.5}
    configuration = tiny(configure, grid=box, mapping__window_days=1, period__end="2031-03-01")
    run_chain(configuration)
    path = configuration.products / "daily.zarr"
    with xr.open_zarr(path, chunks=None) as store:
        eastward = store["eastward_velocity"].load()
    with xr.open_zarr(path, chunks=None) as store:
        steps = np.abs(np.diff(store["eastward_velocity"].values, axis=1))
        between = (store.latitude.values[1:] + store.latitude.values[:-1]) / 2
    assert np.isfinite(eastward).all()
    edge = (np.abs(np.abs(between) - 4.0) < 0.5) | (np.abs(np.abs(between) - 6.0) < 0.5)
    inside = (np.abs(between) < 6.0) & ~edge
    truth = write_truth(configuration, level=0.01)
    with np.errstate(invalid="ignore", divide="ignore"):
        lines = list(verification_lines(configuration, truth))
    row = next(line for line in lines if line.startswith("eastward_velocity"))
    expected = [np.median(steps[:, edge]), steps[:, edge].max(), np.median(steps[:, inside]), steps[:, inside].max()]
    assert [float(word) for word in row.split()[1:]] == pytest.approx(expected, abs=6e-4)
