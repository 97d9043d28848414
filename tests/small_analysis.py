"""The smallest configuration that the tests change keys of."""

from __future__ import annotations

from typing import Any

SMALL_ANALYSIS: dict[str, Any] = {
    "analysis": "small_sea",
    "output": "results",
    "period": {"start": "2031-03-01", "end": "2031-03-03"},
    "grid": {"west": -30, "east": -26, "south": 8, "north": 11, "spacing": 0.5},
    "altimeters": {"heron": {"files": "heron/*.nc", "noise_m": 0.02}},
    "mean_dynamic_topography": {"file": "mean.nc"},
    "land": {"file": "land.nc"},
    "mapping": {"window_days": 2},
    "block_days": 2,
}
