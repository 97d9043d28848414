"""The part of a configuration that reads a file, with remarks where a choice is needed."""

from __future__ import annotations

import glob
import re
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import cf_units
import numpy as np
import yaml

from setdrift.data.alongtrack import STANDARD_NAMES
from setdrift.data.configuration import Altimeter
from setdrift.data.netcdf import attribute

NORTH = ("degrees_north", "degree_north", "degree_N", "degrees_N", "degreeN", "degreesN")
EAST = ("degrees_east", "degree_east", "degree_E", "degrees_E", "degreeE", "degreesE")


def one_line(text: str) -> str:
    """Return a foreign text fit for one line of a terminal."""
    return "".join(c if c.isprintable() else "?" for c in " ".join(text.split()))[:300]


def flag_lines(known: Mapping[str, Any]) -> list[str]:
    """Return a line for each variable that explains its values as flags.

    Parameters
    ----------
    known : mapping
        All variables of the file, by name.

    Returns
    -------
    list of str
        Name and what its values or bits mean.
    """
    return [f"  {'flag':<18} {one_line(name)}: {meaning}" for name, (meaning, _) in _flags(known).items()]


def snippet_lines(
    known: Mapping[str, Any], found: Mapping[str, str], path: Path, name: str | None, altimeter: Altimeter
) -> list[str]:
    """Return a part of a configuration that reads a file.

    Parameters
    ----------
    known : mapping
        All variables of the file, by name.
    found : mapping
        Name of the variable found for each role.
    path : Path
        The file.
    name : str, optional
        The altimeter's name; made from the folder's when left out.
    altimeter : Altimeter
        How the file was tried to be read.

    Returns
    -------
    list of str
        YAML; choices to be made are in comments that begin with TODO.
    """
    folder = path.absolute().parent
    files = str(Path(glob.escape(str(folder)), f"*{path.suffix}"))
    lines = ["altimeters:", f"  {name or _plain_name(folder.name)}:", f"    files: {_quoted(files)}"]
    chosen, remarks = _names(known, found, altimeter)
    if chosen:
        inside = ", ".join(f"{role}: {_quoted(value)}" for role, value in chosen.items())
        lines.append(f"    variables: {{{inside}}}")
    corrections = {"subtract": altimeter.subtract, "add": altimeter.add}
    lines += [f"    {part}: [{', '.join(map(_quoted, names))}]" for part, names in corrections.items() if names]
    if altimeter.good:
        rule = altimeter.good.model_dump(exclude_defaults=True, mode="json")
        inside = ", ".join(f"{key}: {_quoted(value)}" for key, value in rule.items())
        lines.append(f"    good: {{{inside}}}")
    else:
        remarks += [f"which are good? {meaning}; {rule}" for meaning, rule in _flags(known).values()]
    return lines + [f"    # TODO {one_line(remark)}" for remark in remarks]


def _names(
    known: Mapping[str, Any], found: Mapping[str, str], altimeter: Altimeter
) -> tuple[dict[str, str], list[str]]:
    """Return the variables to name, and remarks on those that are guessed."""
    chosen: dict[str, str] = {}
    remarks: list[str] = []
    length: tuple[str, ...] | None = None
    for role in STANDARD_NAMES:
        candidates = [name for name, variable in known.items() if _may_be(role, variable)]
        if role in found:
            if getattr(altimeter.variables, role) is not None:
                chosen[role] = found[role]
        else:
            if role == "sea_level_anomaly":
                candidates = [name for name in candidates if length is None or known[name].dimensions == length]
            if candidates:
                chosen[role] = candidates[0]
            told = "; ".join(_told(name, known[name]) for name in candidates) or "no variable has fitting units"
            remarks.append(f"{role} has no standard name that settles it; choose from: {told}")
            if role == "sea_level_anomaly" and len(candidates) > 1:
                remarks.append("are some of these corrections? name them under subtract or add")
        if role == "time" and (settled := found.get(role) or chosen.get(role)):
            length = known[settled].dimensions
    for role in ("time_offset", "pass_number", "cycle_number"):
        if (given := getattr(altimeter.variables, role)) is not None:
            chosen[role] = given
        else:
            word = role.split("_")[0] if role != "time_offset" else "offset"
            fitting = [name for name in known if word in name.lower().rpartition("/")[2]]
            remarks += [f"{role} may be: {', '.join(map(_quoted, fitting))}"] if fitting else []
    return chosen, remarks


def _may_be(role: str, variable: Any) -> bool:
    units = attribute(variable, "units")
    if units is None:
        return False
    if role == "latitude":
        return units in NORTH
    if role == "longitude":
        return units in EAST
    try:
        unit = cf_units.Unit(units)
    except ValueError:
        return False
    return bool(unit.is_time_reference()) if role == "time" else bool(unit.is_convertible("m"))


def _told(name: str, variable: Any) -> str:
    long_name = attribute(variable, "long_name")
    return f"{name} ({attribute(variable, 'units')}{f', {long_name}' if long_name else ''})"


def _flags(known: Mapping[str, Any]) -> dict[str, tuple[str, str]]:
    """Return, for each flag variable, what its values mean and an example of a rule."""
    flags = {}
    for name, variable in known.items():
        meanings = (attribute(variable, "flag_meanings") or "").split()
        for kind, key in (("flag_values", "value"), ("flag_masks", "bit")):
            if kind not in variable.ncattrs():
                continue
            numbers = np.atleast_1d(variable.getncattr(kind)).tolist()
            if not all(isinstance(number, int | float) and float(number).is_integer() for number in numbers):
                break  # text, say
            said = [*meanings, *["?"] * (len(numbers) - len(meanings))]
            told = ", ".join(f"{key} {n} {m}" for n, m in zip(numbers, said, strict=False))
            # an example only: what is good, the file cannot tell
            rule = f"values: [{numbers[0]}]" if key == "value" else f"mask: {sum(map(int, numbers))}, equals: 0"
            flags[name] = (one_line(told), f"such as good: {{variable: {_quoted(name)}, {rule}}}")
            break
    return flags


def _plain_name(text: str) -> str:
    name = re.sub(r"[^a-z0-9]+", "_", text.lower()).strip("_")[:40]
    return name if re.match(r"[a-z]", name) else f"altimeter_{name}".strip("_")[:40]


def _quoted(value: Any) -> str:
    """Return a value as YAML writes it inside a list or mapping on one line."""
    return yaml.safe_dump([value], default_flow_style=True, width=10_000, allow_unicode=True).strip()[1:-1]
