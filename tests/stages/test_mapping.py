"""Maps of the small sea: right, and made again only where something they depend on changed."""

from __future__ import annotations

import datetime as dt
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from tiny_analysis import (
    BOX,
    FIRST,
    HIGH,
    LOW,
    STAGES,
    Vortex,
    analysis_of,
    run_chain,
    sea_level,
    silent,
    tiny,
    write_day,
    write_sea,
)

from setdrift.data.algorithms import SETTINGS, VERSIONS, settings_digest
from setdrift.data.configuration import Configuration
from setdrift.data.conventions import MapQuality
from setdrift.data.days import Block
from setdrift.data.grids import working_grid
from setdrift.errors import SetdriftError
from setdrift.numerics.optimal_interpolation import map_sea_level
from setdrift.numerics.superobservations import SeaLevelObservations
from setdrift.stages.mapping import map_block, mapping_settings

Configure = Callable[..., Configuration]
ALL = {"2031-03-01", "2031-03-02", "2031-03-03"}
NOTHING: dict[str, set[str]] = {stage: set() for stage in STAGES}


def test_planted_eddies_are_recovered(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    grid = working_grid(configuration)
    longitude, latitude = np.meshgrid(grid.longitude, grid.latitude)
    for n in range(3):
        day = FIRST + dt.timedelta(days=n)
        mapped = analysis_of(configuration, "maps", day)
        difference = mapped["sea_level_anomaly"].values - sea_level((HIGH, LOW), longitude, latitude, day)
        # eddies of 20 and 25 cm; measured 4 mm at most and 1 mm as a rule, with noise of 5 mm expected
        assert np.abs(difference).max() < 0.008
        assert np.sqrt(np.mean(difference**2)) < 0.002
        assert np.all(mapped["sea_level_anomaly_error"] < 0.02)
        assert not mapped["map_quality"].values.any()
        assert mapped["observation_count"].values.min() > 500


def test_map_is_what_the_numerics_make_of_the_window(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    grid = working_grid(configuration)
    window = [analysis_of(configuration, "observations", FIRST + dt.timedelta(days=n)) for n in range(-2, 3)]

    def column(name: str) -> Any:
        return np.concatenate([day[name].values for day in window])

    count = column("time").size
    observations = SeaLevelObservations(
        column("longitude"), column("latitude"), column("time") / 86400.0, column("sea_level_anomaly"),
        np.full(count, 0.005**2), np.zeros(count, np.int64), column("pass_number"), np.ones(count, np.int64),
    )  # fmt: skip
    noon = (FIRST - dt.date(1970, 1, 1)).days + 0.5
    sea = np.ones(grid.shape, bool)
    expected = map_sea_level(observations, grid.latitude, grid.longitude, sea, noon, mapping_settings(configuration))
    mapped = analysis_of(configuration, "maps", FIRST)
    np.testing.assert_array_equal(mapped["sea_level_anomaly"], expected.estimate)
    np.testing.assert_array_equal(mapped["sea_level_anomaly_error"], expected.error)


def test_nothing_changed_makes_nothing(analysed_sea: Path, configure: Configure) -> None:
    assert run_chain(tiny(configure)) == NOTHING


@pytest.mark.parametrize(
    ("day", "mapped"),
    [
        ("2031-02-27", {"2031-03-01"}),
        ("2031-02-28", {"2031-03-01", "2031-03-02"}),
        ("2031-03-02", ALL),
        ("2031-03-05", {"2031-03-03"}),
    ],
)
def test_changed_observations_remake_the_days_in_reach(
    analysed_sea: Path, configure: Configure, day: str, mapped: set[str]
) -> None:
    write_day(analysed_sea / "heron", dt.date.fromisoformat(day), (HIGH,))
    made = run_chain(tiny(configure))
    assert made["observations"] == {day}
    for stage in ("maps", "dynamic_topography", "currents", "eddies"):
        assert made[stage] == mapped
    # what follows is linked again even where its own eddies are as before
    assert made["trajectories"] == {d for d in ALL if d >= min(mapped)}


def test_touched_and_renamed_files_remake_nothing(analysed_sea: Path, configure: Configure) -> None:
    (analysed_sea / "heron" / "2031-03-01.nc").touch()
    (analysed_sea / "heron" / "2031-03-02.nc").rename(analysed_sea / "heron" / "renamed.nc")
    assert run_chain(tiny(configure)) == NOTHING


@pytest.mark.parametrize(
    ("changes", "stages", "digests"),
    [
        ({"mapping__signal_m": 0.2}, STAGES[1:], {"maps"}),
        ({"altimeters__heron__noise_m": 0.006}, STAGES[1:], {"maps"}),
        ({"altimeters__heron__files": "heron/*-*.nc"}, (), set()),
        ({"currents__blend_from_degrees": 3.5}, ("currents",), {"currents"}),
        ({"eddies__equatorial_exclusion_degrees": 2}, ("eddies",), {"eddies"}),
        ({"eddies__minimum_amplitude_m": 0.22}, ("eddies", "trajectories"), {"eddies"}),
        ({"eddies__field": "dynamic_topography"}, ("eddies", "trajectories"), {"eddies"}),
        ({"eddies__gap_days": 4}, ("trajectories",), {"trajectories"}),
        ({"publish__licence": "free"}, (), {"daily", "eddy_product"}),
        ({"editing__spike_floor_m": 0.2}, ("observations",), {"observations"}),
        ({"block_days": 3}, (), set()),
    ],
    ids=str,
)
def test_changed_setting_remakes_what_reads_it(
    analysed_sea: Path, configure: Configure, changes: dict[str, Any], stages: tuple[str, ...], digests: set[str]
) -> None:
    before, after = tiny(configure), tiny(configure, **changes)
    assert {s for s in VERSIONS if settings_digest(before, s) != settings_digest(after, s)} == digests
    made = run_chain(after)
    assert {stage for stage in STAGES if made[stage]} == set(stages)
    assert all(made[stage] >= ALL for stage in stages)


def test_every_version_and_setting_belongs_to_a_stage() -> None:
    assert set(SETTINGS) <= set(VERSIONS)


def test_longer_period_makes_the_new_days_only(analysed_sea: Path, configure: Configure) -> None:
    made = run_chain(tiny(configure, period={"start": "2031-03-01", "end": "2031-03-04"}))
    assert made["observations"] == {"2031-03-06"}
    assert all(made[stage] == {"2031-03-04"} for stage in STAGES[1:])


def test_changed_land_remakes_maps(analysed_sea: Path, configure: Configure) -> None:
    write_sea(analysed_sea, land=lambda lon, _: lon < -30.2)
    configuration = tiny(configure)
    made = run_chain(configuration)
    assert all(made[stage] == ALL for stage in STAGES[1:])
    mapped = analysis_of(configuration, "maps", FIRST)
    land = mapped["longitude"].values < -30.2
    assert np.isnan(mapped["sea_level_anomaly"].values[:, land]).all()
    assert np.isfinite(mapped["sea_level_anomaly"].values[:, ~land]).all()
    assert not mapped["observation_count"].values[:, land].any()
    assert np.all(mapped["map_quality"].values[:, land] == MapQuality.LAND)
    assert not mapped["map_quality"].values[:, ~land].any()


@pytest.mark.parametrize("stage", STAGES)
@pytest.mark.parametrize("damage", ["missing", "cut", "empty"])
def test_damaged_day_is_made_again_by_its_own_stage_and_nothing_else(
    analysed_sea: Path, configure: Configure, stage: str, damage: str
) -> None:
    configuration = tiny(configure)
    path = configuration.work / stage / "2031-03-02.nc"
    content = path.read_bytes()
    path.unlink()
    if damage != "missing":
        path.write_bytes(content[: len(content) // 2] if damage == "cut" else b"")
    made = run_chain(configuration)
    # a state that trajectories go on from is the same again, so the days after it are not linked again
    assert made == NOTHING | {stage: {"2031-03-02"}}


def test_damaged_input_is_told_with_what_to_do(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure, mapping__signal_m=0.2)
    path = configuration.work / "observations" / "2031-03-02.nc"
    path.write_bytes(path.read_bytes()[:500])
    block = Block.holding(FIRST, 2)
    with pytest.raises(SetdriftError, match=r"2031-03-02\.nc: is missing or damaged; delete the \.json receipts in"):
        map_block(configuration, block, silent)
    receipt = configuration.work / "observations" / f"{block.label}.json"
    receipt.unlink()
    with pytest.raises(SetdriftError, match=rf"{block.label}\.json: is missing or damaged; delete it and run"):
        map_block(configuration, block, silent)


def test_block_without_analysed_days_is_told(analysed_sea: Path, configure: Configure) -> None:
    block = Block.holding(dt.date(2031, 5, 1), 2)
    with pytest.raises(
        SetdriftError, match=rf"block {block.label}: holds no analysed day \(2031-03-01 to 2031-03-03\)"
    ):
        map_block(tiny(configure), block, silent)


def test_receipts_that_lack_a_day_are_told(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    block = Block.holding(FIRST, 2)
    (configuration.work / "observations" / f"{block.label}.json").write_text('{"days": {}}')
    with pytest.raises(SetdriftError, match=r"observations: receipts lack \d day\(s\), first 2031-0\d-\d\d; run the"):
        map_block(configuration, block, silent)


def test_two_altimeters_keep_their_own_noise(tmp_path: Path, configure: Configure) -> None:
    # a hump of 4 mm keeps heron's files from being set aside as constant
    write_sea(tmp_path, vortices=(Vortex(HIGH.longitude, HIGH.latitude, height=0.004, radius_km=400.0),))
    for n in range(-2, 5):
        write_day(tmp_path / "plover", FIRST + dt.timedelta(days=n), (HIGH,))
    both = BOX["altimeters"] | {"plover": {"files": "plover/*.nc", "noise_m": 0.2}}
    configuration = tiny(configure, altimeters=both, period={"start": "2031-03-01", "end": "2031-03-01"})
    run_chain(configuration)
    # plover sees an eddy that heron does not, and counts for (0.005 / 0.2)^2 of it
    assert np.abs(analysis_of(configuration, "maps", FIRST)["sea_level_anomaly"]).max() < 0.01
    shutil.rmtree(configuration.work)
    both["heron"], both["plover"] = both["heron"] | {"noise_m": 0.2}, both["plover"] | {"noise_m": 0.005}
    configuration = tiny(configure, altimeters=both, period={"start": "2031-03-01", "end": "2031-03-01"})
    run_chain(configuration)
    assert np.abs(analysis_of(configuration, "maps", FIRST)["sea_level_anomaly"]).max() > 0.2
