"""Currents of the small sea balance its sea level."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable
from pathlib import Path

import numpy as np
from tiny_analysis import FIRST, HIGH, LOW, Vortex, analysis_of, run_chain, sea_level, tiny, write_day, write_mean

from setdrift.data.configuration import Configuration
from setdrift.data.days import days_between
from setdrift.numerics.derivatives import relative_vorticity
from setdrift.numerics.geostrophy import VelocityMethod, geostrophic_velocity, rossby_number
from setdrift.stages.currents import equatorial_band

Configure = Callable[..., Configuration]


def test_they_are_what_the_numerics_make_of_the_maps(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    band = equatorial_band(configuration.currents)
    topography = analysis_of(configuration, "dynamic_topography", FIRST)["dynamic_topography"]
    anomaly = analysis_of(configuration, "maps", FIRST)["sea_level_anomaly"].values
    latitude, longitude = topography["latitude"].values, topography["longitude"].values
    whole = geostrophic_velocity(topography.values, latitude, longitude, band=band)
    part = geostrophic_velocity(anomaly, latitude, longitude, band=band)
    vorticity = relative_vorticity(whole.eastward, whole.northward, latitude, longitude)
    expected = {
        "eastward_velocity": whole.eastward,
        "northward_velocity": whole.northward,
        "eastward_velocity_anomaly": part.eastward,
        "northward_velocity_anomaly": part.northward,
        "relative_vorticity": vorticity,
        "rossby_number": rossby_number(vorticity, latitude),
        "velocity_method": whole.method,
    }
    found = analysis_of(configuration, "currents", FIRST)
    assert set(found.data_vars) == set(expected)
    for name, values in expected.items():
        np.testing.assert_array_equal(found[name].values, values)


def test_water_goes_round_a_high_clockwise_in_the_north(analysed_sea: Path, configure: Configure) -> None:
    found = analysis_of(tiny(configure), "currents", FIRST)
    for vortex in (HIGH, LOW):
        turn = np.sign(vortex.height)
        beside = found.sel(
            latitude=vortex.latitude, longitude=[vortex.longitude - 1, vortex.longitude + 1], method="nearest"
        )
        above = found.sel(
            longitude=vortex.longitude, latitude=[vortex.latitude - 1, vortex.latitude + 1], method="nearest"
        )
        np.testing.assert_array_equal(np.sign(beside["northward_velocity_anomaly"]), [turn, -turn])
        np.testing.assert_array_equal(np.sign(above["eastward_velocity_anomaly"]), [-turn, turn])
        # a Gaussian's fastest flow is g h / (f r) exp(-1/2); the grid of half a degree sees 10 % less
        speed = np.hypot(found["eastward_velocity_anomaly"], found["northward_velocity_anomaly"])
        f = 2 * 7.2921e-5 * np.sin(np.deg2rad(vortex.latitude))
        near = speed.sel(
            latitude=slice(vortex.latitude - 1.5, vortex.latitude + 1.5),
            longitude=slice(vortex.longitude - 1.5, vortex.longitude + 1.5),
        )
        fastest = 9.8 * abs(vortex.height) / (f * vortex.radius_km * 1e3) * np.exp(-0.5)
        assert 0.8 * fastest < float(near.max()) < 1.1 * fastest


def test_mean_slope_is_the_whole_less_the_anomaly(analysed_sea: Path, configure: Configure) -> None:
    found = analysis_of(tiny(configure), "currents", FIRST)
    mean_flow = found["eastward_velocity"] - found["eastward_velocity_anomaly"]
    f = 2 * 7.2921e-5 * np.sin(np.deg2rad(found["latitude"]))
    # sea level rising northward by 2 cm a degree drives water west
    np.testing.assert_allclose(mean_flow.mean("longitude"), -9.79 / f * 0.02 / 110.85e3, rtol=0.01)
    np.testing.assert_allclose(found["northward_velocity"], found["northward_velocity_anomaly"], atol=1e-6)


def test_working_grid_reaches_over_the_whole_band_near_the_equator(tmp_path: Path, configure: Configure) -> None:
    vortices = (Vortex(-29.6, 5.6), Vortex(-26.2, 2.4, -0.1))
    for day in days_between(FIRST, FIRST):
        write_day(tmp_path / "heron", day, vortices, (-38.0, 20.0, -14.0, 16.0), apart=0.5, step=0.3)
    write_mean(tmp_path / "mean.nc", np.arange(-45.0, -10.0, 0.5), np.arange(-25.0, 25.0, 0.5), slope=0.0)
    box = {"west": -32, "east": -24, "south": 1, "north": 9, "spacing": 0.5}
    configuration = tiny(configure, grid=box, mapping__window_days=1, period__end="2031-03-01")
    run_chain(configuration)
    found = analysis_of(configuration, "currents", FIRST)
    assert found["latitude"].values[0] == -5.75
    methods = {m: np.flatnonzero((found["velocity_method"] == m).all("longitude")) for m in VelocityMethod}
    latitude = np.abs(found["latitude"].values)
    assert np.all(latitude[methods[VelocityMethod.BETA_PLANE]] <= 4.0)
    assert np.all(latitude[methods[VelocityMethod.F_PLANE]] >= 6.0)
    assert methods[VelocityMethod.BETA_PLANE].size == 16
    assert methods[VelocityMethod.BLENDED].size == 8
    assert np.isfinite(found["eastward_velocity"]).all()
    level = analysis_of(configuration, "maps", FIRST)["sea_level_anomaly"]
    longitude, latitudes = np.meshgrid(level["longitude"], level["latitude"])
    assert np.abs(level - sea_level(vortices, longitude, latitudes, FIRST)).max() < 0.03


def test_band_is_the_configured_one(configure: Configure) -> None:
    settings = tiny(configure, currents={"band_degrees": 7, "blend_from_degrees": 3, "blend_to_degrees": 5}).currents
    band = equatorial_band(settings)
    assert {"half_width": 7.0, "inner": 3.0, "outer": 5.0}.items() <= dataclasses.asdict(band).items()
