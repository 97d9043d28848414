"""Digests: what makes a result traceable, and tells whether it must be made again."""

from __future__ import annotations

import hashlib
import json
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
    """Return the digest of a file's bytes.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    str
        Hexadecimal digest.
    """
    state = hashlib.blake2b(digest_size=LENGTH // 2)
    with path.open("rb") as stream:
        while piece := stream.read(1 << 20):
            state.update(piece)
    return state.hexdigest()


def _plain(value: Any) -> Any:
    if isinstance(value, BaseModel):
        return value.model_dump(mode="json")
    if isinstance(value, np.generic):
        return value.item()
    return str(value)
