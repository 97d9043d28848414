"""The demonstration's configuration, on the invented sea: what is edited is what was spoilt on purpose."""

from __future__ import annotations

import datetime as dt
from pathlib import Path

import numpy as np
import pytest

from setdrift.data.alongtrack import read_alongtrack
from setdrift.data.ancillary import LandMask
from setdrift.data.configuration import load_configuration
from setdrift.data.editing import Edited, edit
from setdrift.data.grids import observation_area
from setdrift.numerics.along_pass_noise import estimate_noise, pooled_noise
from synthetic_tracks import dialects, ocean, sampling, scenario

CONFIGURATION = load_configuration(Path(__file__).parents[2] / "config" / "tarn_sea.yaml")
DAYS = [dt.date(2031, 3, 2), dt.date(2031, 3, 12)]
AREA = observation_area(CONFIGURATION)


@pytest.fixture(scope="module")
def sea() -> tuple[scenario.Scenario, ocean.Ocean]:
    chosen = scenario.load(scenario.PACKAGED)
    return chosen, ocean.build(chosen)


def land_of(chosen: scenario.Scenario, truth: ocean.Ocean) -> LandMask:
    """Return the land on a fine grid."""
    latitude = np.arange(chosen.domain.south, chosen.domain.north, 0.05)
    longitude = np.arange(chosen.domain.west, chosen.domain.east, 0.05)
    lon, lat = np.meshgrid(longitude, latitude)
    return LandMask(truth.land.is_land(lon, lat), latitude, longitude)


@pytest.mark.parametrize("day", DAYS, ids=str)
@pytest.mark.parametrize("name", list(CONFIGURATION.altimeters))
def test_spikes_go_and_good_points_stay(
    sea: tuple[scenario.Scenario, ocean.Ocean], tmp_path: Path, name: str, day: dt.date
) -> None:
    chosen, truth = sea
    altimeter = next(a for a in chosen.altimeters if a.name == name)
    points = sampling.observe(chosen, truth, altimeter, day)
    path = tmp_path / name / "day.nc"
    path.parent.mkdir()
    dialects.write(path, altimeter, day, points)
    track = read_alongtrack(path, CONFIGURATION.altimeters[name])
    result = edit(track, CONFIGURATION.editing, land_of(chosen, truth), AREA)

    kept, order = matched(result, points)
    usable = ~points.land & AREA.holds(points.longitude, points.latitude)
    spiked = usable & (points.spike != 0.0)
    assert spiked.sum() >= 1
    assert not np.any(kept & spiked)
    # a mask of cells takes a few points of the coast; of the others, hardly one is taken for a spike
    land = land_of(chosen, truth)
    lost = usable & ~spiked & ~kept & ~land.is_land(points.longitude, points.latitude)
    assert np.count_nonzero(lost) <= 1
    assert not np.any(kept & points.land)
    # packing rounds by half of 0.5 mm, millimetres by half of 1 mm
    error = result.track.sea_level_anomaly - points.measured[order]
    assert np.abs(error).max() <= 0.000501
    true_pass = points.cycle[order] * 10000 + points.pass_number[order]
    found = result.track.pass_number
    assert len(set(zip(true_pass, found, strict=True))) == len(set(true_pass)) == len(set(found))


@pytest.mark.parametrize("name", list(CONFIGURATION.altimeters))
def test_noise_is_estimated_within_a_tenth(
    sea: tuple[scenario.Scenario, ocean.Ocean], tmp_path: Path, name: str
) -> None:
    chosen, truth = sea
    altimeter = next(a for a in chosen.altimeters if a.name == name)
    estimates = []
    for day in [*DAYS, dt.date(2031, 3, 17)]:
        path = tmp_path / f"{day}.nc"
        dialects.write(path, altimeter, day, sampling.observe(chosen, truth, altimeter, day))
        track = read_alongtrack(path, CONFIGURATION.altimeters[name])
        kept = edit(track, CONFIGURATION.editing, land_of(chosen, truth), AREA).track
        assert kept.pass_number is not None
        found = estimate_noise(kept.time, kept.sea_level_anomaly, kept.pass_number)
        assert found is not None
        estimates.append(found)
    pooled = pooled_noise(estimates)
    assert pooled is not None
    assert pooled.standard_deviation == pytest.approx(altimeter.noise_m, rel=0.1)


def matched(result: Edited, points: sampling.Observations) -> tuple[np.ndarray, np.ndarray]:
    """Return which true points were kept, and the true point of each one kept."""
    true_second = np.rint((points.day + 10957.0) * 86400.0).astype(np.int64)
    second = np.rint(result.track.time).astype(np.int64)
    return np.isin(true_second, second), np.searchsorted(true_second, second)
