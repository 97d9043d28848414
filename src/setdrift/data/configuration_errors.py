"""What the validator found wrong with a configuration, in the words of those who write one."""

from __future__ import annotations

import difflib
import re
import typing
from pathlib import Path
from typing import Any

from pydantic import BaseModel, ValidationError

LONGEST = 60
"""Longer values are shown cut."""


def explained(path: Path, error: ValidationError, model: type[BaseModel]) -> tuple[str, str, str]:
    """Put the validator's first finding in words.

    Parameters
    ----------
    path : Path
        The file.
    error : ValidationError
        What the validator found.
    model : type of BaseModel
        The whole configuration.

    Returns
    -------
    where, what, remedy : str
        The file with the key, what is wrong with its value, and what to do about it.
    """
    problems = error.errors()
    # an unknown key often explains a missing one, so it is told first
    first = next((p for p in problems if p["type"] in _UNKNOWN), problems[0])
    key = ".".join(str(part) for part in first["loc"] if part != "[key]")
    what, remedy = _finding(first, model)
    others = len({problem["loc"] for problem in problems}) - 1
    more = f" ({others} more {'problem' if others == 1 else 'problems'} in the file)" if others else ""
    return f"{path}: {key}" if key else str(path), what, remedy + more


def _finding(problem: Any, model: type[BaseModel]) -> tuple[str, str]:
    kind, value = problem["type"], problem.get("input")
    if kind in _UNKNOWN:
        return "is not a known key", _nearest_key(problem["loc"], model)
    if kind == "missing":
        return "is missing", "add it; config/README.md lists every key"
    if kind == "value_error":
        what, _, remedy = problem["msg"].removeprefix("Value error, ").partition("; ")
        return what, remedy
    if value is None:
        return "is empty", "give it a value, or take the key away"
    shown = repr(value) if len(repr(value)) <= LONGEST else f"{repr(value)[: LONGEST - 3]}..."
    if kind == "model_type":
        section = _section_at(problem["loc"], model)
        return f"{shown} is refused", f"give it keys of its own: {', '.join(section.model_fields)}"
    return f"{shown} is refused", _wanted(kind, value, problem.get("ctx", {}))


def _wanted(kind: str, value: Any, context: dict[str, Any]) -> str:
    """Say what the value must be."""
    number = re.match(r"(int|float)_(parsing|type|from_float)", kind)
    if number:
        whole = "a whole number" if number[1] == "int" else "a number"
        with_unit = isinstance(value, str) and re.match(r"\s*[-+]?[\d.]", value)
        return f"write {whole}" + (" alone: the unit is in the key's name" if with_unit else "")
    # a rule that the table lacks still names itself
    return _WANTED.get(kind, f"it breaks the rule {kind}").format(**context)


_UNKNOWN = {"extra_forbidden", "invalid_key"}

_WANTED = {
    "greater_than": "give a value above {gt:g}",
    "greater_than_equal": "give a value of at least {ge:g}",
    "less_than": "give a value below {lt:g}",
    "less_than_equal": "give a value of at most {le:g}",
    "finite_number": "write a finite number",
    "literal_error": "write {expected}",
    "string_pattern_mismatch": "use lower case letters, digits and underscores, a letter first",
    "string_too_long": "use at most {max_length} characters",
    "string_type": "write one text; put a number that is meant as text in quotes",
    "tuple_type": "write a list, such as [first, second]",
    "dict_type": "write names, each with keys of its own",
    "too_short": "give at least {min_length}",
    "too_long": "give at most {max_length}",
}


def _nearest_key(location: tuple[Any, ...], model: type[BaseModel]) -> str:
    known = list(_section_at(location[:-1], model).model_fields)
    near = difflib.get_close_matches(str(location[-1]), known, n=1, cutoff=0.5)
    if near:
        return f"did you mean {near[0]}?"
    return f"known keys here: {', '.join(known)}"


def _section_at(location: tuple[Any, ...], model: type[BaseModel]) -> type[BaseModel]:
    """Follow keys from the whole configuration to a section; the keys of a mapping are names of the user's."""
    named_by_user = False
    for part in location:
        if named_by_user:
            named_by_user = False
            continue
        annotation = model.model_fields[part].annotation
        model = _section_in(annotation) or model
        named_by_user = typing.get_origin(annotation) is dict
    return model


def _section_in(annotation: Any) -> type[BaseModel] | None:
    """Find the section class inside an annotation such as `dict[str, Altimeter]` or `Source | None`."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    return next((found for part in typing.get_args(annotation) if (found := _section_in(part))), None)
