"""The scenario: every number of the invented sea, read from a small YAML file."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from datetime import date, timedelta
from pathlib import Path
from typing import Any

import yaml

PACKAGED = Path(__file__).with_name("scenario.yaml")
_DAY_ZERO = date(2000, 1, 1)


@dataclass(frozen=True)
class Box:
    """A longitude and latitude box, degrees."""

    west: float
    east: float
    south: float
    north: float

    def widened(self, degrees: float) -> Box:
        """Return the box widened by so many degrees on every side."""
        return Box(self.west - degrees, self.east + degrees, self.south - degrees, self.north + degrees)


@dataclass(frozen=True)
class Altimeter:
    """One invented altimeter: its orbit, its errors and its accidents."""

    name: str
    inclination: float
    revolutions: int
    nodal_days: int
    ascending_node: float
    noise_m: float
    long_wave_m: float
    bias_m: float
    flagged_share: float
    missing_days: list[date]
    cut_short: list[date]


@dataclass(frozen=True)
class Scenario:
    """The whole scenario; the nested mappings are described in `scenario.yaml`."""

    name: str
    seed: int
    period: dict[str, date]
    margin_days: int
    box: Box
    margin_degrees: float
    truth: dict[str, float]
    geography: dict[str, Any]
    eddies: dict[str, Any]
    background: dict[str, Any]
    fade: dict[str, list[float]]
    equatorial_waves: dict[str, Any]
    mean: dict[str, Any]
    errors: dict[str, Any]
    altimeters: tuple[Altimeter, ...]
    digest: str

    @property
    def domain(self) -> Box:
        """The box with its margin: where there is sea and where there are observations."""
        return self.box.widened(self.margin_degrees)

    @property
    def truth_box(self) -> Box:
        """The box of the gridded truth."""
        return self.box.widened(self.truth["margin_degrees"])

    @property
    def analysed_days(self) -> list[date]:
        """The days of the period analysed."""
        return _days_between(self.period["start"], self.period["end"])

    @property
    def observed_days(self) -> list[date]:
        """The days with observations: the period and its margins."""
        margin = timedelta(days=self.margin_days)
        return _days_between(self.period["start"] - margin, self.period["end"] + margin)


def load(path: Path = PACKAGED) -> Scenario:
    """Read a scenario.

    Parameters
    ----------
    path : Path
        A YAML file with the keys of the packaged one.

    Returns
    -------
    Scenario
        The scenario, with the digest of the file's text.

    Raises
    ------
    ValueError
        If the file is not YAML, or a key is missing or unknown.
    """
    text = path.read_bytes()
    try:
        values = yaml.safe_load(text)
    except yaml.YAMLError as error:
        raise ValueError(f"{path}: {error}") from error
    _check_keys(values, yaml.safe_load(PACKAGED.read_bytes()), str(path))
    values["box"] = Box(**values["box"])
    values["altimeters"] = tuple(Altimeter(name, **v) for name, v in values["altimeters"].items())
    return Scenario(**values, digest=hashlib.sha256(text).hexdigest())


def day_number(day: date) -> float:
    """Days from 2000-01-01 00:00 UTC to the start of a day, the time axis of this package."""
    return float((day - _DAY_ZERO).days)


def _check_keys(values: Any, pattern: dict[str, Any], where: str) -> None:
    """Refuse keys that the packaged scenario does not have, and the lack of those it has (any altimeter may lack)."""
    if not isinstance(values, dict):
        raise ValueError(f"{where}: must hold the keys {', '.join(pattern)}")
    if unknown := sorted(values.keys() - pattern.keys()):
        raise ValueError(f"{where}: unknown key {unknown[0]}; there are {', '.join(pattern)}")
    if (missing := sorted(pattern.keys() - values.keys())) and not where.endswith(": altimeters"):
        raise ValueError(f"{where}: {missing[0]} is missing")
    for key, value in values.items():
        if isinstance(pattern[key], dict):
            _check_keys(value, pattern[key], f"{where}: {key}")


def _days_between(first: date, last: date) -> list[date]:
    return [first + timedelta(days=n) for n in range((last - first).days + 1)]
