"""The daily product: days of maps and currents as one CF-described Zarr store."""

from __future__ import annotations

import datetime as dt
import json
import warnings
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import zarr
from numpy.typing import NDArray
from zarr.storage import MemoryStore

from setdrift.data.configuration import Configuration
from setdrift.data.daily_layout import day_dataset, encoding, layout_digest, template
from setdrift.data.grids import analysis_grid
from setdrift.data.metadata import DAILY_PRODUCT, global_attributes
from setdrift.data.product_store import commit_objects, is_chunk, replace_store, sweep

PUBLICATION_KEYS = {"history", "date_created"}
"""Global attributes that tell when the store was written, not what it is."""


@dataclass(frozen=True)
class PublishedDay:
    """A day in the store: the digest of what it was made from, and its revision."""

    source: str
    revision: int


@dataclass(frozen=True)
class DailyProduct:
    """The store of one analysis.

    Attributes
    ----------
    configuration : Configuration
        The analysis.
    fixed : mapping
        Fields without time on the analysis grid, by name.
    load_day : callable
        Gives a day's fields on the analysis grid, by name.
    now : datetime
        Time of publication, UTC.
    """

    configuration: Configuration
    fixed: Mapping[str, NDArray[Any]]
    load_day: Callable[[dt.date], Mapping[str, NDArray[Any]]]
    now: dt.datetime

    @property
    def path(self) -> Path:
        """Folder of the store."""
        return self.configuration.products / "daily.zarr"

    def publish(self, sources: Mapping[dt.date, str]) -> dict[str, list[dt.date]]:
        """Bring the store in line with the analysed days.

        New days at the end and changed days are committed in place. Anything else (first publication, another
        grid or format, days taken away or put before the first) rebuilds the store and exchanges the two.

        Parameters
        ----------
        sources : mapping
            Digest of everything behind each day, in order of days.

        Returns
        -------
        dict
            Days `added`, `rewritten` and `retired`.
        """
        sweep(self.path)
        published = self._published()
        kept = [day for day in published if day in sources]
        account = {
            "added": [day for day in sources if day not in published],
            # an odd revision is left by a rewriting that was interrupted: the day may be a mixture
            "rewritten": [day for day in kept if published[day] != PublishedDay(sources[day], _even(published[day]))],
            "retired": [day for day in published if day not in sources],
        }
        revisions = {day: published[day].revision if day in published else 0 for day in sources}
        in_place = bool(kept) and kept == list(sources)[: len(kept)] and not account["retired"]
        after = {day: _after(revision, day in account["rewritten"]) for day, revision in revisions.items()}
        if not (in_place and self._same_layout()):
            replace_store(self.path, self._objects(sources, after, list(sources)))
        elif account["added"] or account["rewritten"] or not self._same_attributes(sources):
            objects = self._objects(sources, after, account["rewritten"] + account["added"])
            self._mark_rewriting(revisions, account["rewritten"])
            self._commit(objects)
        return account

    def _published(self) -> dict[dt.date, PublishedDay]:
        """Read what the store holds; nothing where there is no sound store."""
        try:
            group = zarr.open_group(self.path, mode="r")
            sources = json.loads(str(group.attrs["source_digests"]))
            revisions = np.asarray(group["revision"])
        except (OSError, KeyError, ValueError):
            return {}
        return {
            dt.date.fromisoformat(day): PublishedDay(source, int(revision))
            for (day, source), revision in zip(sources.items(), revisions, strict=False)
        }

    def _same_layout(self) -> bool:
        group = zarr.open_group(self.path, mode="r")
        same_format = group.metadata.zarr_format == self.configuration.publish.zarr_format
        return same_format and group.attrs.get("layout_digest") == self._layout_digest()

    def _same_attributes(self, sources: Mapping[dt.date, str]) -> bool:
        """Return whether the store describes itself as the configuration now asks."""
        published = zarr.open_group(self.path, mode="r").attrs.asdict()
        return all(published.get(k) == v for k, v in self._attributes(sources).items() if k not in PUBLICATION_KEYS)

    def _attributes(self, sources: Mapping[dt.date, str]) -> dict[str, object]:
        grid = analysis_grid(self.configuration)
        return global_attributes(self.configuration, DAILY_PRODUCT, grid, list(sources), self.now) | {
            "source_digests": json.dumps({day.isoformat(): source for day, source in sources.items()}),
            "layout_digest": self._layout_digest(),
        }

    def _layout_digest(self) -> str:
        return layout_digest(analysis_grid(self.configuration), self.fixed)

    def _mark_rewriting(self, revisions: Mapping[dt.date, int], rewritten: Sequence[dt.date]) -> None:
        """Make the revision of days about to be rewritten odd, before any of their chunks changes."""
        if rewritten:
            odd = {day: revision | 1 if day in rewritten else revision for day, revision in revisions.items()}
            objects = self._objects(dict.fromkeys(revisions, ""), odd, [])
            commit_objects(self.path, {k: v for k, v in objects.items() if _is_revision(k)})

    def _commit(self, objects: dict[str, bytes]) -> None:
        """Write days' chunks, then the metadata, then the even revisions.

        Were the revisions even before the metadata tells the days' new sources, a day interrupted in between would
        pass for the old one, if the change was then undone.
        """
        commit_objects(self.path, {k: v for k, v in objects.items() if not _is_revision(k)})
        commit_objects(self.path, objects)

    def _objects(
        self, sources: Mapping[dt.date, str], revisions: Mapping[dt.date, int], written: Sequence[dt.date]
    ) -> dict[str, bytes]:
        """Build the store in memory: metadata for all days, chunks for the days to be written."""
        grid, zarr_format = analysis_grid(self.configuration), self.configuration.publish.zarr_format
        whole = template(grid, list(sources), revisions, self.fixed)
        whole.attrs = self._attributes(sources)
        memory: dict[str, Any] = {}
        store = MemoryStore(memory)
        position = {day: i for i, day in enumerate(sources)}
        with warnings.catch_warnings():
            # readers that know consolidated metadata open faster; others follow the groups' own
            warnings.filterwarnings("ignore", message="Consolidated metadata is currently not part")
            whole.to_zarr(
                store,
                mode="w",
                compute=False,
                consolidated=True,
                zarr_format=zarr_format,
                encoding=encoding(whole, grid, zarr_format),
            )
            for day in written:
                region = {"time": slice(position[day], position[day] + 1)}
                day_dataset(self.load_day(day)).to_zarr(store, region=region, write_empty_chunks=True)
        return {key: value.to_bytes() for key, value in memory.items()}


def _is_revision(key: str) -> bool:
    return key.startswith("revision/") and is_chunk(key)


def _even(day: PublishedDay) -> int:
    return day.revision & ~1


def _after(revision: int, rewritten: bool) -> int:
    """Return the even revision of a day after publication."""
    return (revision | 1) + 1 if rewritten else revision
