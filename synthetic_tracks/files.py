"""Files: NetCDF files that appear complete or not at all, and the stamp that says which belong to a scenario."""

from __future__ import annotations

import json
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import numpy as np
from netCDF4 import Dataset

from synthetic_tracks import VERSION

STAMP = "stamp.json"


@contextmanager
def new_dataset(path: Path, title: str, **attributes: str) -> Iterator[Dataset]:
    """Write a NetCDF-4 file under a temporary name and rename it when it is complete.

    Parameters
    ----------
    path : Path
        Where the file shall be; its folder is made.
    title : str
        Global attribute; "(synthetic: invented sea)" is added.
    **attributes : str
        Further global attributes.

    Yields
    ------
    netCDF4.Dataset
        Open for writing.
    """
    path.parent.mkdir(parents=True, exist_ok=True)
    partial = path.with_name(path.name + ".part")
    with Dataset(partial, "w", format="NETCDF4") as dataset:
        dataset.setncatts(
            {
                "Conventions": "CF-1.11",
                "title": f"{title} (synthetic: invented sea)",
                "institution": "none: the data are invented",
                "source": f"synthetic_tracks {VERSION}: a mathematical sea, not a measurement and not a model of one",
                **attributes,
            }
        )
        yield dataset
    partial.replace(path)


def add_variable(dataset: Dataset, name: str, dimensions: tuple[str, ...], values: Any, **attributes: Any) -> None:
    """Add a compressed variable of the values' type; `fill` among the attributes is its fill value.

    Masked arrays are written with the fill value where masked.
    """
    values = np.ma.asanyarray(values)
    fill = attributes.pop("fill", False)
    variable = dataset.createVariable(name, values.dtype, dimensions, zlib=True, complevel=4, fill_value=fill)
    variable.setncatts(attributes)
    variable.set_auto_maskandscale(False)
    variable[:] = values.filled(fill) if np.ma.is_masked(values) else values.data


def is_current(folder: Path, digest: str) -> bool:
    """Whether a folder holds every file of a scenario, each as long as it was when written."""
    stamp = read_stamp(folder)
    if stamp.get("scenario") != digest or stamp.get("version") != VERSION:
        return False
    files = {folder / name: size for name, size in stamp["files"].items()}
    return all(path.is_file() and path.stat().st_size == size for path, size in files.items())


def read_stamp(folder: Path) -> dict[str, Any]:
    """Read a folder's stamp; empty if it has none."""
    path = folder / STAMP
    return dict(json.loads(path.read_text())) if path.is_file() else {}


def begin(folder: Path) -> set[Path]:
    """Take the stamp away, so that a broken run leaves none; return the files it named."""
    old = {folder / name for name in read_stamp(folder).get("files", {})}
    (folder / STAMP).unlink(missing_ok=True)
    return old


def finish(folder: Path, digest: str, written: list[Path], old: set[Path]) -> None:
    """Remove files of an earlier scenario that this one does not have, and write the stamp."""
    for path in old - set(written):
        path.unlink(missing_ok=True)
    sizes = {str(path.relative_to(folder)): path.stat().st_size for path in sorted(written)}
    text = json.dumps({"scenario": digest, "version": VERSION, "files": sizes}, indent=1)
    partial = folder / (STAMP + ".part")
    partial.write_text(text + "\n")
    partial.replace(folder / STAMP)
