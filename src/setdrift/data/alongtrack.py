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

from setdrift.data.alongtrack_layouts import layout_of
from setdrift.data.configuration import Altimeter, GoodValues
from setdrift.data.days import from_day_number
from setdrift.data.netcdf import Floats, find_variable, floats, in_units, opened, seconds_since_1970

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

COUNTERS = ("pass_number", "cycle_number")


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

    Variables are found by the names in the configuration, else by CF standard name (time also by axis), in the root
    and in all groups.

    Parameters
    ----------
    path : Path
        The file: NetCDF in one of the layouts of `setdrift.data.alongtrack_layouts`.
    altimeter : Altimeter
        How this altimeter's files are read.

    Returns
    -------
    AlongTrack
        Every observation of the file, none edited.

    Raises
    ------
    SetdriftError
        The file cannot be read, or a variable, its units or its shape is not as needed.
    """
    with opened(path) as file:
        source = _Source(file, altimeter)
        time = source.time()
        latitude, longitude = source.read("latitude", "degrees"), source.read("longitude", "degrees")
        sea_level = source.read("sea_level_anomaly", "m")
        for name in altimeter.subtract:
            sea_level = sea_level - source.read(f"subtract {name}", "m")
        for name in altimeter.add:
            sea_level = sea_level + source.read(f"add {name}", "m")
        flagged = np.zeros(time.size, dtype=bool)
        if altimeter.good is not None:
            flagged = _flagged(source.numbers("good"), altimeter.good)
        counters = {role: _whole_numbers(source.numbers(role)) for role in COUNTERS if role in source.names}
        layout = source.layout
    latitude[~(abs(latitude) <= 90.0)] = np.nan
    longitude[~(abs(longitude) <= 360.0)] = np.nan
    longitude = (longitude + 180.0) % 360.0 - 180.0
    track = AlongTrack(time, latitude, longitude, sea_level, flagged, **counters, found=source.names)
    if len(layout.shape) < 2:
        return track
    # the rows of a table are filled up to one length: that is not an observation
    return track.select(~(np.isnan(latitude) & np.isnan(longitude) & np.isnan(sea_level)))


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
        time = _Source(file, altimeter).time()
    if np.all(np.isnan(time)):
        return None
    return from_day_number(int(np.nanmin(time) // DAY_S)), from_day_number(int(np.nanmax(time) // DAY_S))


@dataclass(frozen=True)
class Wanted:
    """A variable that an altimeter's files must hold: its role, the name given, and what else it is known by."""

    role: str
    given: str | None
    standard_names: tuple[str, ...]
    axis: str
    key: str


def wanted_variables(altimeter: Altimeter) -> list[Wanted]:
    """Return what is sought in each file of an altimeter.

    Parameters
    ----------
    altimeter : Altimeter
        How this altimeter's files are read.

    Returns
    -------
    list of Wanted
        Time, position and sea level, then the offsets of time, corrections, flag and pass numbers that are named.
    """
    names = altimeter.variables
    wanted = [
        Wanted(role, getattr(names, role), standard_names, axis, f"this altimeter's variables.{role}")
        for role, (standard_names, axis) in STANDARD_NAMES.items()
    ]
    others = {role: getattr(names, role) for role in ("time_offset", *COUNTERS)}
    keys = {role: f"this altimeter's variables.{role}" for role in others}
    for part in ("subtract", "add"):
        others |= {f"{part} {name}": name for name in getattr(altimeter, part)}
    others["good"] = altimeter.good.variable if altimeter.good else None
    return wanted + [
        Wanted(role, name, (), "", keys.get(role, f"this altimeter's {role.split()[0]}"))
        for role, name in others.items()
        if name is not None
    ]


class _Source:
    """An open file: the variable of each role, read as flat series."""

    def __init__(self, file: netCDF4.Dataset, altimeter: Altimeter) -> None:
        self._where = file.filepath()
        located = {
            w.role: find_variable(file, w.role, w.given, w.standard_names, w.key, w.axis)
            for w in wanted_variables(altimeter)
        }
        self.names = {role: name for role, (name, _) in located.items()}
        self._variables = {role: variable for role, (_, variable) in located.items()}
        self.layout = layout_of(file, self._variables)

    def numbers(self, role: str) -> Floats:
        """Read a variable as it is."""
        variable = self._variables[role]
        return self.layout.flat(variable, floats(variable))

    def read(self, role: str, units: str) -> Floats:
        """Read a variable in the units wanted."""
        variable = self._variables[role]
        return self.layout.flat(variable, in_units(variable, self._where, units))

    def time(self) -> Floats:
        """Read the times, offsets added, that can be believed; NaN for the others."""
        variable = self._variables["time"]
        time = self.layout.flat(variable, seconds_since_1970(variable, self._where))
        if "time_offset" in self._variables:
            time = time + self.read("time_offset", "s")
        return _believable(time)


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


def _whole_numbers(values: Floats) -> NDArray[np.int64] | None:
    return values.astype(np.int64) if np.all(np.isfinite(values)) else None
