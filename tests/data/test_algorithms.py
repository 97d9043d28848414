"""Each stage's digest changes with what the stage reads, and with nothing else."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from setdrift.data import algorithms
from setdrift.data.algorithms import TRACKING_KEYS, VERSIONS, settings_digest
from setdrift.data.configuration import Configuration, Eddies

Configure = Callable[..., Configuration]
ON_THE_GRID = {"fixed", "maps", "eddies", "daily", "eddy_product"}


def changed(configure: Configure, **changes: Any) -> set[str]:
    before, after = configure(), configure(**changes)
    return {stage for stage in VERSIONS if settings_digest(before, stage) != settings_digest(after, stage)}


@pytest.mark.parametrize(
    ("changes", "stages"),
    [
        ({"analysis": "other"}, set()),
        ({"output": "elsewhere"}, set()),
        ({"period__end": "2031-03-09"}, set()),
        ({"block_days": 5}, set()),
        ({"altimeters__heron__files": "h/*.nc"}, set()),
        ({"altimeters__heron__noise_m": 0.05}, {"maps"}),
        ({"altimeters__heron__subtract": ["tide"]}, {"observations"}),
        ({"altimeters__heron__good": {"variable": "bits", "values": [0]}}, {"observations"}),
        ({"altimeters__plover": {"files": "p/*.nc"}}, {"observations", "maps"}),
        ({"editing": {"spike_limit": 4}}, {"observations"}),
        ({"mapping__window_days": 3}, {"maps"}),
        ({"mapping__zonal_scale_km": 900}, {"maps", "observations"}),
        ({"currents": {"blend_from_degrees": 3}}, {"currents"}),
        ({"eddies": {"gate_km": 100}}, {"trajectories"}),
        ({"eddies": {"gap_days": 2}}, {"trajectories"}),
        ({"eddies": {"minimum_amplitude_m": 0.05}}, {"eddies"}),
        ({"publish": {"zarr_format": 2}}, {"daily", "eddy_product"}),
        ({"mean_dynamic_topography__variable": "mean"}, {"fixed"}),
        ({"land__variable": "land"}, {"fixed", "observations"}),
        ({"depth": {"file": "a.nc"}}, {"observations"}),
        ({"grid__north": 12}, ON_THE_GRID | {"observations"}),
        ({"grid__spacing": 0.25}, ON_THE_GRID | {"observations"}),
    ],
    ids=str,
)
def test_setting_changes_the_stages_that_read_it(
    configure: Configure, changes: dict[str, Any], stages: set[str]
) -> None:
    assert changed(configure, **changes) == stages


@pytest.mark.parametrize("stage", VERSIONS)
def test_version_changes_its_own_stage(configure: Configure, stage: str, monkeypatch: pytest.MonkeyPatch) -> None:
    before = {name: settings_digest(configure(), name) for name in VERSIONS}
    monkeypatch.setitem(algorithms.VERSIONS, stage, VERSIONS[stage] + 1)
    assert {name for name in VERSIONS if settings_digest(configure(), name) != before[name]} == {stage}


def test_tracking_keys_are_settings_of_eddies() -> None:
    assert set(Eddies.model_fields) >= TRACKING_KEYS


def test_no_two_stages_share_a_digest(configure: Configure) -> None:
    assert len({settings_digest(configure(), stage) for stage in VERSIONS}) == len(VERSIONS)
