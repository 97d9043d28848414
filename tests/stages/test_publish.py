"""What is published is what was worked out, rounded and cropped, over seas of every kind."""

from __future__ import annotations

import datetime as dt
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr
from tiny_analysis import (
    BOX,
    FIRST,
    HIGH,
    LOW,
    NOW,
    Vortex,
    analysis_of,
    run_chain,
    sea_level,
    silent,
    tiny,
    write_day,
    write_mean,
    write_sea,
)

from setdrift.data.configuration import Configuration
from setdrift.data.conventions import DAILY_VARIABLES, UNOBSERVED_LIMIT
from setdrift.data.days import days_between
from setdrift.errors import SetdriftError
from setdrift.stages.publish import publish_daily, publish_eddies

Configure = Callable[..., Configuration]
DAYS = days_between(FIRST, dt.date(2031, 3, 3))
TOMORROW = NOW + dt.timedelta(days=1)


def daily(configuration: Configuration) -> xr.Dataset:
    with xr.open_zarr(configuration.products / "daily.zarr", chunks=None) as store:
        return store.load()


def eddies(configuration: Configuration) -> xr.Dataset:
    with xr.open_datatree(configuration.products / "eddies.zarr", engine="zarr") as tree:
        return tree["detections"].to_dataset().load()


def marks(folder: Path) -> dict[str, int]:
    return {str(path): path.stat().st_ino for path in folder.rglob("*") if path.is_file()}


