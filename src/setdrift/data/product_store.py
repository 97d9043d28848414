"""Putting a Zarr store in place so that no reader ever sees a part of it.

Two ways. A *staged commit* adds or rewrites days of a store in place: what readers follow last is written last. A
*replacement* builds a whole store beside the old one and exchanges the two in one step of the file system.
"""

from __future__ import annotations

import ctypes
import os
import shutil
from collections.abc import Mapping
from pathlib import Path

from setdrift.data.records import replacing
from setdrift.errors import SetdriftError

METADATA_NAMES = ("zarr.json", ".zarray", ".zattrs", ".zgroup", ".zmetadata")

_EXCHANGE = 2  # RENAME_EXCHANGE of renameat2(2)
_HERE = -100  # AT_FDCWD


def commit_objects(store: Path, objects: Mapping[str, bytes]) -> int:
    """Write objects of a store in an order that is sound at every moment.

    Chunks come first (no metadata speaks of new ones yet), then the arrays' metadata with `time` last, then
    the root group's, which carries the consolidated metadata: that last rename is the commit. Objects whose
    bytes are already in place are left alone.

    Parameters
    ----------
    store : Path
        Folder of the store.
    objects : mapping
        Bytes by key.

    Returns
    -------
    int
        How many objects were written.
    """
    written = 0
    for key in sorted(objects, key=lambda key: (_rank(key), key)):
        path = store / key
        if path.exists() and path.read_bytes() == objects[key]:
            continue
        with replacing(path) as temporary:
            temporary.write_bytes(objects[key])
        written += 1
    return written


def sweep(store: Path) -> None:
    """Take away the temporary files that a killed publisher left in a store; only one may publish at a time.

    Parameters
    ----------
    store : Path
        Folder of the store; need not exist.
    """
    for left in store.rglob(".*.part"):
        left.unlink()


def is_chunk(key: str) -> bool:
    """Return whether an object holds values, not metadata."""
    return key.rsplit("/", 1)[-1] not in METADATA_NAMES


def _rank(key: str) -> int:
    if is_chunk(key):
        return 0
    if "/" not in key:
        # the consolidated metadata of format 2 is a file of its own and comes after all others
        return 4 if key == ".zmetadata" else 3
    return 2 if key.startswith("time/") else 1


def replace_store(store: Path, objects: Mapping[str, bytes]) -> None:
    """Build a whole store beside the one in place and exchange the two.

    Parameters
    ----------
    store : Path
        Folder of the store; need not exist.
    objects : mapping
        Bytes by key of the whole new store.
    """
    fresh = store.with_name(f".{store.name}.new")
    shutil.rmtree(fresh, ignore_errors=True)
    commit_objects(fresh, objects)
    if store.exists():
        _exchange(fresh, store)
        shutil.rmtree(fresh)
    else:
        fresh.rename(store)


def _exchange(first: Path, second: Path) -> None:
    """Swap two folders in one step.

    Raises
    ------
    SetdriftError
        The file system cannot do it.
    """
    library = ctypes.CDLL(None, use_errno=True)
    if library.renameat2(_HERE, os.fsencode(first), _HERE, os.fsencode(second), _EXCHANGE) != 0:
        reason = os.strerror(ctypes.get_errno())
        raise SetdriftError(
            str(second),
            f"cannot be exchanged in one step ({reason})",
            "put `output` on a local Linux file system such as ext4, xfs or btrfs",
        )
