"""Mean dynamic topography and land on the working grid."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from altimeter_files import write_land
from tiny_analysis import silent, tiny, write_mean

from setdrift.data.configuration import Configuration
from setdrift.data.fixed import fixed_digest, load_fixed_fields
from setdrift.data.grids import analysis_grid, working_grid
from setdrift.errors import SetdriftError
from setdrift.stages.fixed_fields import prepare_fixed_fields

Configure = Callable[..., Configuration]
LONGITUDE, LATITUDE = np.arange(-45.0, -10.0, 0.5), np.arange(15.0, 40.0, 0.5)


def prepared(configuration: Configuration) -> Any:
    prepare_fixed_fields(configuration, silent)
    return load_fixed_fields(configuration)


def test_linear_mean_is_carried_over_exactly(configure: Configure, tmp_path: Path) -> None:
    write_mean(tmp_path / "mean.nc", LONGITUDE, LATITUDE, slope=0.02)
    configuration = tiny(configure)
    fields = prepared(configuration)
    grid = working_grid(configuration)
    assert fields["mean_dynamic_topography"].shape == grid.shape
    expected = np.broadcast_to(0.02 * grid.latitude[:, None], grid.shape)
    np.testing.assert_allclose(fields["mean_dynamic_topography"], expected, atol=1e-12)
    assert not fields["land_fraction"].values.any()


def test_without_land_file_land_is_where_the_mean_is_missing(configure: Configure, tmp_path: Path) -> None:
    write_mean(tmp_path / "mean.nc", LONGITUDE, LATITUDE, land=lambda lon, _: lon < -29.9)
    fields = prepared(tiny(configure))
    # the mean's last cell of land ends at -29.75, in the middle of a cell of the grid: half counts as land
    west = fields["longitude"].values < -29.7
    land = np.where(fields["longitude"].values < -30.0, 1.0, np.where(west, 0.5, 0.0))
    np.testing.assert_allclose(fields["land_fraction"], np.broadcast_to(land, fields["land_fraction"].shape))
    assert np.isnan(fields["mean_dynamic_topography"].values[:, west]).all()
    assert np.isfinite(fields["mean_dynamic_topography"].values[:, ~west]).all()


def test_land_fraction_counts_the_part_of_a_cell(configure: Configure, tmp_path: Path) -> None:
    write_land(tmp_path / "land.nc", west_of=-28.0)
    write_mean(tmp_path / "mean.nc", LONGITUDE, np.arange(0.0, 40.0, 0.5))
    box = {"west": -32, "east": -24, "south": 8, "north": 16, "spacing": 1}
    fields = prepared(tiny(configure, land={"file": "land.nc"}, grid=box))
    # cells of the mask are a quarter degree wide and centred on -28.25, -28, ...: land ends at -28.125
    np.testing.assert_allclose(fields["land_fraction"].sel(longitude=-28.5, latitude=10.5), 5.0 / 6.0)
    np.testing.assert_array_equal(fields["land_fraction"].sel(longitude=[-29.5, -27.5]).isel(latitude=5), [1.0, 0.0])


def test_sea_a_cell_beyond_the_source_is_filled_and_the_rest_is_missing(configure: Configure, tmp_path: Path) -> None:
    write_land(tmp_path / "land.nc", west_of=-60.0)
    fine = np.arange(-45.0, -10.0, 0.25)
    write_mean(tmp_path / "mean.nc", fine, np.arange(0.0, 40.0, 0.5), land=lambda lon, _: lon < -28.9)
    box = {"west": -32, "east": -24, "south": 8, "north": 12, "spacing": 0.5}
    lines: list[str] = []
    configuration = tiny(configure, land={"file": "land.nc"}, grid=box)
    prepare_fixed_fields(configuration, lines.append)
    mean = load_fixed_fields(configuration)["mean_dynamic_topography"]
    # the last value lies at -28.75: 55 km from one column, 109 km from the next
    assert np.isfinite(mean.sel(longitude=-29.25)).all()
    assert np.isnan(mean.sel(longitude=-29.75)).all()
    missing = int(np.isnan(mean).sum())
    assert lines == [f"{mean.size} sea points, {missing} of them without mean dynamic topography"]


def test_box_without_sea_is_told(configure: Configure, tmp_path: Path) -> None:
    write_mean(tmp_path / "mean.nc", LONGITUDE, LATITUDE, land=lambda lon, _: lon < -15)
    with pytest.raises(SetdriftError, match=r"small_sea\.yaml: grid: the box holds no sea; move the box or change lan"):
        prepared(tiny(configure))


def test_mean_of_another_region_is_told(configure: Configure, tmp_path: Path) -> None:
    write_mean(tmp_path / "mean.nc", LONGITUDE + 90.0, LATITUDE)
    with pytest.raises(SetdriftError, match=r"mean\.nc: has no value at any sea point of the box; give a mean"):
        prepared(tiny(configure))


def test_digests_tell_mean_from_land(configure: Configure, tmp_path: Path) -> None:
    configuration = tiny(configure)

    def digests(**how: Any) -> tuple[str, str]:
        write_mean(tmp_path / "mean.nc", LONGITUDE, LATITUDE, **how)
        prepared(configuration)
        return tuple(fixed_digest(configuration, name) for name in ("mean_dynamic_topography", "land_fraction"))  # type: ignore[return-value]

    mean, land = digests()
    assert digests() == (mean, land)
    steeper, same = digests(slope=0.03)
    assert (steeper != mean, same == land) == (True, True)
    assert digests(land=lambda lon, _: lon < -29)[1] != land


def test_mean_round_the_globe_has_no_seam(configure: Configure, tmp_path: Path) -> None:
    write_mean(tmp_path / "mean.nc", np.arange(0.5, 360.0, 1.0), np.arange(10.0, 60.0, 1.0))
    ring = {"west": -180, "east": 180, "south": 24, "north": 36, "spacing": 2}
    fields = prepared(tiny(configure, grid=ring))
    expected = np.broadcast_to(0.02 * fields["latitude"].values[:, None], fields["land_fraction"].shape)
    np.testing.assert_allclose(fields["mean_dynamic_topography"], expected, atol=1e-12)


@pytest.mark.parametrize("damage", ["missing", "cut"])
def test_damaged_fields_are_told(configure: Configure, tmp_path: Path, damage: str) -> None:
    write_mean(tmp_path / "mean.nc", LONGITUDE, LATITUDE)
    configuration = tiny(configure)
    prepared(configuration)
    path = configuration.work / "fixed" / "fields.nc"
    path.write_bytes(path.read_bytes()[:300]) if damage == "cut" else path.unlink()
    with pytest.raises(SetdriftError, match=r"fields\.nc: is missing or damaged; delete it and run the workflow again"):
        load_fixed_fields(configuration)
    (configuration.work / "fixed" / "fields.json").write_text("{")
    with pytest.raises(SetdriftError, match=r"fields\.json: is missing or damaged"):
        fixed_digest(configuration, "land_fraction")
    prepared(configuration)
    assert json.loads((configuration.work / "fixed" / "fields.json").read_text()).keys() == {
        "mean_dynamic_topography",
        "land_fraction",
    }


def test_working_grid_holds_the_analysis_grid(configure: Configure) -> None:
    configuration = tiny(configure)
    outer, inner = working_grid(configuration), analysis_grid(configuration)
    rows, columns = outer.window(inner)
    np.testing.assert_allclose(outer.latitude[rows], inner.latitude)
    np.testing.assert_allclose(outer.longitude[columns], inner.longitude)
    assert (rows.start, columns.start) == (4, 4)
