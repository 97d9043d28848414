"""Files whose sea level cannot be in the unit they say: set aside as a whole."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np

from setdrift.data.alongtrack import AlongTrack
from setdrift.data.ancillary import LandMask
from setdrift.data.configuration import Editing
from setdrift.data.netcdf import Floats
from setdrift.errors import SetdriftError
from setdrift.numerics.spikes import NORMAL_SCALE

FEWEST = 50
"""In fewer points of a file nothing can be told."""

USUAL_SPREAD_M = 0.1
"""What a spread in the right unit is about: common practice, no source."""

SMALLEST_RANGE_M = 1e-3
"""Range of the middle 98 % of values that the noise of any altimeter exceeds by far: common practice, no source."""

NORMAL_RANGE = 4.653
"""The middle 98 % of a normal law, in its standard deviations."""

MISTAKES = {
    1e-3: "1000 times smaller than its units say (millimetres for metres, perhaps)",
    1e-2: "100 times smaller than its units say (centimetres for metres, perhaps)",
    1e2: "100 times larger than its units say (metres for centimetres, perhaps)",
    1e3: "1000 times larger than its units say (metres for millimetres, perhaps)",
}


def check_scale(path: Path, track: AlongTrack, settings: Editing, land: LandMask) -> None:
    """Refuse a file whose sea level varies far too much, or hardly at all.

    Unflagged points at sea are judged; the spread is 1.4826 times the median absolute deviation, which neither
    spikes nor fill values in disguise can raise much.

    Parameters
    ----------
    path : Path
        The file, for the message.
    track : AlongTrack
        All its observations.
    settings : Editing
        Gives the largest spread.
    land : LandMask
        Where land is.

    Raises
    ------
    SetdriftError
        The spread is above the limit, or the values are all but constant.
    """
    at_sea = ~track.flagged & np.isfinite(track.sea_level_anomaly) & np.isfinite(track.longitude + track.latitude)
    at_sea[at_sea] = ~land.is_land(track.longitude[at_sea], track.latitude[at_sea])
    values = track.sea_level_anomaly[at_sea]
    if values.size < FEWEST:
        return
    spread = _spread(values)
    low, high = np.percentile(values, (1.0, 99.0))
    if spread > settings.largest_spread_m:
        what = f"has sea level with a robust spread of {spread:.3g} m; its unit is probably {_mistake(spread)}"
        raise SetdriftError(str(path), what, "correct the units attribute, or name the variable with the anomaly")
    if high == low:
        raise SetdriftError(str(path), f"has the same sea level, {low:g} m, nearly everywhere", "replace the file")
    if high - low < SMALLEST_RANGE_M:
        mistake = _mistake((high - low) / NORMAL_RANGE)
        what = f"has sea level that varies by {high - low:.1g} m only; its unit is probably {mistake}"
        raise SetdriftError(str(path), what, "correct the units attribute, or replace the file")


def _spread(values: Floats) -> float:
    return float(NORMAL_SCALE * np.median(abs(values - np.median(values))))


def _mistake(spread: float) -> str:
    factor = min(MISTAKES, key=lambda factor: abs(math.log(spread * factor / USUAL_SPREAD_M)))
    return MISTAKES[factor]
