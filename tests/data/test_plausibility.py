"""A file in the wrong unit is refused as a whole, and told what its unit may be."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from altimeter_files import PLAIN, write_plain
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.data.alongtrack import AlongTrack, read_alongtrack
from setdrift.data.ancillary import LandMask
from setdrift.data.configuration import Editing
from setdrift.data.plausibility import FEWEST, check_scale
from setdrift.errors import SetdriftError

LAND = LandMask(np.tile([True, False], (2, 1)), np.array([0.0, 20.0]), np.array([-40.0, -20.0]))
SEA_LEVEL = 0.08 * np.random.default_rng(5).standard_normal(400)
WHERE = Path("day.nc")


def at_sea(values: Any, **replaced: Any) -> AlongTrack:
    count = len(values)
    columns = {"longitude": np.full(count, -22.0), "latitude": np.full(count, 9.0), "flagged": np.zeros(count, bool)}
    return AlongTrack(np.arange(float(count)), sea_level_anomaly=np.array(values), **columns | replaced)


def judge(track: AlongTrack, **limits: float) -> None:
    check_scale(WHERE, track, Editing(**limits), LAND)


@pytest.mark.parametrize(
    ("factor", "message"),
    [
        (1e3, r"robust spread of \S+ m.*1000 times smaller.*millimetres for metres"),
        (1e2, r"robust spread of \S+ m.*100 times smaller.*centimetres for metres"),
        (1e-3, r"varies by \S+ m only.*1000 times larger.*metres for millimetres"),
        (0.0, r"same sea level, 0 m, nearly everywhere"),
    ],
)
def test_a_wrong_unit_is_told(factor: float, message: str) -> None:
    judge(at_sea(SEA_LEVEL))
    with pytest.raises(SetdriftError, match=message):
        judge(at_sea(factor * SEA_LEVEL))


def test_a_file_of_millimetres_labelled_metres(tmp_path: Path) -> None:
    path = write_plain(tmp_path / "day.nc", 400, level=1000.0 * SEA_LEVEL, y=np.linspace(1, 19, 400))
    with pytest.raises(SetdriftError, match=r"day\.nc.*millimetres for metres"):
        check_scale(path, read_alongtrack(path, PLAIN), Editing(), LAND)


def test_land_flagged_and_missing_points_do_not_count() -> None:
    wild = np.concatenate([SEA_LEVEL, np.full(900, 50.0) * (-1.0) ** np.arange(900), np.full(30, np.nan)])
    longitude = np.where(np.arange(wild.size) < 400, -22.0, -38.0)
    judge(at_sea(wild, longitude=longitude))
    judge(at_sea(wild, flagged=np.arange(wild.size) >= 400))
    with pytest.raises(SetdriftError, match="robust spread"):
        judge(at_sea(wild))


@given(share=st.floats(0.0, 0.2), size=st.floats(1.0, 1e6))
@settings(deadline=None, derandomize=True, max_examples=40)
def test_one_wild_value_in_five_does_not_condemn_a_file(share: float, size: float) -> None:
    values = SEA_LEVEL.copy()
    values[: int(share * values.size)] = size
    judge(at_sea(values))


def test_the_limit_and_the_fewest_points() -> None:
    with pytest.raises(SetdriftError, match="robust spread"):
        judge(at_sea(SEA_LEVEL), largest_spread_m=0.05)
    judge(at_sea(1e3 * SEA_LEVEL[: FEWEST - 1]))
    with pytest.raises(SetdriftError, match="robust spread"):
        judge(at_sea(1e3 * SEA_LEVEL[:FEWEST]))
