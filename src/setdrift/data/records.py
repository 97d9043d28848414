"""Small JSON records (manifests and receipts), written whole or not at all."""

from __future__ import annotations

import contextlib
import json
import os
import tempfile
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from setdrift.errors import SetdriftError


@contextlib.contextmanager
def replacing(path: Path) -> Iterator[Path]:
    """Give a temporary path beside a file, and put it in the file's place when the block ends well.

    A reader sees the old file or the new one, never a part; a killed writer leaves only a hidden temporary file.

    Parameters
    ----------
    path : Path
        The file to be replaced; its folder is made if need be.

    Yields
    ------
    Path
        The temporary path to write to.
    """
    path.parent.mkdir(parents=True, exist_ok=True)
    handle, name = tempfile.mkstemp(prefix=f".{path.name}.", suffix=".part", dir=path.parent)
    os.close(handle)
    temporary = Path(name)
    try:
        yield temporary
        with temporary.open("rb") as stream:
            os.fsync(stream.fileno())
        temporary.chmod(0o644)
        temporary.replace(path)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


def write_record(path: Path, content: Any) -> None:
    """Write a JSON record.

    Parameters
    ----------
    path : Path
        The file to write.
    content : object
        Anything JSON can hold; dates are written as text.
    """
    text = json.dumps(content, indent=1, default=str) + "\n"
    with replacing(path) as temporary:
        temporary.write_text(text, encoding="utf-8")


def write_record_if_changed(path: Path, content: Any) -> bool:
    """Write a JSON record unless the file already holds it.

    Parameters
    ----------
    path : Path
        The file to write.
    content : object
        Anything JSON can hold; dates are written as text.

    Returns
    -------
    bool
        Whether the file was written.
    """
    text = json.dumps(content, indent=1, default=str) + "\n"
    if path.exists() and path.read_text(encoding="utf-8") == text:
        return False
    write_record(path, content)
    return True


def read_record(path: Path) -> Any:
    """Read a JSON record.

    Parameters
    ----------
    path : Path
        The file to read.

    Returns
    -------
    object
        What it holds.

    Raises
    ------
    SetdriftError
        The file is missing or is not JSON.
    """
    try:
        return json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError) as error:
        raise SetdriftError(str(path), "is missing or damaged", "delete it and run the workflow again") from error
