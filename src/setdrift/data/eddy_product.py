"""The eddy product: detections with their contours, and trajectories, as one CF-described Zarr store."""

from __future__ import annotations

import datetime as dt
import warnings
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr
import zarr
from numpy.typing import NDArray
from zarr.storage import MemoryStore

from setdrift.data.configuration import Configuration
from setdrift.data.conventions import EDDY_COLUMNS
from setdrift.data.days import day_number
from setdrift.data.grids import analysis_grid
from setdrift.data.metadata import EDDY_PRODUCT, global_attributes
from setdrift.data.product_store import replace_store

CONTOURS = {"outer": "outermost closed contour", "fastest": "contour of fastest mean rotation"}


def publish_eddy_store(
    configuration: Configuration,
    days: Mapping[dt.date, xr.Dataset],
    identifiers: Mapping[dt.date, NDArray[np.int64]],
    source: str,
    now: dt.datetime,
) -> bool:
    """Build the store of eddies and put it in place of the one before in one step, unless they are the same.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    days : mapping
        Eddies of each day.
    identifiers : mapping
        Trajectory of each eddy, by day.
    source : str
        Digest of all it is made from.
    now : datetime
        Time of publication, UTC.

    Returns
    -------
    bool
        Whether the store was written.
    """
    path = configuration.products / "eddies.zarr"
    root = xr.Dataset(
        attrs=global_attributes(configuration, EDDY_PRODUCT, analysis_grid(configuration), list(days), now)
    )
    root.attrs["source_digest"] = source
    if _holds(path, root.attrs, configuration.publish.zarr_format):
        return False
    detections = detections_dataset(days, identifiers)
    tree = xr.DataTree.from_dict(
        {"/": root, "/detections": detections, "/trajectories": trajectories_dataset(detections)}
    )
    memory: dict[str, Any] = {}
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Consolidated metadata is currently not part")
        tree.to_zarr(MemoryStore(memory), zarr_format=configuration.publish.zarr_format, consolidated=True)
    objects = {key: value.to_bytes() for key, value in memory.items()}
    replace_store(path, objects)
    return True


def _holds(path: Path, attributes: Mapping[Any, Any], zarr_format: int) -> bool:
    """Return whether there is a sound store made from the same, in the same format, under the same settings."""
    try:
        group = zarr.open_group(path, mode="r")
    except (OSError, KeyError, ValueError):
        return False
    same = all(group.attrs.get(key) == attributes[key] for key in ("source_digest", "settings_digest"))
    return same and group.metadata.zarr_format == zarr_format


def detections_dataset(
    days: Mapping[dt.date, xr.Dataset], identifiers: Mapping[dt.date, NDArray[np.int64]]
) -> xr.Dataset:
    """Arrange all detections in the order of days (CF indexed ragged array of trajectories).

    Parameters
    ----------
    days : mapping
        Eddies of each day.
    identifiers : mapping
        Trajectory of each eddy, by day.

    Returns
    -------
    Dataset
        One value a detection; contours as CF geometry containers.
    """
    sizes = [day.sizes.get("eddy", 0) for day in days.values()]
    hours = np.repeat([day_number(day) * 24 + 12 for day in days], sizes).astype(np.int64)
    owner = np.concatenate([np.empty(0, np.int64), *identifiers.values()])
    unique, index = np.unique(owner, return_inverse=True)
    columns: dict[str, Any] = {
        "time": ("detection", hours, _TIME),
        "trajectory": ("trajectory", unique, _IDENTIFIER),
        "trajectory_index": (
            "detection",
            index.astype(np.int32),
            {"long_name": "which trajectory the detection belongs to", "instance_dimension": "trajectory"},
        ),
        "polarity": ("detection", _joined(days, "polarity", np.int8), _POLARITY),
    }
    for column in EDDY_COLUMNS:
        attributes = column.attributes if column.name in {"latitude", "longitude"} else column.attributes | _PLACED
        columns[column.name] = ("detection", _joined(days, column.name, _kind(column.name)), attributes)
    for contour, meaning in CONTOURS.items():
        columns |= _contour(days, contour, meaning)
    dataset = xr.Dataset(columns, attrs={"featureType": "trajectory"})
    return dataset.set_coords(["time", "latitude", "longitude"])


def trajectories_dataset(detections: xr.Dataset) -> xr.Dataset:
    """Arrange the detections one trajectory after another (CF contiguous ragged array).

    Parameters
    ----------
    detections : Dataset
        As `detections_dataset` returns them.

    Returns
    -------
    Dataset
        One value a point, in the order of trajectories, then time; `row_size` points each.
    """
    index = detections["trajectory_index"].values
    order = np.lexsort((detections["time"].values, index))
    count = np.bincount(index, minlength=detections.sizes["trajectory"]).astype(np.int32)
    columns: dict[str, Any] = {
        "trajectory": ("trajectory", detections["trajectory"].values, _IDENTIFIER),
        "row_size": (
            "trajectory",
            count,
            {"long_name": "number of points of the trajectory", "sample_dimension": "point"},
        ),
        "detection": (
            "point",
            order.astype(np.int64),
            {"long_name": "which detection the point is, counted from 0", "units": "1"},
        ),
    }
    for name in ("time", "polarity", *(column.name for column in EDDY_COLUMNS)):
        columns[name] = ("point", detections[name].values[order], detections[name].attrs)
    dataset = xr.Dataset(columns, attrs={"featureType": "trajectory"})
    return dataset.set_coords(["time", "latitude", "longitude"])


_TIME = {
    "standard_name": "time",
    "long_name": "time of the map",
    "units": "hours since 1970-01-01 00:00:00",
    "calendar": "standard",
    "units_metadata": "leap_seconds: none",
}
_IDENTIFIER = {"cf_role": "trajectory_id", "long_name": "identifier, derived from the first detection"}
_POLARITY = {
    "long_name": "polarity: high sea level is anticyclonic in both hemispheres",
    "standard_name": "status_flag",
    "flag_values": [-1, 1],
    "flag_meanings": "cyclonic anticyclonic",
}
_PLACED = {"coordinates": "time latitude longitude"}


def _contour(days: Mapping[dt.date, xr.Dataset], contour: str, meaning: str) -> dict[str, Any]:
    node = f"{contour}_node"
    container = {
        "long_name": meaning,
        "geometry_type": "polygon",
        "node_count": f"{contour}_node_count",
        "node_coordinates": f"{contour}_latitude {contour}_longitude",
    }
    latitude = {"long_name": f"latitude of the {meaning}", "units": "degrees_north", "axis": "Y"}
    longitude = {"long_name": f"longitude of the {meaning}", "units": "degrees_east", "axis": "X"}
    return {
        f"{contour}_contour": ((), np.int32(0), container),
        f"{contour}_node_count": (
            "detection",
            _joined(days, f"{contour}_size", np.int32),
            {"long_name": f"number of points of the {meaning}"},
        ),
        f"{contour}_latitude": (node, _joined(days, f"{contour}_latitude", np.float32), latitude),
        f"{contour}_longitude": (node, _joined(days, f"{contour}_longitude", np.float32), longitude),
    }


def _joined(days: Mapping[dt.date, xr.Dataset], name: str, kind: type[np.generic]) -> NDArray[Any]:
    return np.concatenate([np.empty(0, kind), *(day[name].values.astype(kind) for day in days.values())])


def _kind(name: str) -> type[np.generic]:
    return np.float64 if name in {"latitude", "longitude"} else np.float32
