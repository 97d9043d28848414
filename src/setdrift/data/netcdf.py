"""Reading foreign NetCDF files and Zarr stores: every way a file can be wrong ends in one error that names the file."""

from __future__ import annotations

import contextlib
import functools
import warnings
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import Any

import cf_units
import netCDF4
import numpy as np
from numpy.typing import NDArray

from setdrift.data.zarr_files import is_store, open_store
from setdrift.errors import SetdriftError

Floats = NDArray[np.float64]

# what the library raises on damaged or odd files, by experience wider than its documentation
UNREADABLE = (
    OSError,
    RuntimeError,
    IndexError,
    KeyError,
    ValueError,
    TypeError,
    AttributeError,
    OverflowError,
    MemoryError,
)
CALENDARS = ("standard", "gregorian", "proleptic_gregorian")
LONGEST_TIME_UNIT_S = 7 * 86400.0  # months and years have no fixed length


@contextlib.contextmanager
def opened(path: Path) -> Iterator[Any]:
    """Open a file, or a folder that is a Zarr store, and turn whatever its reading raises into a SetdriftError.

    Parameters
    ----------
    path : Path
        The file.

    Yields
    ------
    netCDF4.Dataset or ZarrFile
        The open file, with automatic masking and unpacking.

    Raises
    ------
    SetdriftError
        The file cannot be opened, or what is read from it inside the block cannot be read.
    """
    kind = "Zarr" if is_store(path) else "NetCDF"
    try:
        with warnings.catch_warnings():
            # odd attributes (a valid_min of another type, say) are not worth a line in the log for every file
            warnings.simplefilter("ignore")
            if kind == "Zarr":
                yield open_store(path)
                return
            with netCDF4.Dataset(path) as file:
                yield file
    except UNREADABLE as error:
        reason = (getattr(error, "strerror", None) or str(error) or type(error).__name__).splitlines()[0]
        raise SetdriftError(
            str(path), f"cannot be read as {kind} ({reason})", "replace the file or move it away"
        ) from error


def is_passing_trouble(error: SetdriftError) -> bool:
    """Return whether the machine, not the file's content, is at fault, so that another try may do."""
    cause = error.__cause__
    if isinstance(cause, OSError):
        # the NetCDF library's own errors are OSErrors with negative numbers
        return (cause.errno or 0) > 0 and not isinstance(cause, FileNotFoundError)
    return isinstance(cause, MemoryError)


def variables(group: Any, prefix: str = "") -> dict[str, Any]:
    """Return every variable of a file by name, those in groups with the group's path before."""
    found = {prefix + name: variable for name, variable in group.variables.items()}
    for name, child in group.groups.items():
        found |= variables(child, f"{prefix}{name}/")
    return found


def attribute(variable: Any, name: str) -> str | None:
    """Return a variable's attribute if it is text that says something."""
    value = variable.getncattr(name) if name in variable.ncattrs() else None
    return value.strip() if isinstance(value, str) and value.strip() else None


def find_variable(
    file: netCDF4.Dataset, what: str, given: str | None, standard_names: Sequence[str], key: str, axis: str = ""
) -> tuple[str, Any]:
    """Find a variable by the name the user gave, or else by CF standard name, or else by axis.

    Parameters
    ----------
    file : netCDF4.Dataset
        The open file.
    what : str
        What the variable is, for messages.
    given : str or None
        Name given in the configuration.
    standard_names : sequence of str
        CF standard names it may carry.
    key : str
        The configuration key that names the variable, for messages.
    axis : str
        CF axis letter it may carry instead.

    Returns
    -------
    tuple of str and netCDF4.Variable
        Its name and itself.

    Raises
    ------
    SetdriftError
        No variable fits, or several do.
    """
    known = variables(file)
    where = file.filepath()
    if given is not None:
        if given not in known:
            raise SetdriftError(where, f"has no variable {given} for {what} ({listed(known)})", f"correct {key}")
        return given, known[given]
    fitting = [name for name, v in known.items() if attribute(v, "standard_name") in standard_names]
    if not fitting and axis:
        fitting = [name for name, v in known.items() if attribute(v, "axis") == axis]
    if not fitting:
        raise SetdriftError(
            where, f"has no variable with standard_name {standard_names[0]} ({listed(known)})", f"name it under {key}"
        )
    if len(fitting) > 1:
        raise SetdriftError(where, f"has several variables for {what}: {', '.join(fitting)}", f"name one under {key}")
    return fitting[0], known[fitting[0]]


