"""Zarr stores seen as NetCDF files are: groups of variables that mask and unpack their values."""

from __future__ import annotations

import base64
import struct
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import zarr
from numpy.typing import NDArray

ENDING = ".zarr"
"""What the name of a folder ends in that is taken for a store."""


def is_store(path: Path) -> bool:
    """Return whether a path is a folder named as a Zarr store."""
    return path.name.endswith(ENDING) and path.is_dir()


@dataclass(frozen=True)
class ZarrVariable:
    """An array of a store, read as netCDF4 reads a variable; a chunk that is absent holds the array's filling."""

    name: str
    dimensions: tuple[str, ...]
    array: Any
    attributes: Mapping[str, Any]

    @property
    def shape(self) -> tuple[int, ...]:
        """Sizes of the dimensions."""
        return tuple(self.array.shape)

    @property
    def ndim(self) -> int:
        """The number of dimensions."""
        return len(self.array.shape)

    @property
    def dtype(self) -> Any:
        """Type of the stored values."""
        return self.array.dtype

    def ncattrs(self) -> list[str]:
        """Return the names of the attributes."""
        return list(self.attributes)

    def getncattr(self, name: str) -> Any:
        """Return an attribute."""
        return self.attributes[name]

    def __getitem__(self, key: Any) -> np.ma.MaskedArray[Any, Any]:
        """Return values unpacked, masked where missing or outside the valid range."""
        stored = np.asarray(self.array[key])
        if str(self.attributes.get("_Unsigned", "")).lower() == "true" and stored.dtype.kind == "i":
            stored = stored.view(stored.dtype.str.replace("i", "u"))
        values = stored
        if "scale_factor" in self.attributes or "add_offset" in self.attributes:
            factor, offset = (
                float(self.attributes.get(name, default))
                for name, default in (("scale_factor", 1.0), ("add_offset", 0.0))
            )
            values = stored.astype(np.float64) * factor + offset
        return np.ma.masked_array(values, mask=self._missing(stored))

    def _missing(self, stored: NDArray[Any]) -> NDArray[np.bool_]:
        missing = np.zeros(stored.shape, dtype=bool)
        for name in ("_FillValue", "missing_value"):
            for filling in np.atleast_1d(self.attributes.get(name, [])):
                missing |= stored == _number(filling)
        low, high = self.attributes.get("valid_range", (None, None))
        low, high = self.attributes.get("valid_min", low), self.attributes.get("valid_max", high)
        if low is not None:
            missing |= stored < _number(low)
        if high is not None:
            missing |= stored > _number(high)
        return missing


@dataclass(frozen=True)
class ZarrFile:
    """A store or one of its groups, with what is used of netCDF4.Dataset."""

    path: str
    variables: dict[str, ZarrVariable]
    groups: dict[str, ZarrFile]

    def filepath(self) -> str:
        """Return the path of the store."""
        return self.path


def open_store(path: Path) -> ZarrFile:
    """Open a Zarr store, format 2 or 3.

    Parameters
    ----------
    path : Path
        The store's folder.

    Returns
    -------
    ZarrFile
        Its groups and variables; values are read when asked for.
    """
    # consolidated metadata may be older than the arrays
    return _wrapped(str(path), zarr.open_group(str(path), mode="r", use_consolidated=False))


def _wrapped(path: str, group: Any) -> ZarrFile:
    found = {name: _variable(name, array) for name, array in sorted(group.arrays())}
    return ZarrFile(path, found, {name: _wrapped(path, child) for name, child in sorted(group.groups())})


def _variable(name: str, array: Any) -> ZarrVariable:
    attributes = dict(array.attrs)
    names = attributes.pop("_ARRAY_DIMENSIONS", None) or getattr(array.metadata, "dimension_names", None)
    names = names or [None] * len(array.shape)
    if len(names) != len(array.shape):
        raise ValueError(f"variable {name} has {len(array.shape)} dimensions and {len(names)} names of dimensions")
    if array.metadata.zarr_format == 2 and array.fill_value is not None:
        # in format 2 writers of CF data keep the fill value there, and nowhere else
        attributes.setdefault("_FillValue", array.fill_value)
    dimensions = tuple(given or f"{name}_{n}" for n, given in enumerate(names))
    return ZarrVariable(name, dimensions, array, attributes)


def _number(value: Any) -> Any:
    """Return a number that JSON could not hold, or holds in base 64 (the way xarray writes fill values)."""
    if not isinstance(value, str):
        return value
    try:
        return float(value)
    except ValueError:
        return struct.unpack("<d", base64.standard_b64decode(value))[0]
