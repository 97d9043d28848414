"""Daily observations, edited, from the along-track files that a block's manifest lists."""

from __future__ import annotations

import dataclasses
import datetime as dt
import functools
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr

from setdrift.data.algorithms import VERSIONS
from setdrift.data.alongtrack import DAY_S, AlongTrack, concatenate, read_alongtrack
from setdrift.data.ancillary import LandMask, land_mask
from setdrift.data.bathymetry import SeaFloor, sea_floor
from setdrift.data.configuration import Configuration
from setdrift.data.day_store import DayStore, refresh_days
from setdrift.data.days import Block, day_number, days_between
from setdrift.data.digests import digest, file_digest
from setdrift.data.editing import REASONS, Edited, edit
from setdrift.data.grids import observation_area
from setdrift.data.netcdf import is_passing_trouble
from setdrift.data.plausibility import check_scale
from setdrift.data.receipts import receipt_path
from setdrift.data.records import read_record, write_record
from setdrift.errors import SetdriftError
from setdrift.numerics.along_pass_noise import NoiseEstimate, estimate_noise, pooled_noise

NOISE_MISFIT = 0.3
"""A configured noise that differs from the estimate by more than this share is warned of."""

Entry = dict[str, str]


def gather_observations(configuration: Configuration, block: Block, announce: Callable[[str], None]) -> dict[str, Any]:
    """Read and edit the observations of a block's days, where something they depend on changed.

    A day depends on its own files only: passes are inferred within it, so one that midnight cuts counts as two
    where the files do not number them.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    block : Block
        Days handled by this job.
    announce : callable
        Told of each day, for the log.

    Returns
    -------
    dict
        The job's receipt: stage, block, days (content digest, counts), white noise estimated for each altimeter,
        and files set aside.
    """
    manifest = read_record(configuration.work / "manifests" / f"{block.label}.json")
    fixed = read_record(configuration.work / "manifests" / "fixed.json")
    days = days_between(*(dt.date.fromisoformat(manifest[key]) for key in ("first_day", "last_day")))
    gatherer = _Gatherer(configuration, manifest["files"], days, fixed, announce)
    store = DayStore(configuration.work / "observations")
    contents = refresh_days(store, days, gatherer.made_from, gatherer.make, announce)
    receipts = {day.isoformat(): json.loads(store.attribute(day, "receipt") or "{}") for day in days}
    noise = _noise_of_days(list(receipts.values()))
    _compare_noise(configuration, block, noise, announce)
    # files that the inventory could not open belong to no day: every block's receipt names them
    unopened = read_record(configuration.work / "manifests" / "set_aside.json")
    refused = [entry for receipt in receipts.values() for entry in receipt["set_aside"]]
    set_aside = {entry["path"]: entry for entry in [*unopened, *refused]}
    receipt = {
        "stage": "observations",
        "block": block.label,
        "days": {day: {"content": contents[day], **receipts[day]} for day in contents},
        "noise": {name: _noise_entry(estimate) for name, estimate in noise.items()},
        "set_aside": list(set_aside.values()),
    }
    write_record(receipt_path(configuration, "observations", block), receipt)
    return receipt


def _noise_of_days(receipts: list[dict[str, Any]]) -> dict[str, NoiseEstimate]:
    """Return the white noise of each altimeter that has estimates."""
    found: dict[str, list[NoiseEstimate]] = {}
    for receipt in receipts:
        for name, counts in receipt["altimeters"].items():
            if counts["noise"]:
                estimate = NoiseEstimate(counts["noise"]["standard_deviation_m"], counts["noise"]["differences"])
                found.setdefault(name, []).append(estimate)
    return {name: pooled for name in sorted(found) if (pooled := pooled_noise(found[name]))}


def _compare_noise(
    configuration: Configuration, block: Block, noise: dict[str, NoiseEstimate], announce: Callable[[str], None]
) -> None:
    for name, estimate in noise.items():
        configured = configuration.altimeters[name].noise_m
        if abs(estimate.standard_deviation / configured - 1.0) > NOISE_MISFIT:
            announce(
                f"warning: altimeter {name}: noise_m is {configured:g}, but in block {block.label} its observations "
                f"scatter by {estimate.standard_deviation:.4f} m; set noise_m nearer to that"
            )


def _noise_entry(estimate: NoiseEstimate | None) -> dict[str, Any] | None:
    # rounded, so that no machine's last digits make another receipt
    if estimate is None:
        return None
    return {"standard_deviation_m": round(estimate.standard_deviation, 6), "differences": estimate.differences}


