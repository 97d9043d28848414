"""A folder of small NetCDF files, one a day, each knowing what it was made from.

One file a day can be replaced by a rename, so a killed job leaves whole days or none. The attribute `made_from`
is the digest of everything the day depends on: a day whose digest is unchanged is not made again.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable, Iterable
from pathlib import Path

import netCDF4
import xarray as xr

from setdrift.data.digests import digest
from setdrift.data.records import replacing
from setdrift.errors import SetdriftError

Announce = Callable[[str], None]


class DayStore:
    """The days of one stage.

    Parameters
    ----------
    folder : Path
        Where the files are; made when first written to.
    """

    def __init__(self, folder: Path) -> None:
        self.folder = folder

    def path(self, day: dt.date) -> Path:
        """Return the file of a day."""
        return self.folder / f"{day.isoformat()}.nc"

    def attribute(self, day: dt.date, name: str) -> str | None:
        """Return a global attribute of a day's file, or None where there is no sound file."""
        try:
            with netCDF4.Dataset(self.path(day)) as file:
                return str(file.getncattr(name))
        except (OSError, AttributeError):
            return None

    def load(self, day: dt.date) -> xr.Dataset:
        """Read a day into memory, times undecoded.

        Parameters
        ----------
        day : date
            The day.

        Returns
        -------
        Dataset
            The day's variables.

        Raises
        ------
        SetdriftError
            There is no sound file for the day.
        """
        path = self.path(day)
        try:
            with xr.open_dataset(path, engine="netcdf4", decode_times=False) as file:
                return file.load()
        except (OSError, ValueError) as error:
            raise SetdriftError(
                str(path),
                "is missing or damaged",
                f"delete the .json receipts in {self.folder} and run again",
            ) from error

    def save(self, day: dt.date, dataset: xr.Dataset, made_from: str) -> str:
        """Write a day in one step.

        Parameters
        ----------
        day : date
            The day.
        dataset : Dataset
            Its variables.
        made_from : str
            Digest of all it depends on.

        Returns
        -------
        str
            Digest of its content.
        """
        content = content_digest(dataset)
        dataset = dataset.assign_attrs(made_from=made_from, content=content)
        with replacing(self.path(day)) as temporary:
            dataset.to_netcdf(temporary, engine="netcdf4")
        return content


def content_digest(dataset: xr.Dataset) -> str:
    """Return the digest of a dataset's names, values and attributes.

    The attribute `receipt` does not count: it tells what became of the input, which may change no value.

    Parameters
    ----------
    dataset : Dataset
        Any dataset in memory.

    Returns
    -------
    str
        Hexadecimal digest.
    """
    parts: list[object] = [{str(k): str(v) for k, v in dataset.attrs.items() if k != "receipt"}]
    for name in sorted(dataset.variables, key=str):
        variable = dataset.variables[name]
        parts += [str(name), list(variable.dims), variable.values]
    return digest(*parts)


def refresh_days(
    store: DayStore,
    days: Iterable[dt.date],
    made_from: Callable[[dt.date], str],
    make: Callable[[dt.date], xr.Dataset],
    announce: Announce,
) -> dict[str, str]:
    """Make the days that are missing or depend on something that changed, and no other.

    Parameters
    ----------
    store : DayStore
        Where the days are kept.
    days : iterable of date
        The days wanted.
    made_from : callable
        Digest of all a day depends on.
    make : callable
        Computes a day.
    announce : callable
        Told of each day, for the log.

    Returns
    -------
    dict
        Content digest of each day.
    """
    contents = {}
    for day in days:
        wanted = made_from(day)
        content = store.attribute(day, "content") if store.attribute(day, "made_from") == wanted else None
        if content is None:
            content = store.save(day, make(day), wanted)
            announce(f"{day} done")
        else:
            announce(f"{day} unchanged")
        contents[day.isoformat()] = content
    return contents