def test_store_holds_the_work_files_rounded_and_cropped(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    store = daily(configuration)
    assert (store.latitude.values[0], store.latitude.values[-1]) == (24.25, 30.75)
    assert (store.longitude.values[0], store.longitude.values[-1]) == (-31.75, -24.25)
    for n, day in enumerate(DAYS):
        assert str(store.time.values[n]).startswith(f"{day}T12:00")
        for variable in DAILY_VARIABLES:
            if variable.stage == "fixed":
                continue
            work = analysis_of(configuration, variable.stage, day)[variable.name]
            work = work.sel(latitude=slice(24, 31), longitude=slice(-32, -24)).values
            assert np.abs(store[variable.name].values[n] - work).max() <= variable.step / 2 * (1 + 1e-6)
    np.testing.assert_allclose(store.mean_dynamic_topography.values[:, 0], 0.02 * store.latitude.values, atol=1e-4)


def test_nothing_new_writes_nothing(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    before = marks(configuration.products)
    lines: list[str] = []
    publish_daily(configuration, TOMORROW, lines.append)
    publish_eddies(configuration, TOMORROW, lines.append)
    assert lines == ["0 days added, 0 days rewritten, 0 days retired", "6 detections on 3 days, unchanged"]
    assert marks(configuration.products) == before


def test_changed_day_is_rewritten_alone(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    before = daily(configuration)
    write_day(analysed_sea / "heron", dt.date(2031, 3, 5), (HIGH,))
    run_chain(configuration, TOMORROW)
    after = daily(configuration)
    assert after.revision.values.tolist() == [0, 0, 2]
    np.testing.assert_array_equal(after.sea_level_anomaly[:2], before.sea_level_anomaly[:2])
    assert not np.array_equal(after.sea_level_anomaly[2], before.sea_level_anomaly[2])
    record = json.loads((configuration.work / "published" / "daily.json").read_text())
    assert json.loads(after.attrs["source_digests"]) == record


def test_days_out_of_the_period_are_retired_by_name(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure, period__end="2031-03-02")
    lines: list[str] = []
    run_chain(configuration)
    run_chain(tiny(configure))
    period = configuration.work / "manifests" / "period.json"
    period.write_text('{"first": "2031-03-01", "last": "2031-03-02"}')
    publish_daily(configuration, TOMORROW, lines.append)
    assert lines == [
        "0 days added, 0 days rewritten, 1 days retired",
        "2031-03-03 retired: it is no longer in the analysed period",
    ]
    assert daily(configuration).sizes["time"] == 2


@pytest.mark.parametrize("key", ["source_digest", "settings_digest"])
def test_eddies_are_published_anew_for_another_source_or_setting(
    analysed_sea: Path, configure: Configure, key: str
) -> None:
    configuration = tiny(configure)
    path = configuration.products / "eddies.zarr" / "zarr.json"
    path.write_text(path.read_text().replace(f'"{key}": "', f'"{key}": "0'))
    before = marks(configuration.products / "eddies.zarr")
    publish_eddies(configuration, TOMORROW, silent)
    assert set(marks(configuration.products / "eddies.zarr").values()).isdisjoint(before.values())


def test_format_follows_the_configuration(analysed_sea: Path, configure: Configure) -> None:
    before = daily(tiny(configure)), eddies(tiny(configure))
    configuration = tiny(configure, publish__zarr_format=2)
    run_chain(configuration)
    for name in ("daily", "eddies"):
        assert (configuration.products / f"{name}.zarr" / ".zmetadata").exists()
        assert not (configuration.products / f"{name}.zarr" / "zarr.json").exists()
    xr.testing.assert_equal(daily(configuration), before[0])
    xr.testing.assert_equal(eddies(configuration), before[1])


def test_damaged_store_is_built_anew(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    before = daily(configuration), eddies(configuration)
    for name in ("daily", "eddies"):
        (configuration.products / f"{name}.zarr" / "zarr.json").write_text("{")
    publish_daily(configuration, NOW, silent)
    publish_eddies(configuration, NOW, silent)
    xr.testing.assert_identical(daily(configuration), before[0])
    xr.testing.assert_identical(eddies(configuration), before[1])


def test_damaged_work_file_is_told_and_the_stores_stay(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    before = marks(configuration.products)
    for stage in ("currents", "trajectories"):
        (configuration.work / stage / "2031-03-02.nc").write_bytes(b"\x89HDF\r\n")
    for receipt in (configuration.work / "currents").glob("*.json"):
        receipt.write_text(receipt.read_text().replace('"content": "', '"content": "0'))
    for publish, stage in ((publish_daily, "currents"), (publish_eddies, "trajectories")):
        told = rf"{stage}/2031-03-02\.nc: is missing or damaged; delete the \.json receipts"
        with pytest.raises(SetdriftError, match=told):
            publish(configuration, NOW, silent)
    assert marks(configuration.products) == before


# ----- seas of every kind -----


def analysed(
    configure: Configure,
    tmp_path: Path,
    vortices: tuple[Vortex, ...],
    area: tuple[float, ...],
    mean: Any,
    **changes: Any,
) -> Configuration:
    """Write three days of observations over an area, and analyse the middle one."""
    passes = changes.pop("passes", {})
    for day in days_between(FIRST - dt.timedelta(days=1), FIRST + dt.timedelta(days=1)):
        write_day(tmp_path / "heron", day, vortices, area, **passes)  # type: ignore[arg-type]
    write_mean(tmp_path / "mean.nc", *mean)
    configuration = tiny(configure, mapping__window_days=1, period__end="2031-03-01", **changes)
    run_chain(configuration)
    return configuration


def error_of(configuration: Configuration, vortices: tuple[Vortex, ...]) -> float:
    store = daily(configuration)
    assert np.isfinite(store.eastward_velocity).all()
    assert not store.map_quality.any()
    longitude, latitude = np.meshgrid(store.longitude, store.latitude)
    return float(np.abs(store.sea_level_anomaly[0] - sea_level(vortices, longitude, latitude, FIRST)).max())


@pytest.mark.parametrize(("west", "east"), [(176, -176), (176, 184), (-184, -176)])
def test_box_over_the_dateline(configure: Configure, tmp_path: Path, west: float, east: float) -> None:
    vortices = (Vortex(-179.6, 28.4), Vortex(178.2, 26.6, -0.2))
    mean = np.arange(0.0, 360.0, 0.5), np.arange(15.0, 40.0, 0.5)
    grid = {"west": west, "east": east, "south": 24, "north": 31, "spacing": 0.5}
    configuration = analysed(configure, tmp_path, vortices, (170.0, 20.0, 20.0, 35.0), mean, grid=grid)
    assert error_of(configuration, vortices) < 0.01
    assert daily(configuration).longitude.values[0] == west + 0.25
    found = eddies(configuration)
    assert found.polarity.values.tolist() == [-1, 1]
    assert ((found.longitude.values - west) % 360.0).tolist() == pytest.approx([2.2, 4.4], abs=0.1)


def test_southern_box(configure: Configure, tmp_path: Path) -> None:
    vortices = (Vortex(-29.6, -47.6), Vortex(-26.2, -49.4, -0.2))
    mean = np.arange(-45.0, -10.0, 0.5), np.arange(-60.0, -30.0, 0.5)
    grid = {"west": -32, "east": -24, "south": -52, "north": -45, "spacing": 0.5}
    configuration = analysed(configure, tmp_path, vortices, (-38.0, 20.0, -56.0, -41.0), mean, grid=grid)
    assert error_of(configuration, vortices) < 0.02
    assert eddies(configuration).polarity.values.tolist() == [-1, 1]
    store = daily(configuration).isel(time=0)
    # a high turns anticlockwise in the south: northward flow on its eastern side
    assert store.northward_velocity_anomaly.sel(latitude=-47.6, longitude=-28.6, method="nearest") > 0.1
    assert np.all(eddies(configuration).rossby_number.values * [-1, 1] < 0)


RING = {"mapping__zonal_scale_km": 700, "mapping__meridional_scale_km": 700, "eddies": {"maximum_radius_km": 800}}


def test_ring_round_the_globe_has_no_seam(configure: Configure, tmp_path: Path) -> None:
    # one eddy in the half cell west of the first column's centre, one far from the seam
    vortices = (Vortex(-179.5, 28.4, radius_km=250), Vortex(0.4, 30.0, -0.2, radius_km=250))
    mean = np.arange(-180.0, 180.0, 2.0), np.arange(9.0, 60.0, 2.0)
    area, passes = (-180.0, 360.0, 18.0, 42.0), {"apart": 4.0, "step": 0.5}
    ring = {"west": -180, "east": 180, "south": 24, "north": 36, "spacing": 2}
    configuration = analysed(configure, tmp_path, vortices, area, mean, grid=ring, passes=passes, **RING)
    assert error_of(configuration, vortices) < 0.01
    store, found = daily(configuration), eddies(configuration)
    assert store.longitude.size == 180
    assert found.polarity.values.tolist() == [1, -1]
    assert ((found.longitude.values + 180.0) % 360.0).tolist() == pytest.approx([0.5, 180.4], abs=0.3)
    # the same sea counted from Greenwich
    other = configure(**json.loads(json.dumps(BOX)) | {"output": "other", "grid": ring | {"west": 0, "east": 360}},
                      mapping__window_days=1, period__end="2031-03-01", **RING)  # fmt: skip
    run_chain(other)
    turned = daily(other).assign_coords(longitude=(daily(other).longitude + 180.0) % 360.0 - 180.0).sortby("longitude")
    for name in ("sea_level_anomaly", "eastward_velocity", "northward_velocity", "relative_vorticity"):
        np.testing.assert_allclose(turned[name], store[name], atol=2.0**-13)
    assert eddies(other).sizes["detection"] == 2


def test_box_that_nearly_goes_round(configure: Configure, tmp_path: Path) -> None:
    mean = np.arange(-180.0, 180.0, 2.0), np.arange(9.0, 60.0, 2.0)
    area, passes = (-180.0, 360.0, 18.0, 42.0), {"apart": 24.0, "step": 2.0}
    box = {"west": -180, "east": 174, "south": 24, "north": 36, "spacing": 2}
    configuration = analysed(configure, tmp_path, (), area, mean, grid=box, passes=passes)
    assert daily(configuration).longitude.size == 177
    assert eddies(configuration).sizes["detection"] == 0


def test_coast_is_missing_and_eddies_keep_off_it(configure: Configure, tmp_path: Path) -> None:
    write_sea(tmp_path, land=lambda lon, _: lon < -30.2)
    configuration = tiny(configure)
    run_chain(configuration)
    store = daily(configuration)
    land = store.land_fraction.values >= 0.5
    assert land.sum() == 14 * 4
    for variable in DAILY_VARIABLES:
        if variable.step and variable.stage != "fixed":
            values = store[variable.name].values
            assert np.isnan(values[:, land]).all()
            assert np.isfinite(values[:, ~land]).all() or variable.name in {"relative_vorticity", "rossby_number"}
    assert not store.velocity_method.values[:, land].any()
    # the high touches land: no closed contour; the low is clear of it
    assert set(eddies(configuration).polarity.values.tolist()) == {-1}


def test_sea_without_any_observation(configure: Configure, tmp_path: Path) -> None:
    write_day(tmp_path / "heron", dt.date(2031, 1, 1), (HIGH, LOW))
    write_mean(tmp_path / "mean.nc", np.arange(-45.0, -10.0, 0.5), np.arange(15.0, 40.0, 0.5))
    configuration = tiny(configure, mapping__large_scale_m=0.2)
    run_chain(configuration)
    store = daily(configuration)
    assert store.sizes["time"] == 3
    assert not store.sea_level_anomaly.any()
    prior = np.hypot(0.15, 0.2)
    np.testing.assert_allclose(store.sea_level_anomaly_error, prior, atol=1e-4)
    assert prior > UNOBSERVED_LIMIT * prior
    assert np.all(store.map_quality == 1)
    assert not store.observation_count.any()
    assert not store.eastward_velocity_anomaly.any()
    # the mean's own flow is there
    assert np.all(store.eastward_velocity < -0.02)
    assert np.isfinite(store.dynamic_topography).all()
    found = eddies(configuration)
    assert found.sizes["detection"] == found.sizes["trajectory"] == 0
    assert run_chain(configuration)["maps"] == set()


def test_days_of_the_window_without_observations_leave_the_others_standing(
    configure: Configure, tmp_path: Path
) -> None:
    write_sea(tmp_path, days=3)  # 27 February to 1 March
    configuration = tiny(configure)
    run_chain(configuration)
    error = daily(configuration).sea_level_anomaly_error.mean(("latitude", "longitude")).values
    assert np.all(np.diff(error) > 0)
    assert error[0] < 0.02
