"""Every kind of bad file beside a good one, and what becomes of each: `python tests/bad_files.py` prints the table."""

from __future__ import annotations

import os
import sys
import tempfile
from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
import yaml
from altimeter_files import MARCH_FIRST, plain_columns, write, write_land, write_mean
from small_analysis import SMALL_ANALYSIS

from setdrift.data.configuration import Configuration, load_configuration
from setdrift.data.day_store import DayStore
from setdrift.operations.inventory import matching_files, take_inventory
from setdrift.stages.observations import gather_observations

GOOD_START, BAD_START = MARCH_FIRST + 3600.0, MARCH_FIRST + 5 * 3600.0
Columns = dict[str, tuple[Any, dict[str, Any]]]


@dataclass(frozen=True)
class Bad:
    """A bad file: how it is made, its name, and the verdict expected (None: whatever the editing decides)."""

    make: Callable[[Path], object]
    verdict: str | None
    name: str = "bad.nc"


@dataclass(frozen=True)
class Row:
    """What became of a bad file, and the good file's observations as bytes."""

    name: str
    verdict: str
    reason: str
    good: bytes


def columns(start: float = BAD_START) -> Columns:
    """A sound pass, with a flag."""
    return plain_columns(start=start) | {"fit": (np.zeros(40, np.int8), {})}


def changed(column: str, change: Callable[[Any], Any], **attributes: Any) -> Callable[[Path], object]:
    """Return a maker of a file whose one column has other values and attributes; None removes an attribute."""

    def make(path: Path) -> object:
        content = columns()
        values, before = content[column]
        after = {key: value for key, value in (before | attributes).items() if value is not None}
        content[column] = (change(np.array(values)), after)
        return write(path, content)

    return make


def same(values: Any) -> Any:
    """Change nothing."""
    return values


def put(values: Any, what: float, where: slice = slice(5, 8)) -> Any:
    """Put a value in some places."""
    values[where] = what
    return values


