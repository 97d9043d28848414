"""Dialects: the four ways in which the invented altimeters write the same thing to NetCDF files."""

from __future__ import annotations

from collections.abc import Callable
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
from netCDF4 import Dataset

from synthetic_tracks.earth import DEGREE, Array
from synthetic_tracks.files import add_variable, new_dataset
from synthetic_tracks.sampling import Counts, Observations
from synthetic_tracks.scenario import Altimeter, day_number

LEVEL = "sea_surface_height_above_mean_sea_level"
REFERENCE = "invented mean sea surface of the Tarn Sea"
_FILL16, _FILL32, _FILL_FLOAT = -32768, -2147483648, np.float32(9.96921e36)
_KEPT_OF_A_CUT_FILE = 0.6
_DAY_2031 = day_number(date(2031, 1, 1))


def file_of(folder: Path, altimeter: Altimeter, day: date) -> Path:
    """Path of an altimeter's file of one day."""
    return folder / altimeter.name / f"{altimeter.name}_{day:%Y%m%d}.nc"


def write(path: Path, altimeter: Altimeter, day: date, observations: Observations) -> None:
    """Write one day of observations in the altimeter's own dialect.

    Parameters
    ----------
    path : Path
        The file.
    altimeter : Altimeter
        Its name chooses the dialect; a day among its `cut_short` loses the end of its file.
    day : date
        The day (UTC).
    observations : Observations
        The points, in order of time.
    """
    title = f"Sea level along the track of {altimeter.name}, {day}"
    with new_dataset(path, title, comment=f"Heights refer to the {REFERENCE}.") as dataset:
        WRITERS[altimeter.name](dataset, observations)
    if day in altimeter.cut_short:
        _cut_short(path)


def _heron(dataset: Dataset, o: Observations) -> None:
    """Metres, plain floating point, CF standard names, numbered passes; no value over land."""
    dataset.createDimension("sample", o.day.size)
    put = _adder(dataset, "sample")
    put("sampled_at", o.day, **_time("days since 2000-01-01"))
    put("x_longitude", o.longitude, standard_name="longitude", units="degrees_east")
    put("y_latitude", o.latitude, standard_name="latitude", units="degrees_north")
    height = np.ma.masked_where(o.land, o.measured.astype(np.float32))
    put(
        "anomaly_height", height, fill=_FILL_FLOAT, standard_name=LEVEL, units="m",
        long_name="sea level anomaly", coordinates="sampled_at y_latitude x_longitude",
    )  # fmt: skip
    put("pass_number", o.pass_number.astype(np.int16), long_name="pass number, odd northward", units="1")
    put("cycle_number", o.cycle.astype(np.int16), long_name="repeat cycle number", units="1")


def _plover(dataset: Dataset, o: Observations) -> None:
    """Packed integers, longitudes 0 to 360, seconds, a quality flag that is 0 where good."""
    dataset.createDimension("point", o.day.size)
    put = _adder(dataset, "point")
    put("utc", o.day * 86400, **_time("seconds since 2000-01-01 00:00:00"))
    put("east", _packed(o.longitude % 360, 1e-6), scale_factor=1e-6, standard_name="longitude", units="degrees_east")
    put("north", _packed(o.latitude, 1e-6), scale_factor=1e-6, standard_name="latitude", units="degrees_north")
    level = np.clip(np.rint(o.measured / 5e-4), -32767, 32767).astype(np.int16)
    put(
        "level", level, fill=np.int16(_FILL16), scale_factor=5e-4, standard_name=LEVEL, units="m",
        long_name="sea level anomaly", ancillary_variables="quality", coordinates="utc north east",
    )  # fmt: skip
    quality = np.where(o.land, 2, np.where(o.flagged, 1, 0)).astype(np.int8)
    put(
        "quality", quality, standard_name="quality_flag", long_name="quality of the sea level anomaly",
        flag_values=np.array([0, 1, 2], np.int8), flag_meanings="good suspect land",
    )  # fmt: skip
    put("pass_number", o.pass_number.astype(np.int16), long_name="pass number, odd northward", units="1")


