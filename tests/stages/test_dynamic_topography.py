"""Dynamic topography is the anomaly plus the mean."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from tiny_analysis import FIRST, STAGES, analysis_of, run_chain, tiny, write_mean

from setdrift.data.configuration import Configuration
from setdrift.data.fixed import load_fixed_fields
from setdrift.errors import SetdriftError

Configure = Callable[..., Configuration]


def test_it_is_the_sum(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    mean = load_fixed_fields(configuration)["mean_dynamic_topography"].values
    anomaly = analysis_of(configuration, "maps", FIRST)["sea_level_anomaly"].values
    topography = analysis_of(configuration, "dynamic_topography", FIRST)["dynamic_topography"]
    np.testing.assert_array_equal(topography.values, anomaly + mean)
    assert topography.dims == ("latitude", "longitude")


def test_changed_mean_remakes_what_follows_but_no_map(analysed_sea: Path, configure: Configure) -> None:
    write_mean(analysed_sea / "mean.nc", np.arange(-45.0, -10.0, 0.5), np.arange(15.0, 40.0, 0.5), slope=0.01)
    configuration = tiny(configure)
    made = run_chain(configuration)
    # without a land file the mean also tells land, on which the editing of observations depends
    assert {stage for stage in STAGES if made[stage]} == {"observations", "dynamic_topography", "currents", "eddies"}
    fields = load_fixed_fields(configuration)
    topography = analysis_of(configuration, "dynamic_topography", FIRST)["dynamic_topography"].values
    anomaly = analysis_of(configuration, "maps", FIRST)["sea_level_anomaly"].values
    np.testing.assert_allclose(topography - anomaly, fields["mean_dynamic_topography"], atol=1e-12)


def test_sea_without_a_mean_is_missing_in_the_topography_only(analysed_sea: Path, configure: Configure) -> None:
    write_mean(analysed_sea / "land.nc", np.arange(-45.0, -10.0, 0.5), np.arange(15.0, 40.0, 0.5), slope=0.0)
    write_mean(
        analysed_sea / "mean.nc",
        np.arange(-45.0, -10.0, 0.5),
        np.arange(15.0, 40.0, 0.5),
        land=lambda lon, _: lon > -26.9,
    )
    configuration = tiny(configure, land={"file": "land.nc", "variable": "mean"}, period__end="2031-03-01")
    with pytest.raises(SetdriftError, match=r"land\.nc: variable mean has units 'm', which are not 1"):
        run_chain(configuration)
    import netCDF4  # noqa: PLC0415 - only to mend the file just refused

    with netCDF4.Dataset(analysed_sea / "land.nc", "a") as file:
        file["mean"].units = "1"
    run_chain(configuration)
    topography = analysis_of(configuration, "dynamic_topography", FIRST)["dynamic_topography"]
    anomaly = analysis_of(configuration, "maps", FIRST)["sea_level_anomaly"]
    assert np.isfinite(anomaly).all()
    assert np.isnan(topography.sel(longitude=slice(-26.0, None))).all()
    assert np.isfinite(topography.sel(longitude=slice(None, -27.0))).all()
    currents = analysis_of(configuration, "currents", FIRST)
    assert np.isnan(currents["eastward_velocity"].sel(longitude=slice(-26.0, None))).all()
    assert np.isfinite(currents["eastward_velocity_anomaly"]).all()
