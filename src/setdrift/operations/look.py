"""A look at one along-track file: what would be read from it, how, and what is missing."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from setdrift.data.alongtrack import AlongTrack, Wanted, read_alongtrack, wanted_variables
from setdrift.data.alongtrack_layouts import layout_of
from setdrift.data.ancillary import land_mask
from setdrift.data.bathymetry import sea_floor
from setdrift.data.configuration import Altimeter, Configuration
from setdrift.data.editing import edit
from setdrift.data.grids import observation_area
from setdrift.data.netcdf import attribute, find_variable, opened, variables
from setdrift.data.plausibility import check_scale
from setdrift.errors import SetdriftError
from setdrift.numerics.earth import metres_per_degree
from setdrift.operations.look_snippet import flag_lines, one_line, snippet_lines

TARGETS = {"time": "seconds since 1970", "time_offset": "s", "latitude": "degrees", "longitude": "degrees"}
TARGETS |= {"sea_level_anomaly": "m", "subtract": "m", "add": "m"}


@dataclass(frozen=True)
class Found:
    """A variable sought: its name and itself if found, how, and otherwise why not."""

    wanted: Wanted
    name: str = ""
    variable: Any = None
    rule: str = ""
    missing: str = ""


def look_lines(path: Path, configuration: Configuration | None = None, name: str | None = None) -> list[str]:
    """Describe what would be read from a file, whether it can be read yet or not.

    Parameters
    ----------
    path : Path
        An along-track file or Zarr store.
    configuration : Configuration, optional
        The analysis whose rules of reading and editing are used; the standard names alone when left out.
    name : str, optional
        One of its altimeters; needed with `configuration`.

    Returns
    -------
    list of str
        Lines, the last of them a part of a configuration that reads the file.

    Raises
    ------
    SetdriftError
        The file cannot be opened at all, the configuration lacks the altimeter, or one of the two is given alone.
    """
    altimeter = _altimeter(path, configuration, name)
    with opened(path) as file:
        found = [_sought(file, wanted) for wanted in wanted_variables(altimeter)]
        lines = [one_line(str(path)), "", "variables"]
        lines += [f"  {_described(entry)}" for entry in found]
        missing = [entry.missing for entry in found if entry.missing]
        if not missing:
            lines += _layout(file, found)
        lines += flag_lines(variables(file))
        snippet = snippet_lines(
            variables(file), {f.wanted.role: f.name for f in found if f.name}, path, name, altimeter
        )
    lines += ["", "observations"]
    try:
        track = read_alongtrack(path, altimeter)
    except SetdriftError as error:
        lines.append(f"  cannot be read yet: {one_line(f'{error.what}; {error.remedy}')}")
    else:
        lines += [f"  {line}" for line in _contents(track)]
        if configuration is not None:
            lines += _edited(path, track, configuration)
    return [*lines, "", "in a configuration", *snippet]


def _altimeter(path: Path, configuration: Configuration | None, name: str | None) -> Altimeter:
    if configuration is None and name is None:
        return Altimeter(files=str(path))
    if configuration is None or name is None:
        raise SetdriftError("look-at", "has one of --config and --altimeter", "give both or neither")
    if name not in configuration.altimeters:
        known = ", ".join(configuration.altimeters)
        raise SetdriftError(f"{configuration.path}: altimeters", f"has no {name!r}", f"choose one of {known}")
    return configuration.altimeters[name]


def _sought(file: Any, wanted: Wanted) -> Found:
    try:
        found, variable = find_variable(file, wanted.role, wanted.given, wanted.standard_names, wanted.key, wanted.axis)
    except SetdriftError as error:
        return Found(wanted, missing=error.what)
    if wanted.given is not None:
        rule = "named in the configuration"
    elif attribute(variable, "standard_name") in wanted.standard_names:
        rule = f"by standard name {attribute(variable, 'standard_name')}"
    else:
        rule = f"by axis {wanted.axis}"
    return Found(wanted, found, variable, rule)


def _described(found: Found) -> str:
    role = found.wanted.role
    if found.missing:
        return f"{role:<18} missing: {one_line(found.missing)}"
    units, target = attribute(found.variable, "units"), TARGETS.get(role.split()[0])
    conversion = f", {one_line(str(units))} read as {target}" if target else ""
    return f"{role:<18} {one_line(found.name)}, {found.rule}{conversion}"


def _layout(file: Any, found: list[Found]) -> list[str]:
    try:
        layout = layout_of(file, {entry.wanted.role: entry.variable for entry in found})
    except SetdriftError:
        return []  # the attempt to read it says why
    sizes = " x ".join(f"{n} {size}" for n, size in zip(layout.dimensions, layout.shape, strict=True))
    return [f"  {'layout':<18} {layout.kind} ({one_line(sizes) or 'one observation'})"]


def _contents(track: AlongTrack) -> Iterator[str]:
    yield f"{len(track)} records, {int(track.flagged.sum())} of them flagged"
    for role in ("time", "latitude", "longitude", "sea_level_anomaly"):
        values = getattr(track, role)
        sound = values[np.isfinite(values)]
        missing = f", {values.size - sound.size} missing" if sound.size < values.size else ""
        if not sound.size:
            yield f"{role:<18} none of {values.size} can be used"
        elif role == "time":
            yield f"{role:<18} {_date(sound.min())} to {_date(sound.max())}{missing}"
        else:
            unit = " m" if role == "sea_level_anomaly" else ""
            yield f"{role:<18} {sound.min():.4f} to {sound.max():.4f}{unit}{missing}"
    for n in range(min(3, len(track))):
        place = f"{track.latitude[n]:.4f} north {track.longitude[n]:.4f} east"
        yield f"{f'record {n + 1}':<18} {_date(track.time[n])}, {place}, {track.sea_level_anomaly[n]:.4f} m"
    spacing = _spacing(track)
    yield f"{'spacing':<18} " + (f"{spacing[0]:.3g} s, {spacing[1] / 1e3:.3g} km" if spacing else "unknown")


def _date(seconds: float) -> str:
    if not np.isfinite(seconds):
        return "no time"
    moment = dt.datetime(1970, 1, 1) + dt.timedelta(seconds=round(float(seconds), 3))
    return moment.isoformat(sep=" ", timespec="milliseconds") + "Z"


def _spacing(track: AlongTrack) -> tuple[float, float] | None:
    """Return the usual step in time and on the ground, in seconds and metres, between neighbours in time."""
    sound: NDArray[Any] = np.isfinite(track.time) & np.isfinite(track.latitude) & np.isfinite(track.longitude)
    track = track.select(np.flatnonzero(sound)[np.argsort(track.time[sound], kind="stable")])
    if len(track) < 2:
        return None
    eastward, northward = metres_per_degree((track.latitude[1:] + track.latitude[:-1]) / 2)
    east = (np.diff(track.longitude) + 180.0) % 360.0 - 180.0
    return float(np.median(np.diff(track.time))), float(
        np.median(np.hypot(east * eastward, np.diff(track.latitude) * northward))
    )


def _edited(path: Path, track: AlongTrack, configuration: Configuration) -> list[str]:
    land, lines = land_mask(configuration), ["", "editing"]
    try:
        check_scale(path, track, configuration.editing, land)
    except SetdriftError as error:
        lines.append(f"  would be set aside: {one_line(f'{error.what}; {error.remedy}')}")
    edited = edit(track, configuration.editing, land, observation_area(configuration), sea_floor(configuration))
    lines.append(f"  {'kept':<18} {len(edited.track)} of {edited.received}")
    return lines + [f"  {reason:<18} {count}" for reason, count in edited.dropped.items() if count]