def listed(names: Any) -> str:
    """Return the names a file holds, for messages."""
    shown = ", ".join(list(names)[:12])
    return f"it holds {shown}{', ...' if len(names) > 12 else ''}" if shown else "it holds no variable"


def floats(variable: Any) -> Floats:
    """Read a variable unpacked, as 64-bit floats with NaN where the file has a missing or invalid value."""
    values = np.ma.asarray(variable[...])
    return np.asarray(np.ma.filled(values.astype(np.float64), np.nan), dtype=np.float64)


def in_units(variable: Any, where: str, target: str) -> Floats:
    """Read a variable in the units wanted.

    Parameters
    ----------
    variable : netCDF4.Variable
        The variable.
    where : str
        The file, for messages.
    target : str
        Units wanted.

    Returns
    -------
    array
        Values with NaN where missing.

    Raises
    ------
    SetdriftError
        The variable has no units, or units that do not convert.
    """
    text = attribute(variable, "units")
    try:
        factor, offset = _conversion(text, target)
    except ValueError as error:
        raise SetdriftError(
            where, f"variable {variable.name} has units {text!r}, which are not {target}", "correct its units attribute"
        ) from error
    values = floats(variable)
    return values if (factor, offset) == (1.0, 0.0) else values * factor + offset


@functools.lru_cache(maxsize=256)
def _conversion(text: str | None, target: str) -> tuple[float, float]:
    """Return factor and offset of a conversion between units, which is always linear here."""
    if text is None:
        raise ValueError("units missing")
    source, wanted = cf_units.Unit(text), cf_units.Unit(target)
    if source.is_time_reference() or source.is_unknown() or source.is_no_unit():
        raise ValueError("units of another kind")
    zero, one = (float(source.convert(value, wanted)) for value in (0.0, 1.0))
    return one - zero, zero


def seconds_since_1970(variable: Any, where: str) -> Floats:
    """Read a CF time variable.

    Parameters
    ----------
    variable : netCDF4.Variable
        Variable with units such as "days since 1950-01-01".
    where : str
        The file, for messages.

    Returns
    -------
    array
        Seconds since 1970-01-01T00:00:00Z, NaN where missing.

    Raises
    ------
    SetdriftError
        No units, nonsense units, or a calendar that is not the civil one.
    """
    text = attribute(variable, "units")
    calendar = (attribute(variable, "calendar") or "standard").lower()
    if calendar not in CALENDARS:
        raise SetdriftError(
            where, f"variable {variable.name} counts in the calendar {calendar!r}", f"use {CALENDARS[0]}"
        )
    try:
        factor, epoch = _time_conversion(text, calendar)
    except ValueError as error:
        what = f"variable {variable.name} has units {text!r}, which are not a time since an epoch"
        raise SetdriftError(where, what, 'give units such as "seconds since 2000-01-01"') from error
    return floats(variable) * factor + epoch


@functools.lru_cache(maxsize=256)
def _time_conversion(text: str | None, calendar: str) -> tuple[float, float]:
    """Return seconds per unit, and the epoch in seconds since 1970."""
    if text is None:
        raise ValueError("units missing")
    source = cf_units.Unit(text, calendar=calendar)
    if not source.is_time_reference():
        raise ValueError("not a time reference")
    factor = float(cf_units.Unit(text.split()[0]).convert(1.0, "second"))
    if factor > LONGEST_TIME_UNIT_S:
        raise ValueError("months and years have no fixed length")
    return factor, float(source.convert(0.0, cf_units.Unit("seconds since 1970-01-01", calendar=calendar)))
