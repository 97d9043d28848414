"""What the altimeters say of one another where their passes cross: a report, which changes nothing."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from setdrift.data.configuration import Configuration
from setdrift.data.days import from_day_number
from setdrift.errors import SetdriftError
from setdrift.numerics.cross_calibration import CrossCalibration, Estimates, calibrate
from setdrift.numerics.crossovers import Crossovers, find_crossovers
from setdrift.numerics.superobservations import SeaLevelObservations
from setdrift.stages.mapping import load_observations, mapping_settings

LARGEST_LAG_DAYS = 10.0
"""Crossovers of passes farther apart in time are left out: the sea has changed too much."""
WINDOW_DAYS = 10
WORRYING = 3.0
"""A slope of more than so many of its standard errors is pointed out."""

_AGAIN = "run the workflow first, at least: snakemake --cores 2 --until gather_observations --configfile CONFIG"


def comparison_lines(
    configuration: Configuration, first: dt.date | None = None, last: dt.date | None = None, truth: Path | None = None
) -> Iterator[str]:
    """Compare the altimeters at the crossovers of the observations gathered, and yield a report to print.

    Parameters
    ----------
    configuration : Configuration
        The analysis, its observations gathered.
    first, last : date, optional
        Days to use, both included; left out: all that were gathered.
    truth : Path, optional
        NetCDF file with the true `bias` (m) by `altimeter`, to compare with.

    Yields
    ------
    str
        Lines of the report.

    Raises
    ------
    SetdriftError
        Days were not gathered, no two altimeters cross, or the truth cannot be read.
    """
    names = list(configuration.altimeters)
    _refuse_nothing_to_compare(configuration)
    days = _gathered_days(configuration, first, last)
    observations = SeaLevelObservations.joined([load_observations(configuration, day) for day in days])
    crossovers = find_crossovers(observations, LARGEST_LAG_DAYS)
    edges = _window_edges(days)
    found = _calibrated(configuration, crossovers, edges)
    yield (
        f"{configuration.analysis}: {len(names)} altimeters, {len(days)} days from {days[0]} to {days[-1]}; "
        f"{crossovers.size} crossovers up to {LARGEST_LAG_DAYS:g} days apart, "
        f"{found.used.size} with the shortest lags used"
    )
    yield "biases are relative to the mean of the altimeters, each weighted equally; nothing is removed from the maps"
    yield ""
    yield from _altimeter_lines(names, found)
    yield ""
    yield from _window_lines(names, edges, found.window_bias)
    yield ""
    yield from _explained_lines(found)
    if truth is not None:
        yield ""
        yield from _truth_lines(names, found.bias, truth)


def _refuse_nothing_to_compare(configuration: Configuration) -> None:
    where = str(configuration.path)
    if len(configuration.altimeters) < 2:
        raise SetdriftError(where, "has one altimeter, and so none to compare it with", "add another")
    for key in ("bias_m", "long_wave_m"):
        if getattr(configuration.mapping, key) == 0.0:
            raise SetdriftError(where, f"mapping.{key} is 0: there is nothing to look for", "set it above 0")


def _gathered_days(configuration: Configuration, first: dt.date | None, last: dt.date | None) -> list[dt.date]:
    folder = configuration.work / "observations"
    gathered = sorted(dt.date.fromisoformat(path.stem) for path in folder.glob("????-??-??.nc"))
    if not gathered:
        raise SetdriftError(str(folder), "holds no observations yet", _AGAIN)
    for option, day in (("--from", first), ("--to", last)):
        if day is not None and day not in gathered:
            what = f"was not gathered ({gathered[0]} to {gathered[-1]} were)"
            raise SetdriftError(f"{option} {day}", what, "choose another day or run the workflow again")
    days = [day for day in gathered if (first or day) <= day <= (last or day)]
    if not days:
        raise SetdriftError(f"--to {last}", f"lies before --from {first}", "swap them")
    return days


def _window_edges(days: list[dt.date]) -> NDArray[np.float64]:
    """Return the edges of equal windows of about ten days, in days since 1970."""
    begin, end = ((day - dt.date(1970, 1, 1)).days for day in (days[0], days[-1] + dt.timedelta(days=1)))
    windows = max(1, round((end - begin) / WINDOW_DAYS))
    return np.asarray(np.round(np.linspace(begin, end, windows + 1)), dtype=np.float64)


def _calibrated(configuration: Configuration, crossovers: Crossovers, edges: NDArray[np.float64]) -> CrossCalibration:
    if not crossovers.between.any():
        what = f"no two altimeters' passes cross within {LARGEST_LAG_DAYS:g} days"
        raise SetdriftError(str(configuration.work / "observations"), what, "gather more days or altimeters")
    settings = mapping_settings(configuration)
    count = len(configuration.altimeters)
    return calibrate(crossovers, count, settings.model, settings.bias_variance, settings.long_wave_variance, edges)


def _altimeter_lines(names: list[str], found: CrossCalibration) -> Iterator[str]:
    yield "altimeter       passes  crossovers      bias   error     slope   error   error of a pass"
    yield "                                          cm      cm    mm in ten days           std, cm"
    worrying = np.abs(found.slope.value) > WORRYING * found.slope.error
    for k, name in enumerate(names):
        here = found.used.altimeter == k
        passes = np.unique(found.used.pass_index[here]).size
        count = int(np.sum(np.any(here, axis=0)))
        line = f"{name:<16}{passes:>6}{count:>12}"
        if not np.isfinite(found.bias.value[k]):
            yield f"{line}  no crossover with another altimeter"
            continue
        bias, slope = (_scaled(e, k, by) for e, by in ((found.bias, 100.0), (found.slope, 1e4)))
        yield (
            f"{line}{bias[0]:>10.2f}{bias[1]:>8.2f}{slope[0]:>10.2f}{slope[1]:>8.2f}"
            f"{found.long_wave_deviation[k] * 100:>18.2f}"
        )
    for k, name in enumerate(names):
        if not worrying[k]:
            continue
        ratio = abs(found.slope.value[k]) / found.slope.error[k]
        yield f"{name}: its bias changes, by {ratio:.1f} standard errors of the slope: an instrument going wrong?"


def _scaled(estimates: Estimates, index: int, by: float) -> tuple[float, float]:
    return float(estimates.value[index]) * by, float(estimates.error[index]) * by


def _window_lines(names: list[str], edges: NDArray[np.float64], bias: Estimates) -> Iterator[str]:
    width = max(16, *(len(name) + 2 for name in names))
    yield "bias in each window, cm (standard error)"
    yield f"{'from':<10}" + "".join(f"{name:>{width}}" for name in names)
    for row, begin in enumerate(edges[:-1]):
        cells = [
            f"{value * 100:.2f} ({error * 100:.2f})" if np.isfinite(value) else "-"
            for value, error in zip(bias.value[row], bias.error[row], strict=True)
        ]
        yield f"{from_day_number(int(begin))}" + "".join(f"{cell:>{width}}" for cell in cells)


def _explained_lines(found: CrossCalibration) -> Iterator[str]:
    before = np.mean(found.used.difference**2)
    yield "differences at crossovers           RMS, cm   explained, % of the mean square"
    yield f"{'as observed':<36}{np.sqrt(before) * 100:>7.2f}"
    for name, residual in zip(("less biases", "less errors of passes, too"), found.residual, strict=True):
        after = np.mean(residual**2)
        yield f"{name:<36}{np.sqrt(after) * 100:>7.2f}{(1.0 - after / before) * 100:>12.1f}"


def _truth_lines(names: list[str], bias: Estimates, path: Path) -> Iterator[str]:
    try:
        with xr.open_dataset(path, engine="netcdf4") as file:
            true = file["bias"].sel(altimeter=names).values.astype(float)
    except (OSError, ValueError, KeyError) as error:
        remedy = "give a NetCDF file with the variable bias (m) by altimeter"
        raise SetdriftError(str(path), "holds no true bias of every altimeter", remedy) from error
    true = true - np.mean(true[np.isfinite(bias.value)])
    yield f"{'altimeter':<16}true bias   estimate less truth   in standard errors"
    yield f"{'':<16}       cm                    cm"
    for k in np.flatnonzero(np.isfinite(bias.value)):
        off = bias.value[k] - true[k]
        yield f"{names[k]:<16}{true[k] * 100:>9.2f}{off * 100:>22.2f}{off / bias.error[k]:>21.1f}"