def truncated(path: Path) -> None:
    """Write the first half of a file."""
    write(path, columns())
    path.write_bytes(path.read_bytes()[: path.stat().st_size // 2])


def sparse(path: Path) -> None:
    """Make a file of 2 GB that holds nothing."""
    with path.open("wb") as stream:
        stream.truncate(2 << 30)


def unreadable(path: Path) -> None:
    """Write a sound file that nobody may read."""
    write(path, columns())
    path.chmod(0)


def reordered(path: Path) -> object:
    """Write the records in any order."""
    order = np.random.default_rng(3).permutation(40)
    return write(path, {name: (values[order], attributes) for name, (values, attributes) in columns().items()})


def emptied(path: Path) -> object:
    """Write no records."""
    return write(path, {name: (values[:0], attributes) for name, (values, attributes) in columns().items()})


def foreign(path: Path) -> object:
    """Write a file of something else."""
    return write(path, {"temperature": (np.arange(40.0), {"units": "K", "standard_name": "sea_water_temperature"})})


def sound(path: Path) -> object:
    """Write a sound file: only its name is hostile."""
    return write(path, columns())


HTML = "<script>alert('level')</script>&lt;b&gt;"
BAD: dict[str, Bad] = {
    "truncated": Bad(truncated, "set aside"),
    "empty": Bad(Path.touch, "set aside"),
    "text named .nc": Bad(lambda path: path.write_text("time, level\n1, 2\n"), "set aside"),
    "without our variables": Bad(foreign, "set aside"),
    "NaN times": Bad(changed("clock", lambda v: v * np.nan), "set aside"),
    "some NaN times": Bad(changed("clock", lambda v: put(v, np.nan)), "partly dropped"),
    "no time units": Bad(changed("clock", same, units=None), "set aside"),
    "nonsense time units": Bad(changed("clock", same, units="moons since the flood"), "set aside"),
    "latitude out of range": Bad(changed("y", lambda v: put(v, 95.0)), "partly dropped"),
    "infinities": Bad(changed("level", lambda v: put(put(v, np.inf), -np.inf, slice(9, 10))), "partly dropped"),
    "all flagged": Bad(changed("fit", lambda v: v + 1), "all dropped"),
    "all fill": Bad(changed("level", lambda v: 0.0 * v - 9999.0, _FillValue=-9999.0), "all dropped"),
    "zero records": Bad(emptied, "set aside"),
    "duplicated times": Bad(changed("clock", lambda v: np.repeat(v[::2], 2)), "partly dropped"),
    "unsorted times": Bad(reordered, "read"),
    "sea level in kelvin": Bad(changed("level", same, units="K"), "set aside"),
    "millimetres labelled metres": Bad(changed("level", lambda v: 1000.0 * v), None),
    "decades ahead": Bad(changed("clock", lambda v: v + 30 * 365.25 * 86400.0), "not needed"),
    "unreadable permissions": Bad(unreadable, "set aside"),
    "a folder of that name": Bad(Path.mkdir, "not a file"),
    "sparse, 2 GB": Bad(sparse, "set aside"),
    "spaces in the name": Bad(sound, "read", "a  bad name.nc"),
    "newline in the name": Bad(sound, "read", "bad\nname.nc"),
    "braces in the name": Bad(sound, "read", "{} {0} %s.nc"),
    "attributes with HTML": Bad(changed("level", same, long_name=HTML, comment=HTML), "read"),
}


def configured(folder: Path) -> Configuration:
    """Write the small analysis with a good file, and load it."""
    write_land(folder / "land.nc")
    write_mean(folder / "mean.nc")
    write(folder / "heron" / "good.nc", columns(GOOD_START))
    heron = {"files": "heron/*.nc", "good": {"variable": "fit", "values": [0]}}
    path = folder / "small_sea.yaml"
    path.write_text(yaml.safe_dump(SMALL_ANALYSIS | {"altimeters": {"heron": heron}}))
    return load_configuration(path)


def processed(configuration: Configuration) -> tuple[dict[str, Any], list[dict[str, str]], bytes]:
    """Take the inventory and gather all blocks; return sums of the counts, files set aside, and the good bytes."""
    inventory = take_inventory(configuration, lambda _: None)
    total: dict[str, Any] = {"in": 0, "kept": 0, "dropped": {}}
    set_aside = list(inventory.set_aside)
    for block in inventory.observation_blocks:
        receipt = gather_observations(configuration, block, lambda _: None)
        set_aside += receipt["set_aside"]
        for day in receipt["days"].values():
            total["in"] += day["in"]
            total["kept"] += day["kept"]
            for reason, count in day["dropped"].items():
                total["dropped"][reason] = total["dropped"].get(reason, 0) + count
    data = DayStore(configuration.work / "observations").load(date(2031, 3, 1))
    # the good file's records come before all others of the day
    good = data.isel(observation=data["time"].values < BAD_START)
    return total, set_aside, b"".join(good[name].values.tobytes() for name in sorted(good.variables))


def without_any(folder: Path) -> bytes:
    """Return the good file's observations where it is alone."""
    return processed(configured(folder))[2]


def judged(kind: str, folder: Path) -> Row:
    """Put a bad file beside the good one, process both, and tell what became of it."""
    configuration = configured(folder)
    before = processed(configuration)[0]
    bad = BAD[kind]
    path = folder / "heron" / bad.name
    bad.make(path)
    if kind == "unreadable permissions" and os.access(path, os.R_OK):
        return Row(kind, "skipped", "the superuser may read everything", processed(configuration)[2])
    total, set_aside, good = processed(configuration)
    if set_aside:
        return Row(kind, "set aside", set_aside[0]["reason"].replace(str(folder), "").strip(), good)
    if path not in matching_files(configuration, configuration.altimeters["heron"]):
        return Row(kind, "not a file", "does not count", good)
    came, kept = total["in"] - before["in"], total["kept"] - before["kept"]
    lost = {r: n - before["dropped"][r] for r, n in total["dropped"].items() if n > before["dropped"][r]}
    reason = ", ".join(f"{count} {name}" for name, count in lost.items())
    if not came:
        return Row(kind, "not needed", "holds no observation of the days wanted", good)
    verdict = "read" if kept == came else "partly dropped" if kept else "all dropped"
    return Row(kind, verdict, reason or f"{kept} observations", good)


def main() -> int:
    """Print the table; return 1 if a verdict is not as expected or a good observation changed."""
    wrong = 0
    with tempfile.TemporaryDirectory() as scratch:
        alone = without_any(Path(scratch, "alone"))
        print(f"{'file':<28} {'verdict':<15} reason")
        for number, (kind, bad) in enumerate(BAD.items()):
            row = judged(kind, Path(scratch, str(number)))
            sound_row = row.good == alone and (row.verdict in (bad.verdict, "skipped") or bad.verdict is None)
            wrong += not sound_row
            print(f"{row.name:<28} {row.verdict:<15} {row.reason}{'' if sound_row else '   <- WRONG'}")
    return min(wrong, 1)


if __name__ == "__main__":
    sys.exit(main())
