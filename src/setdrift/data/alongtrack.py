"""Along-track altimeter files: whatever their dialect, the same arrays in the same units."""

from __future__ import annotations

import dataclasses
import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
from numpy.typing import NDArray

from setdrift.data.configuration import Altimeter, GoodValues
from setdrift.data.days import from_day_number
from setdrift.data.netcdf import Floats, find_variable, floats, in_units, opened, seconds_since_1970
from setdrift.errors import SetdriftError

DAY_S = 86400.0
LAST_TIME_S = 230 * 365.25 * DAY_S  # year 2200: times are believed from 1970 to here
STRAY_SPANS = 10.0  # a time so many spans of its file (5th to 95th percentile) off the median is not believed

# role: (standard names, axis). The second name of sea level is the older CF alias of the first.
STANDARD_NAMES: dict[str, tuple[tuple[str, ...], str]] = {
    "time": (("time",), "T"),
    "latitude": (("latitude",), ""),
    "longitude": (("longitude",), ""),
    "sea_level_anomaly": (("sea_surface_height_above_mean_sea_level", "sea_surface_height_above_sea_level"), ""),
}


@dataclass(frozen=True)
class AlongTrack:
    """Observations of one altimeter, in the order they were found.

    Attributes
    ----------
    time : (n,) array
        Seconds since 1970-01-01T00:00:00Z; NaN where the file has none that can be believed.
    latitude, longitude : (n,) array
        Degrees, longitude in -180..180; NaN where missing.
    sea_level_anomaly : (n,) array
        Metres, corrections applied; NaN where it or a correction is missing.
    flagged : (n,) bool array
        Whether the file's own flag speaks against the observation, or is missing.
    pass_number, cycle_number : (n,) int64 array or None
        As in the file; None unless every observation has one.
    found : dict
        Name of the file's variable taken for each role.
    """

    time: Floats
    latitude: Floats
    longitude: Floats
    sea_level_anomaly: Floats
    flagged: NDArray[np.bool_]
    pass_number: NDArray[np.int64] | None = None
    cycle_number: NDArray[np.int64] | None = None
    found: dict[str, str] = field(default_factory=dict)

    def __len__(self) -> int:
        """Return the number of observations."""
        return int(self.time.size)

    def select(self, which: NDArray[Any]) -> AlongTrack:
        """Return the observations of a mask or index."""
        return dataclasses.replace(
            self, **{name: value[which] for name, value in vars(self).items() if isinstance(value, np.ndarray)}
        )


def concatenate(tracks: Sequence[AlongTrack]) -> AlongTrack:
    """Return the observations of several files as one; pass numbers count only where all files give them."""
    columns: dict[str, Any] = {}
    for name in (f.name for f in dataclasses.fields(AlongTrack) if f.name != "found"):
        parts = [getattr(track, name) for track in tracks]
        columns[name] = None if any(part is None for part in parts) else np.concatenate(parts)
    return AlongTrack(**columns)


def read_alongtrack(path: Path, altimeter: Altimeter) -> AlongTrack:
    """Read a file of along-track sea level.

    Variables are found by the names in the configuration, else by CF standard name (time also by axis).

    Parameters
    ----------
    path : Path
        The file: NetCDF with variables of one dimension.
    altimeter : Altimeter
        How this altimeter's files are read.

    Returns
    -------
    AlongTrack
        Every record of the file, none edited.

    Raises
    ------
    SetdriftError
        The file cannot be read, or a variable, its units or its shape is not as needed.
    """
    with opened(path) as file:
        located = _locate(file, altimeter)
        time = _believable(seconds_since_1970(located["time"], str(path)))
        latitude = in_units(located["latitude"], str(path), "degrees")
        longitude = in_units(located["longitude"], str(path), "degrees")
        sea_level = in_units(located["sea_level_anomaly"], str(path), "m")
        for name in altimeter.subtract:
            sea_level = sea_level - in_units(located[f"subtract {name}"], str(path), "m")
        for name in altimeter.add:
            sea_level = sea_level + in_units(located[f"add {name}"], str(path), "m")
        flagged = np.zeros(time.size, dtype=bool)
        if altimeter.good is not None:
            flagged = _flagged(floats(located["good"]), altimeter.good)
        counters = {role: _whole_numbers(located.get(role)) for role in ("pass_number", "cycle_number")}
        found = {role: variable.name for role, variable in located.items()}
    latitude[~(abs(latitude) <= 90.0)] = np.nan
    longitude[~(abs(longitude) <= 360.0)] = np.nan
    return AlongTrack(time, latitude, (longitude + 180.0) % 360.0 - 180.0, sea_level, flagged, **counters, found=found)