class _Gatherer:
    """Makes days one after another; a file is read when the first day needs it, and forgotten after the last."""

    def __init__(
        self,
        configuration: Configuration,
        files: list[Entry],
        days: list[dt.date],
        fixed: dict[str, str | None],
        announce: Callable[[str], None],
    ) -> None:
        self._configuration = configuration
        self._files = files
        self._days = days
        self._announce = announce
        self._area = observation_area(configuration)
        self._tracks: dict[str, AlongTrack | str] = {}
        land = configuration.land or configuration.mean_dynamic_topography
        self._common = digest(
            VERSIONS["observations"],
            list(configuration.altimeters),
            configuration.editing,
            dataclasses.asdict(self._area),
            [land.variable, fixed["land"] or fixed["mean_dynamic_topography"]],
            [configuration.depth.variable if configuration.depth else None, fixed["depth"]],
        )

    @functools.cached_property
    def _land(self) -> LandMask:
        return land_mask(self._configuration)

    @functools.cached_property
    def _floor(self) -> SeaFloor | None:
        return sea_floor(self._configuration)

    def made_from(self, day: dt.date) -> str:
        """Return the digest of all that a day depends on."""
        files = self._touching(day)
        reading = {name: self._configuration.altimeters[name].reading for name in {e["altimeter"] for e in files}}
        return digest(self._common, day, reading, [[entry["altimeter"], entry["digest"]] for entry in files])

    def make(self, day: dt.date) -> xr.Dataset:
        """Read and edit a day's observations."""
        self._tracks = {e["path"]: self._tracks[e["path"]] for e in self._touching(day) if e["path"] in self._tracks}
        files = self._touching(day)
        set_aside = []
        edited: dict[str, Edited] = {}
        for name in self._configuration.altimeters:
            tracks = []
            for entry in (entry for entry in files if entry["altimeter"] == name):
                track = self._track(entry)
                if isinstance(track, str):
                    set_aside.append({"altimeter": name, "path": entry["path"], "reason": track})
                else:
                    tracks.append(_of_day(track, day, entry))
            if tracks:
                edited[name] = edit(
                    concatenate(tracks), self._configuration.editing, self._land, self._area, self._floor
                )
        receipt = _counts(edited) | {"files": len(files) - len(set_aside), "set_aside": set_aside}
        return _dataset(edited, list(self._configuration.altimeters), receipt)

    def _touching(self, day: dt.date) -> list[Entry]:
        # dates in ISO form compare as text
        return [e for e in self._files if e["first_day"] <= day.isoformat() <= e["last_day"]]

    def _track(self, entry: Entry) -> AlongTrack | str:
        """Return a file's observations of the block, or why there are none."""
        path = entry["path"]
        if path not in self._tracks:
            land = self._land  # a land mask that cannot be read is no fault of this file
            try:
                self._tracks[path] = self._read(entry, land)
            except SetdriftError as error:
                if is_passing_trouble(error):
                    # set aside, the file would be missed for good: the day's digest says it was read
                    raise
                self._announce(f"set aside: {error}")
                self._tracks[path] = str(error)
        return self._tracks[path]

    def _read(self, entry: Entry, land: LandMask) -> AlongTrack:
        path = Path(entry["path"])
        try:
            found = file_digest(path)
        except OSError as error:
            what = f"could be read when the inventory was taken, but no longer ({error.strerror})"
            raise SetdriftError(str(path), what, "run the workflow again") from error
        if found != entry["digest"]:
            raise SetdriftError(str(path), "changed since the inventory was taken", "run the workflow again")
        track = read_alongtrack(path, self._configuration.altimeters[entry["altimeter"]])
        check_scale(path, track, self._configuration.editing, land)
        first, last = (day_number(day) * DAY_S for day in (self._days[0], self._days[-1] + dt.timedelta(days=1)))
        return track.select(np.isnan(track.time) | ((track.time >= first) & (track.time < last)))


def _of_day(track: AlongTrack, day: dt.date, entry: Entry) -> AlongTrack:
    """Return a day's observations; those without a time count on the file's first day."""
    start = day_number(day) * DAY_S
    within = (track.time >= start) & (track.time < start + DAY_S)
    return track.select(within | np.isnan(track.time) if entry["first_day"] == day.isoformat() else within)


def _counts(edited: dict[str, Edited]) -> dict[str, Any]:
    """Return how many observations came in, stayed and were dropped, in all and by altimeter, with its noise."""
    altimeters = {
        name: {
            "in": e.received,
            "kept": len(e.track),
            "dropped": {r: n for r, n in e.dropped.items() if n},
            "noise": _noise_entry(_noise(e.track)),
        }
        for name, e in edited.items()
    }
    return {
        "in": sum(e.received for e in edited.values()),
        "kept": sum(len(e.track) for e in edited.values()),
        "dropped": {reason: sum(e.dropped[reason] for e in edited.values()) for reason in REASONS},
        "altimeters": altimeters,
    }


def _noise(track: AlongTrack) -> NoiseEstimate | None:
    assert track.pass_number is not None
    return estimate_noise(track.time, track.sea_level_anomaly, track.pass_number)


def _dataset(edited: dict[str, Edited], names: list[str], receipt: dict[str, Any]) -> xr.Dataset:
    """Return the observations of all altimeters in the order of time, then altimeter."""
    columns: dict[str, Any] = {}
    for column in ("time", "latitude", "longitude", "sea_level_anomaly", "pass_number"):
        kind = np.int64 if column == "pass_number" else np.float64
        columns[column] = np.concatenate([np.empty(0, kind), *(getattr(e.track, column) for e in edited.values())])
    index = [np.full(len(e.track), names.index(name), dtype=np.int16) for name, e in edited.items()]
    columns["altimeter"] = np.concatenate([np.empty(0, np.int16), *index])
    order = np.lexsort((columns["altimeter"], columns["time"]))
    attributes = {
        "time": {"units": "seconds since 1970-01-01 00:00:00", "calendar": "standard", "standard_name": "time"}
    }
    attributes |= {"sea_level_anomaly": {"units": "m", "standard_name": "sea_surface_height_above_mean_sea_level"}}
    attributes |= {"latitude": {"units": "degrees_north", "standard_name": "latitude"}}
    attributes |= {"longitude": {"units": "degrees_east", "standard_name": "longitude"}}
    return xr.Dataset(
        {name: ("observation", values[order], attributes.get(name, {})) for name, values in columns.items()},
        attrs={"altimeters": " ".join(names), "receipt": json.dumps(receipt)},
    )