def _curlew(dataset: Dataset, o: Observations) -> None:
    """Centimetres, raw level with corrections to subtract, bits, no standard names, no passes."""
    dataset.createDimension("n", o.day.size)
    put = _adder(dataset, "n")
    pressure, tide = air_pressure_effect(o), sea_tide(o)
    put("epoch", (o.day - _DAY_2031) * 1440, **_time("minutes since 2031-01-01 00:00:00", named=False))
    put("lats", o.latitude, long_name="latitude", units="degrees_north")
    put("lons", o.longitude, long_name="longitude", units="degrees_east")
    centimetres = [(100 * v).astype(np.float32) for v in (o.measured + pressure + tide, pressure, tide)]
    put(
        "ssh_raw", centimetres[0], units="cm", long_name="sea level above the mean sea surface, not corrected",
        comment="subtract air_pressure_effect and sea_tide", coordinates="epoch lats lons",
    )  # fmt: skip
    put("air_pressure_effect", centimetres[1], units="cm", long_name="static response of sea level to air pressure")
    put("sea_tide", centimetres[2], units="cm", long_name="sea level of the ocean tide")
    bits = (1 * o.land + 2 * o.remarked + 4 * o.flagged).astype(np.int16)
    put(
        "bits", bits, long_name="conditions of the measurement; bits 1 and 4 make the level unusable",
        flag_masks=np.array([1, 2, 4], np.int16), flag_meanings="land light_rain bad_echo",
    )  # fmt: skip


def _dunlin(dataset: Dataset, o: Observations) -> None:
    """Whole millimetres with a fill value, hours, the day's passes stored last first; land is not marked."""
    o = o.chosen(_blocks_reversed(o.pass_number))
    dataset.createDimension("record", o.day.size)
    put = _adder(dataset, "record")
    put("clock", (o.day - _DAY_2031) * 24, **_time("hours since 2031-01-01 00:00:00"))
    put("place_east", o.longitude.astype(np.float64), standard_name="longitude", units="degrees_east")
    put("place_north", o.latitude.astype(np.float64), standard_name="latitude", units="degrees_north")
    put(
        "water_height", _packed(o.measured, 1e-3), fill=np.int32(_FILL32), standard_name=LEVEL, units="mm",
        long_name="sea level anomaly", coordinates="clock place_north place_east",
        comment="Records are stored pass by pass, the day's last pass first.",
    )  # fmt: skip


WRITERS: dict[str, Callable[[Dataset, Observations], None]] = {
    "heron": _heron,
    "plover": _plover,
    "curlew": _curlew,
    "dunlin": _dunlin,
}


def air_pressure_effect(o: Observations) -> Array:
    """Invented static response to travelling air pressure, m: some centimetres."""
    travelling = np.sin((o.longitude + 4 * o.day) * 2 * np.pi / 31 + 0.1 * o.latitude)
    seasonal = np.cos(o.latitude * 2 * np.pi / 55 + o.day / 9)
    return 0.035 * travelling + 0.04 * seasonal


def sea_tide(o: Observations) -> Array:
    """Invented tide, m: a lunar half-daily and a daily wave that travel and grow from place to place."""
    half_daily = np.cos(2 * np.pi * o.day / 0.517525 - 3 * o.longitude * DEGREE - 2 * o.latitude * DEGREE)
    daily = np.cos(2 * np.pi * o.day / 0.997270 - 2 * o.longitude * DEGREE)
    return (0.30 + 0.10 * np.sin(o.latitude * 5 * DEGREE)) * half_daily + 0.09 * daily


def _adder(dataset: Dataset, dimension: str) -> Callable[..., None]:
    def put(name: str, values: Any, **attributes: Any) -> None:
        add_variable(dataset, name, (dimension,), values, **attributes)

    return put


def _time(units: str, *, named: bool = True) -> dict[str, str]:
    name = {"standard_name": "time"} if named else {}
    return {**name, "units": units, "calendar": "standard", "units_metadata": "leap_seconds: none"}


def _packed(values: Array, step: float) -> Any:
    return np.rint(values / step).astype(np.int32)


def _blocks_reversed(pass_number: Counts) -> Counts:
    """Order indices so that they put the passes of a day in reverse order, each still in order of time."""
    starts = np.flatnonzero(np.diff(pass_number, prepend=-1))
    blocks = np.split(np.arange(pass_number.size), starts[1:])
    return np.concatenate(blocks[::-1])


def _cut_short(path: Path) -> None:
    whole = path.read_bytes()
    path.write_bytes(whole[: int(_KEPT_OF_A_CUT_FILE * len(whole))])
