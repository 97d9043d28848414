"""Compiling the fast loops ahead of the first run."""

from __future__ import annotations

import importlib
import pkgutil
import time
from collections.abc import Callable

import setdrift.numerics


def compile_kernels(announce: Callable[[str], None]) -> None:
    """Import every numerics module: their compiled loops have fixed signatures and are cached on disk.

    Parameters
    ----------
    announce : callable
        Told of each module that took noticeable time.
    """
    for module in pkgutil.iter_modules(setdrift.numerics.__path__, "setdrift.numerics."):
        begun = time.monotonic()
        importlib.import_module(module.name)
        taken = time.monotonic() - begun
        if taken > 0.3:
            announce(f"  {module.name} ready after {taken:.1f} s")
