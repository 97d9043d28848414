"""How far the published maps and currents are from a known truth."""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from setdrift.data.configuration import Configuration
from setdrift.data.conventions import EASTWARD, NORTHWARD, SEA_LEVEL
from setdrift.errors import SetdriftError

Floats = NDArray[np.floating]

BANDS = (0.0, 1.0, 3.0, 5.0, 10.0, 20.0, 30.0, 45.0, 60.0, 90.0)
"""Distances from the equator, degrees, between which errors are summed."""
OFF_EQUATOR = 5.0
"""The overall figures leave out latitudes nearer the equator than this, degrees."""


def verification_lines(configuration: Configuration, truth: Path) -> Iterator[str]:
    """Compare the published days with a truth, and yield a table to print.

    Parameters
    ----------
    configuration : Configuration
        The analysis, already published.
    truth : Path
        NetCDF file with the true sea level anomaly and currents on a regular grid, found by standard name.

    Yields
    ------
    str
        Lines of the table.
    """
    product = _opened(configuration.products / "daily.zarr", "run the workflow first", "zarr")
    with product, _opened(truth, "give a NetCDF file with the true fields", "netcdf4") as true_file:
        true = _on_grid_of(product, true_file)
        days = true.sizes["time"]
        yield f"{configuration.analysis}: {days} days compared with {truth}"
        matched = product.sel(time=true.time)
        yield from _sea_level_lines(matched, true)
        yield ""
        yield from _velocity_lines(matched, true)
        yield ""
        yield from _seam_lines(configuration, matched)


def _opened(path: Path, remedy: str, engine: str) -> xr.Dataset:
    try:
        return xr.open_dataset(path, engine=engine)
    except (OSError, ValueError) as error:
        raise SetdriftError(str(path), "cannot be read", remedy) from error


def _on_grid_of(product: xr.Dataset, true_file: xr.Dataset) -> xr.Dataset:
    """Put the truth on the product's grid (bilinear; missing wherever a corner is) and days."""
    wanted = {
        "sea_level_anomaly": SEA_LEVEL,
        "eastward_velocity": EASTWARD,
        "northward_velocity": NORTHWARD,
    }
    named = {str(v.attrs.get("standard_name")): name for name, v in true_file.data_vars.items()}
    lacking = [standard for standard in wanted.values() if standard not in named]
    if lacking:
        raise SetdriftError("--truth", f"holds no variable with standard name {lacking[0]}", "give the true fields")
    true = true_file[[named[standard] for standard in wanted.values()]].rename(
        {named[standard]: name for name, standard in wanted.items()}
    )
    days = np.intersect1d(true.time.values, product.time.values)
    if days.size == 0:
        raise SetdriftError("--truth", "shares no time with the product", "give a truth for the analysed days")
    on_grid = true.sel(time=days).interp(latitude=product.latitude, longitude=product.longitude).load()
    if not np.isfinite(on_grid["sea_level_anomaly"] + product["sea_level_anomaly"]).any():
        what = "has no value at any sea point of the product"
        raise SetdriftError("--truth", what, "give a truth of the same area, longitudes counted the same way")
    return on_grid


def _bands(latitude: Floats) -> Iterator[tuple[str, NDArray[np.bool_]]]:
    distance = np.abs(latitude)
    for low, high in itertools.pairwise(BANDS):
        rows = (distance >= low) & (distance < high)
        if rows.any():
            yield f"{low:g} to {high:g}", rows
    rows = distance >= OFF_EQUATOR
    if rows.any():
        yield f"beyond {OFF_EQUATOR:g}", rows


def _sea_level_lines(product: xr.Dataset, true: xr.Dataset) -> Iterator[str]:
    truth = true["sea_level_anomaly"].values
    difference = product["sea_level_anomaly"].values - truth
    error = product["sea_level_anomaly_error"].values
    yield "sea level anomaly          truth std    RMSE   RMSE/std  within 1   within 2"
    yield "degrees from the equator          cm      cm               formal errors, %"
    for name, rows in _bands(product.latitude.values):
        d, e, t = difference[:, rows], error[:, rows], truth[:, rows]
        sound = np.isfinite(d) & np.isfinite(e)
        if not sound.any():
            continue  # land all round
        d, e, deviation = d[sound], e[sound], np.std(t[sound])
        rmse = np.sqrt(np.mean(d**2))
        one, two = (100.0 * np.mean(np.abs(d) <= k * e) for k in (1, 2))
        yield f"{name:<26}{deviation * 100:>10.2f}{rmse * 100:>8.2f}{rmse / deviation:>11.3f}{one:>10.1f}{two:>11.1f}"


def _velocity_lines(product: xr.Dataset, true: xr.Dataset) -> Iterator[str]:
    yield "velocity, m s-1           eastward: std    RMSE  RMSE/std    northward: std    RMSE  RMSE/std"
    for name, rows in _bands(product.latitude.values):
        cells = [f"{name:<26}"]
        for component, width in (("eastward_velocity", 13), ("northward_velocity", 18)):
            truth = true[component].values[:, rows]
            difference = product[component].values[:, rows] - truth
            sound = np.isfinite(difference)
            if not sound.any():
                break
            deviation, rmse = np.std(truth[sound]), np.sqrt(np.mean(difference[sound] ** 2))
            cells.append(f"{deviation:>{width}.3f}{rmse:>8.3f}{rmse / deviation:>10.3f}")
        else:
            yield "".join(cells)


def _seam_lines(configuration: Configuration, product: xr.Dataset) -> Iterator[str]:
    """Tell whether the velocity jumps where one balance hands over to the other."""
    settings, latitude = configuration.currents, product.latitude.values
    between = (latitude[1:] + latitude[:-1]) / 2.0
    at_edge = np.zeros(between.size, dtype=bool)
    for edge in (settings.blend_from_degrees, settings.blend_to_degrees):
        at_edge |= np.abs(np.abs(between) - edge) < configuration.grid.spacing
    near = (np.abs(between) < settings.band_degrees) & ~at_edge
    if not at_edge.any() or not near.any():
        return
    yield "row-to-row change of the velocity, m s-1     at the band's edges      elsewhere in the band"
    yield "                                               median  largest            median  largest"
    for component in ("eastward_velocity", "northward_velocity"):
        step = np.abs(np.diff(product[component].values, axis=1))
        figures = [f(step[:, rows]) for rows in (at_edge, near) for f in (np.nanmedian, np.nanmax)]
        yield f"{component:<42}{figures[0]:>11.4f}{figures[1]:>9.3f}{figures[2]:>18.4f}{figures[3]:>9.3f}"
