"""One publisher at a time."""

from __future__ import annotations

import contextlib
import fcntl
from collections.abc import Iterator
from pathlib import Path

from setdrift.errors import SetdriftError


@contextlib.contextmanager
def only_publisher(products: Path) -> Iterator[None]:
    """Hold the right to write an analysis's products.

    The kernel drops the lock when the process ends, however it ends: a lock is never stale.

    Parameters
    ----------
    products : Path
        Folder of the products.

    Yields
    ------
    None
        While the lock is held.

    Raises
    ------
    SetdriftError
        Another process holds it.
    """
    products.mkdir(parents=True, exist_ok=True)
    with (products / ".publishing").open("w") as handle:
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
        except BlockingIOError as error:
            raise SetdriftError(
                str(products), "is being published by another run", "wait for it to end, then run again"
            ) from error
        yield
