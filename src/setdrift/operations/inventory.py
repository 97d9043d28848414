"""The inventory of input files: what there is, what it holds, and which days it can change.

The raw files are no inputs of the workflow's jobs: touching one would start jobs for nothing. The inventory
writes small manifests keyed by content instead, and only where they change.
"""

from __future__ import annotations

import dataclasses
import datetime as dt
import glob
import stat
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from setdrift.data.algorithms import VERSIONS
from setdrift.data.alongtrack import read_time_span
from setdrift.data.configuration import Altimeter, Configuration
from setdrift.data.days import Block, blocks_between, days_between
from setdrift.data.digests import digest, file_digest, file_mark
from setdrift.data.netcdf import is_passing_trouble
from setdrift.data.records import read_record, write_record_if_changed
from setdrift.data.zarr_files import is_store
from setdrift.errors import SetdriftError

Announce = Callable[[str], None]


@dataclass(frozen=True)
class InputFile:
    """One along-track file: where it is, what it holds, and which days it has observations of."""

    altimeter: str
    path: str
    digest: str
    first_day: dt.date
    last_day: dt.date

    def touches(self, first: dt.date, last: dt.date) -> bool:
        """Return whether the file may hold observations from first to last."""
        return self.first_day <= last and self.last_day >= first


@dataclass(frozen=True)
class Inventory:
    """What an analysis has to work on.

    Attributes
    ----------
    days : list of date
        Analysed days.
    observation_blocks : list of Block
        Blocks that hold the analysed days and the window on either side.
    analysis_blocks : list of Block
        Blocks that hold analysed days.
    set_aside : list of dict
        Files that cannot be used: altimeter, path, reason.
    counts : dict
        Numbers of files: used, examined (new or changed), set_aside, repeated (content seen already).
    """

    days: list[dt.date]
    observation_blocks: list[Block]
    analysis_blocks: list[Block]
    set_aside: list[dict[str, str]]
    counts: dict[str, int]


def take_inventory(configuration: Configuration, announce: Announce) -> Inventory:
    """Look at every input file, and write the manifests of the blocks that the analysis needs.

    A file whose size and modification time are as last time is not opened. Manifests that would not change
    are not written.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    announce : callable
        Told of what is unusual, and of the counts.

    Returns
    -------
    Inventory
        Days, blocks and files.

    Raises
    ------
    SetdriftError
        No file at all, no observations to tell the newest day by, or a gridded file is missing.
    """
    scan = _Scan(configuration.work / "inventory.json")
    files = _accepted(configuration, scan, announce)
    fixed = _fixed_digests(configuration, scan)
    scan.save()
    first, last = _settled_period(configuration, files)
    window = dt.timedelta(days=configuration.mapping.window_days)
    blocks = list(blocks_between(first - window, last + window, configuration.block_days))
    _write_manifests(configuration.work / "manifests", (first, last), window, blocks, files, scan.set_aside, fixed)
    counts = {"used": len(files), "examined": scan.examined}
    counts |= {"set_aside": len(scan.set_aside), "repeated": scan.repeated}
    announce("files: " + ", ".join(f"{number} {what.replace('_', ' ')}" for what, number in counts.items()))
    return Inventory(
        days_between(first, last),
        blocks,
        list(blocks_between(first, last, configuration.block_days)),
        scan.set_aside,
        counts,
    )


class _Scan:
    """Files as they were seen last time and are now."""

    def __init__(self, cache: Path) -> None:
        self._cache = cache
        try:
            before = read_record(cache) if cache.exists() else {}
        except SetdriftError:
            before = {}
        self._before: dict[str, Any] = before if isinstance(before, dict) else {}
        self._now: dict[str, Any] = {}
        self.set_aside: list[dict[str, str]] = []
        self.examined = 0
        self.repeated = 0

    def save(self) -> None:
        """Remember what was seen; files no longer there are forgotten."""
        write_record_if_changed(self._cache, self._now)

    def examine(self, key: str, path: Path, look: Callable[[Path], dict[str, Any]]) -> dict[str, Any]:
        """Return what a look at a file told; a new look is taken only if the file changed."""
        # what the disk refuses is looked at again every time; what is wrong with the content is remembered
        mark = file_mark(path)
        known = self._before.get(f"{key} {path}")
        if not isinstance(known, dict) or known.get("mark") != mark:
            known = {"mark": mark, "digest": file_digest(path), **look(path)}
            self.examined += 1
        self._now[f"{key} {path}"] = known
        return known


def _accepted(configuration: Configuration, scan: _Scan, announce: Announce) -> list[InputFile]:
    files: list[InputFile] = []
    any_match = False
    for name, altimeter in configuration.altimeters.items():
        paths = matching_files(configuration, altimeter)
        any_match = any_match or bool(paths)
        if not paths:
            announce(f"warning: altimeter {name}: no file matches {altimeter.files}")
        files += _of_altimeter(name, altimeter, paths, scan, announce)
    if not any_match:
        patterns = ", ".join(str(configuration.resolve(a.files)) for a in configuration.altimeters.values())
        raise SetdriftError(
            f"{configuration.path}: altimeters",
            f"no file matches {patterns}",
            "correct the patterns or fetch the files",
        )
    return files


