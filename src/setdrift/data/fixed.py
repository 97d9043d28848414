"""Reading the fixed fields of an analysis, and their digests."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike, NDArray

from setdrift.data.configuration import Configuration
from setdrift.data.records import read_record
from setdrift.errors import SetdriftError


def load_fixed_fields(configuration: Configuration) -> xr.Dataset:
    """Read mean dynamic topography and land fraction on the working grid.

    Parameters
    ----------
    configuration : Configuration
        The analysis.

    Returns
    -------
    Dataset
        In memory.

    Raises
    ------
    SetdriftError
        The file is missing or damaged.
    """
    path = configuration.work / "fixed" / "fields.nc"
    try:
        with xr.open_dataset(path, engine="netcdf4") as file:
            return file.load()
    except (OSError, ValueError) as error:
        raise SetdriftError(str(path), "is missing or damaged", "delete it and run the workflow again") from error


def fixed_digest(configuration: Configuration, name: str) -> str:
    """Return the digest of a fixed field's values."""
    return str(read_record(configuration.work / "fixed" / "fields.json")[name])


def is_sea(land_fraction: ArrayLike) -> NDArray[np.bool_]:
    """Return which cells count as sea: those that are land by less than half."""
    return np.asarray(land_fraction) < 0.5