def read_time_span(path: Path, altimeter: Altimeter) -> tuple[dt.date, dt.date] | None:
    """Return the first and last day a file has observations of; only its times are read.

    Parameters
    ----------
    path : Path
        The file.
    altimeter : Altimeter
        How this altimeter's files are read.

    Returns
    -------
    tuple of date, or None
        First and last day; None where no time can be believed.

    Raises
    ------
    SetdriftError
        The file cannot be read, or lacks a variable needed.
    """
    with opened(path) as file:
        time = _believable(seconds_since_1970(_locate(file, altimeter)["time"], str(path)))
    if np.all(np.isnan(time)):
        return None
    return from_day_number(int(np.nanmin(time) // DAY_S)), from_day_number(int(np.nanmax(time) // DAY_S))


def _locate(file: netCDF4.Dataset, altimeter: Altimeter) -> dict[str, Any]:
    """Find every variable needed, and check that all are series of one length."""
    located: dict[str, Any] = {}
    for role, (standard_names, axis) in STANDARD_NAMES.items():
        given = getattr(altimeter.variables, role)
        key = f"this altimeter's variables.{role}"
        located[role] = find_variable(file, role, given, standard_names, key, axis)[1]
    others = {f"subtract {name}": name for name in altimeter.subtract}
    others |= {f"add {name}": name for name in altimeter.add}
    if altimeter.good is not None:
        others["good"] = altimeter.good.variable
    for role in ("pass_number", "cycle_number"):
        if getattr(altimeter.variables, role) is not None:
            others[role] = getattr(altimeter.variables, role)
    for role, name in others.items():
        located[role] = find_variable(file, role, name, (), f"this altimeter's {role.split()[0]}")[1]
    _check_shapes(file.filepath(), located)
    return located


def _check_shapes(where: str, located: dict[str, Any]) -> None:
    for variable in located.values():
        if variable.ndim != 1:
            what = f"variable {variable.name} has {variable.ndim} dimensions ({', '.join(variable.dimensions)})"
            raise SetdriftError(where, what, "give one-dimensional series: one value for each observation")
    length = located["time"].shape[0]
    for variable in located.values():
        if variable.shape[0] != length:
            what = f"variable {variable.name} has {variable.shape[0]} values for {length} times"
            raise SetdriftError(where, what, "name variables of one length in the configuration")
    if length == 0:
        raise SetdriftError(where, "holds no records", "nothing need be done if that is as expected")


def _believable(time: Floats) -> Floats:
    """Put NaN for times that cannot be: outside 1970-2200, or far from all others of the file."""
    # one stray time would stretch a file over decades of days (common practice, no source)
    time = np.where((time >= 0.0) & (time < LAST_TIME_S), time, np.nan)
    if np.all(np.isnan(time)):
        return time
    low, middle, high = np.nanpercentile(time, (5.0, 50.0, 95.0))
    return np.where(abs(time - middle) <= DAY_S + STRAY_SPANS * (high - low), time, np.nan)


def _flagged(flag: Floats, good: GoodValues) -> NDArray[np.bool_]:
    """Return which flags are not good; a missing flag, or one that is no whole number, is not."""
    sound = (flag == np.rint(flag)) & (abs(flag) < 2.0**53)  # no NaN is equal to itself
    bits = np.where(sound, flag, 0.0).astype(np.int64)
    if good.mask is not None:
        return np.asarray(~(sound & ((bits & good.mask) == good.equals)))
    return np.asarray(~(sound & np.isin(bits, good.values or ())))


def _whole_numbers(variable: Any) -> NDArray[np.int64] | None:
    if variable is None:
        return None
    values = floats(variable)
    return values.astype(np.int64) if np.all(np.isfinite(values)) else None
