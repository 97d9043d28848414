"""Read many small along-track files, and one global day, in one run: memory that does not grow, and time.

- 2,000 files of 500 points are read in one process by `read_alongtrack`, in turn with the same files loaded by plain
  `xarray.open_dataset`; the ratio of processor times is printed, and how the memory of a process that does nothing but
  `read_alongtrack` grows.
- A global day of four missions, about 250,000 points with packed positions, is read and edited.

Run as ``python benchmarks/reading.py``; it takes less than a minute and fails if memory grows.
"""

from __future__ import annotations

import os
import shutil
import sys
import tempfile
import time
from concurrent.futures import ProcessPoolExecutor
from multiprocessing import get_context
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import xarray as xr

from setdrift.data.alongtrack import read_alongtrack
from setdrift.data.ancillary import LandMask
from setdrift.data.configuration import Altimeter, Editing
from setdrift.data.editing import edit
from setdrift.data.grids import Area

FILES, POINTS, GLOBAL_POINTS, MISSIONS = 2000, 500, 62_500, 4
SETTLED = 500  # files after which libraries have what they keep
LARGEST_GROWTH_MB = 4.0  # over the other files, whose observations take 25 MB: keeping those of one in six shows
START_S = 1_930_089_600.0  # 2031-03-01
PERIOD_S, TURN_DEGREES = 6100.0, -26.0  # of an invented orbit, and how far it moves east in one period
PLAIN = Altimeter(files="*.nc")


def write_track(path: Path, points: int, phase: float) -> Path:
    """Write points along an invented orbit, evenly spread over a day, positions packed."""
    rng = np.random.default_rng(int(1000 * phase))
    seconds = np.arange(points) * (86400.0 / points)
    angle = 2.0 * np.pi * (seconds / PERIOD_S + phase)
    longitude = (
        np.degrees(np.arctan2(np.cos(1.15) * np.sin(angle), np.cos(angle))) + TURN_DEGREES * angle / 6.283
    ) % 360
    packed: dict[str, Any] = {"scale_factor": 1e-6}
    level = 0.1 * np.sin(angle * 40.0) + 0.03 * rng.standard_normal(points)
    columns = {
        "time": (seconds + START_S, {"units": "seconds since 1970-01-01"}),
        "latitude": (np.rint(66e6 * np.sin(angle)).astype("i4"), {"units": "degrees_north", **packed}),
        "longitude": (np.rint(1e6 * longitude).astype("i4"), {"units": "degrees_east", **packed}),
        "sea_surface_height_above_mean_sea_level": (np.rint(1e3 * level).astype("i2"), {"units": "mm"}),
    }
    with netCDF4.Dataset(path, "w") as file:
        file.createDimension("n", points)
        for name, (values, attributes) in columns.items():
            variable = file.createVariable(name, values.dtype, ("n",), zlib=True)
            variable.set_auto_maskandscale(False)
            variable.setncatts({"standard_name": name, **attributes})
            variable[:] = values
    return path


def resident_mb() -> float:
    """Return this process's resident memory."""
    pages = int(Path("/proc/self/statm").read_text(encoding="ascii").split()[1])
    return pages * os.sysconf("SC_PAGE_SIZE") / 1e6


def memory_of_reading(folder: Path) -> list[float]:
    """Read every file, and return the resident memory after the first of them and at the end."""
    seen = []
    for number, path in enumerate(sorted(folder.iterdir()), start=1):
        read_alongtrack(path, PLAIN)
        if number in {SETTLED, FILES}:
            seen.append(resident_mb())
    return seen


def load_plainly(path: Path) -> None:
    """Load all variables of a file."""
    with xr.open_dataset(path) as data:
        data.load()


def times_of_small_files(folder: Path) -> tuple[float, float]:
    """Return processor seconds of reading every file, ours and plain, in turn."""
    ours = plain = 0.0
    for path in sorted(folder.iterdir()):
        begin = time.process_time()
        read_alongtrack(path, PLAIN)
        middle = time.process_time()
        load_plainly(path)
        ours, plain = ours + middle - begin, plain + time.process_time() - middle
    return ours, plain


def global_day(folder: Path) -> tuple[int, int, float, float]:
    """Read and edit a day of four missions; return numbers of points, in and kept, and processor seconds of both."""
    paths = [write_track(folder / f"global_{n}.nc", GLOBAL_POINTS, 0.1 + n / MISSIONS) for n in range(MISSIONS)]
    latitude, longitude = np.arange(-89.875, 90.0, 0.25), np.arange(-179.875, 180.0, 0.25)
    east, north = np.meshgrid(longitude, latitude)
    land = LandMask(np.sin(np.radians(3 * east)) * np.cos(np.radians(2 * north)) > 0.6, latitude, longitude)
    everywhere = Area(-180.0, 360.0, -90.0, 90.0)
    begin = time.process_time()
    tracks = [read_alongtrack(path, PLAIN) for path in paths]
    middle = time.process_time()
    kept = sum(len(edit(track, Editing(), land, everywhere).track) for track in tracks)
    return sum(map(len, tracks)), kept, middle - begin, time.process_time() - middle


def main() -> int:
    """Print what was measured; return 1 if memory grew."""
    with tempfile.TemporaryDirectory() as scratch:
        small = Path(scratch, "small")
        small.mkdir()
        first = write_track(Path(scratch, "first.nc"), POINTS, 0.3)
        for number in range(FILES):
            shutil.copy(first, small / f"{number:05d}.nc")
        with ProcessPoolExecutor(1, mp_context=get_context("spawn")) as pool:
            settled, last = pool.submit(memory_of_reading, small).result()
        growth = last - settled
        print(f"{FILES:,} files of {POINTS} points")
        print(f"  resident memory after {SETTLED}: {settled:.1f} MB, after {FILES:,}: {last:.1f} MB", end=", ")
        print(f"grown {growth:+.1f} MB")
        ours, plain = times_of_small_files(small)
        print(f"  processor time a file: setdrift {1e3 * ours / FILES:.2f} ms, xarray.open_dataset and load", end=" ")
        print(f"{1e3 * plain / FILES:.2f} ms; ratio {ours / plain:.2f}")
        received, kept, reading, editing = global_day(Path(scratch))
        print(f"a global day of {MISSIONS} missions: {received:,} points, {kept:,} kept")
        print(f"  processor time: reading {reading:.2f} s, editing {editing:.2f} s")
    if growth > LARGEST_GROWTH_MB:
        print(f"memory grew by more than {LARGEST_GROWTH_MB} MB", file=sys.stderr)
        return 1
    return 0


if __name__ == "__main__":
    sys.exit(main())