def matching_files(configuration: Configuration, altimeter: Altimeter) -> list[Path]:
    """Return an altimeter's files in the order of their paths; folders but Zarr stores, and hidden files, do not count.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    altimeter : Altimeter
        One of its altimeters.

    Returns
    -------
    list of Path
        Regular files and folders ending in .zarr that match the pattern; what such folders hold does not count.
    """
    # relative to the folder, so that a bracket in the folder's own name is no pattern
    pattern = str(Path(altimeter.files).expanduser())
    names = glob.glob(pattern, root_dir=configuration.path.parent, recursive=True)  # noqa: PTH207 - pathlib's takes no ..
    paths = {configuration.resolve(name) for name in names}
    stores = {path for path in paths if is_store(path)}
    files = (path for path in paths if _is_regular(path) and not stores.intersection(path.parents))
    return sorted([*files, *(path for path in stores if not stores.intersection(path.parents))])


def _is_regular(path: Path) -> bool:
    try:
        return stat.S_ISREG(path.stat().st_mode)
    except OSError:
        return False


def _of_altimeter(
    name: str, altimeter: Altimeter, paths: Iterable[Path], scan: _Scan, announce: Announce
) -> list[InputFile]:
    key = f"{name} {digest(VERSIONS['observations'], altimeter.reading)}"
    files: dict[str, InputFile] = {}
    for path in paths:
        try:
            seen = scan.examine(key, path, lambda p: _look(p, altimeter))
        except OSError as error:
            seen = {"reason": f"{path}: cannot be read ({error.strerror}); mend its permissions or the disk"}
        except SetdriftError as error:
            seen = {"reason": str(error)}
        if "reason" in seen:
            scan.set_aside.append({"altimeter": name, "path": str(path), "reason": seen["reason"]})
            announce(f"set aside: {seen['reason']}")
        elif seen["digest"] in files:
            scan.repeated += 1
        else:
            days = (dt.date.fromisoformat(seen[end]) for end in ("first_day", "last_day"))
            files[seen["digest"]] = InputFile(name, str(path), seen["digest"], *days)
    return list(files.values())


def _look(path: Path, altimeter: Altimeter) -> dict[str, Any]:
    """Return the days a file has observations of, or why its content cannot be used."""
    try:
        span = read_time_span(path, altimeter)
    except SetdriftError as error:
        if is_passing_trouble(error):
            raise
        return {"reason": str(error)}
    if span is None:
        return {"reason": f"{path}: holds no time that can be believed; replace the file or move it away"}
    return {"first_day": span[0].isoformat(), "last_day": span[1].isoformat()}


def _fixed_digests(configuration: Configuration, scan: _Scan) -> dict[str, str | None]:
    """Return the digests of the gridded files."""
    digests: dict[str, str | None] = {"mean_dynamic_topography": None, "land": None, "depth": None}
    for section in digests:
        source = getattr(configuration, section)
        if source is None:
            continue
        path = configuration.resolve(source.file)
        try:
            digests[section] = scan.examine(section, path, lambda _: {})["digest"]
        except OSError as error:
            what = f"{path} cannot be read ({error.strerror})"
            raise SetdriftError(
                f"{configuration.path}: {section}.file", what, "correct the path or fetch the file"
            ) from error
    return digests


def _settled_period(configuration: Configuration, files: list[InputFile]) -> tuple[dt.date, dt.date]:
    """Return the first and last analysed day, "latest" being the newest day with observations."""
    period = configuration.period
    if period.end != "latest":
        return period.start, period.end
    where = f"{configuration.path}: period.end"
    if not files:
        raise SetdriftError(where, "is 'latest', but no file could be read", "give a date, or mend the files set aside")
    newest = max(file.last_day for file in files)
    if newest < period.start:
        what = f"is 'latest', but the newest observations are of {newest}, before period.start ({period.start})"
        raise SetdriftError(where, what, "fetch newer files or start earlier")
    return period.start, newest


def _write_manifests(
    folder: Path,
    period: tuple[dt.date, dt.date],
    window: dt.timedelta,
    blocks: list[Block],
    files: list[InputFile],
    set_aside: list[dict[str, str]],
    fixed: dict[str, str | None],
) -> None:
    write_record_if_changed(folder / "fixed.json", fixed)
    write_record_if_changed(folder / "set_aside.json", set_aside)
    write_record_if_changed(folder / "period.json", {"first": period[0], "last": period[1]})
    for block in blocks:
        days = block.days_within(period[0] - window, period[1] + window)
        touching = [dataclasses.asdict(file) for file in files if file.touches(days[0], days[-1])]
        manifest = {"block": block.label, "first_day": days[0], "last_day": days[-1], "files": touching}
        write_record_if_changed(folder / f"{block.label}.json", manifest)
