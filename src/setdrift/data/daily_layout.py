"""Layout of the daily product: coordinates, encoding, and rounding of its variables."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from typing import Any

import dask.array
import numcodecs
import numpy as np
import xarray as xr
from numpy.typing import NDArray
from zarr.codecs import BloscCodec

from setdrift.data.conventions import DAILY_VARIABLES, Variable
from setdrift.data.days import day_number
from setdrift.data.digests import digest
from setdrift.data.grids import Grid

DAILY = tuple(variable for variable in DAILY_VARIABLES if variable.stage != "fixed")
FIXED = tuple(variable for variable in DAILY_VARIABLES if variable.stage == "fixed")

TIME_CHUNK = 4096
"""Values of `time` and `revision` in one chunk: eleven years, so that a commit rewrites one object of each."""
GLOBAL_CHUNK = (360, 480)
"""Largest rows and columns of one chunk of a map."""

LAYOUT_VERSION = 1
"""Raised by hand whenever stores written before can no longer be added to."""


def layout_digest(grid: Grid, fixed: Mapping[str, NDArray[Any]]) -> str:
    """Return the digest of all that a store's days must have in common."""
    fields = {name: digest(rounded(fixed[name], variable)) for variable in FIXED for name in [variable.name]}
    table = [[v.name, v.step, v.attributes] for v in DAILY_VARIABLES]
    return digest(LAYOUT_VERSION, grid.latitude, grid.longitude, table, fields)


def rounded(values: NDArray[Any], variable: Variable) -> NDArray[Any]:
    """Round values to the variable's step, in the type it is published in.

    Parameters
    ----------
    values : array
        Any shape.
    variable : Variable
        A row of the table of names.

    Returns
    -------
    array
        float32, or an integer type for counts and flags.
    """
    if variable.step == 0.0:
        return values.astype(_dtype(variable))
    return np.asarray(np.round(values / variable.step) * variable.step, dtype=np.float32)


def template(
    grid: Grid, days: Sequence[dt.date], revisions: Mapping[dt.date, int], fixed: Mapping[str, NDArray[Any]]
) -> xr.Dataset:
    """Describe a whole store: coordinates and fixed fields with values, daily fields as placeholders.

    Parameters
    ----------
    grid : Grid
        The product's grid.
    days : sequence of date
        Days it holds.
    revisions : mapping
        Revision of each day.
    fixed : mapping
        Fields without time, by name.

    Returns
    -------
    Dataset
        Daily fields are dask arrays of zeros, chunked as in the store.
    """
    dataset = _coordinates(grid, days)
    dataset["revision"] = (
        "time",
        np.array([revisions[day] for day in days], dtype=np.int32),
        {"long_name": "revision of the day: odd while it is being rewritten", "units": "1"},
    )
    for variable in FIXED:
        values = rounded(fixed[variable.name], variable)
        dataset[variable.name] = (("latitude", "longitude"), values, variable.attributes)
    for variable in DAILY:
        shape = (len(days), *grid.shape)
        empty = dask.array.zeros(shape, dtype=_dtype(variable), chunks=_chunks(grid))
        dataset[variable.name] = (("time", "latitude", "longitude"), empty, variable.attributes)
    return dataset


def day_dataset(fields: Mapping[str, NDArray[Any]]) -> xr.Dataset:
    """Return one day's fields, rounded, with a time dimension of one."""
    dims = ("time", "latitude", "longitude")
    return xr.Dataset({v.name: (dims, rounded(fields[v.name], v)[None]) for v in DAILY})


def encoding(dataset: xr.Dataset, grid: Grid, zarr_format: int) -> dict[str, dict[str, Any]]:
    """Return how each variable is chunked, compressed and filled.

    Parameters
    ----------
    dataset : Dataset
        The store's template.
    grid : Grid
        The product's grid.
    zarr_format : int
        2 or 3.

    Returns
    -------
    dict
        Encoding by variable.
    """
    compressors: tuple[Any, ...] = (BloscCodec(cname="zstd", clevel=5, shuffle="shuffle"),)
    if zarr_format == 2:
        compressors = (numcodecs.Blosc(cname="zstd", clevel=5, shuffle=numcodecs.Blosc.SHUFFLE),)
    result: dict[str, dict[str, Any]] = {}
    for name, variable in dataset.variables.items():
        chosen: dict[str, Any] = {"compressors": compressors}
        if variable.dims[:1] == ("time",):
            rest = _chunks(grid)[1:] if variable.ndim == 3 else variable.shape[1:]
            chosen["chunks"] = (1 if variable.ndim == 3 else TIME_CHUNK, *rest)
        elif variable.ndim:
            chosen["chunks"] = variable.shape
        chosen["_FillValue"] = np.float32(np.nan) if variable.dtype == np.float32 else None
        result[str(name)] = chosen
    return result


def _chunks(grid: Grid) -> tuple[int, int, int]:
    rows, columns = (min(size, largest) for size, largest in zip(grid.shape, GLOBAL_CHUNK, strict=True))
    return 1, rows, columns


def _dtype(variable: Variable) -> type[np.generic]:
    if variable.step > 0.0:
        return np.float32
    return np.int8 if variable.standard_name == "status_flag" else np.int32


def _coordinates(grid: Grid, days: Sequence[dt.date]) -> xr.Dataset:
    hours = np.array([day_number(day) * 24 + 12 for day in days], dtype=np.int64)
    time = {
        "standard_name": "time",
        "long_name": "time of the snapshot",
        "units": "hours since 1970-01-01 00:00:00",
        "calendar": "standard",
        "units_metadata": "leap_seconds: none",
        "axis": "T",
    }
    earth = {
        "grid_mapping_name": "latitude_longitude",
        "semi_major_axis": 6378137.0,
        "inverse_flattening": 298.257223563,
        "longitude_of_prime_meridian": 0.0,
        "geographic_crs_name": "WGS 84",
    }
    return xr.Dataset(
        {
            "earth": ((), np.int32(0), earth),
            "latitude_bounds": (("latitude", "edge"), _bounds(grid.latitude, grid.spacing)),
            "longitude_bounds": (("longitude", "edge"), _bounds(grid.longitude, grid.spacing)),
        },
        coords={
            "time": ("time", hours, time),
            "latitude": ("latitude", grid.latitude, _axis("latitude", "degrees_north", "Y")),
            "longitude": ("longitude", grid.longitude, _axis("longitude", "degrees_east", "X")),
        },
    )


def _axis(name: str, units: str, axis: str) -> dict[str, str]:
    return {"standard_name": name, "long_name": name, "units": units, "axis": axis, "bounds": f"{name}_bounds"}


def _bounds(centres: NDArray[np.floating], spacing: float) -> NDArray[np.floating]:
    return np.stack((centres - spacing / 2.0, centres + spacing / 2.0), axis=1)
