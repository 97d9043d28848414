"""Digests: what makes a result traceable, and tells whether it must be made again."""

from __future__ import annotations

import hashlib
import json
import os
from pathlib import Path
from typing import Any

import numpy as np
from pydantic import BaseModel

LENGTH = 32  # hexadecimal digits: 128 bits


def digest(*parts: Any) -> str:
    """Return one digest of values: models, mappings, lists, numbers, text and arrays.

    Parameters
    ----------
    *parts : object
        What to digest. Arrays count with their type, shape and bytes; mappings irrespective of order.

    Returns
    -------
    str
        Hexadecimal digest.
    """
    state = hashlib.blake2b(digest_size=LENGTH // 2)
    for part in parts:
        if isinstance(part, np.ndarray):
            state.update(f"array {part.dtype.str} {part.shape}".encode())
            state.update(np.ascontiguousarray(part).tobytes())
        else:
            state.update(json.dumps(part, sort_keys=True, default=_plain).encode())
        state.update(b"\x00")
    return state.hexdigest()


def file_digest(path: Path) -> str:
    """Return the digest of a file's bytes, or of the names, sizes and bytes of all files in a folder.

    Parameters
    ----------
    path : Path
        The file or folder.

    Returns
    -------
    str
        Hexadecimal digest.
    """
    state = hashlib.blake2b(digest_size=LENGTH // 2)
    for part in _files(path):
        if part != path:
            state.update(json.dumps([str(part.relative_to(path)), part.stat().st_size]).encode())
        with part.open("rb") as stream:
            while piece := stream.read(1 << 20):
                state.update(piece)
    return state.hexdigest()


def file_mark(path: Path) -> list[Any]:
    """Return what tells, without opening it, that a file or folder changed: sizes and times of modification.

    Parameters
    ----------
    path : Path
        The file or folder.

    Returns
    -------
    list
        Size in bytes and time; of a folder the number of files, and the digest of theirs and their names.
    """
    if not path.is_dir():
        status = path.stat()
        return [status.st_size, status.st_mtime_ns]
    parts = [(str(part.relative_to(path)), part.stat()) for part in _files(path)]
    return [len(parts), digest([[name, status.st_size, status.st_mtime_ns] for name, status in parts])]


def _files(path: Path) -> list[Path]:
    """Return all files of a folder in the order of their paths; a file is the only one of its own."""
    if not path.is_dir():
        return [path]

    def refuse(error: OSError) -> None:
        raise error

    return sorted(Path(folder, name) for folder, _, names in os.walk(path, onerror=refuse) for name in names)


def _plain(value: Any) -> Any:
    if isinstance(value, BaseModel):
        return value.model_dump(mode="json")
    if isinstance(value, np.generic):
        return value.item()
    return str(value)
