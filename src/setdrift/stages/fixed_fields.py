"""Fields that do not change from day to day, on the working grid."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import xarray as xr
from numpy.typing import NDArray

from setdrift.data.ancillary import LandMask, land_mask, mean_dynamic_topography
from setdrift.data.configuration import Configuration
from setdrift.data.day_store import content_digest
from setdrift.data.fixed import is_sea
from setdrift.data.grids import Grid, working_grid
from setdrift.data.records import replacing, write_record
from setdrift.errors import SetdriftError
from setdrift.numerics.regridding import regrid_bilinear

FILL_DISTANCE_KM = 75.0
"""Sea points beyond the source's coast take the nearest value within this distance."""

_SAMPLES = 6  # a cell's land fraction is counted at 6 x 6 points


def prepare_fixed_fields(configuration: Configuration, announce: Callable[[str], None]) -> None:
    """Put the mean dynamic topography and the land fraction on the working grid.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    announce : callable
        Told what was done, for the log.

    Raises
    ------
    SetdriftError
        The box holds no sea, or the mean dynamic topography does not cover it.
    """
    grid = working_grid(configuration)
    land_fraction = _land_fraction(land_mask(configuration), grid)
    sea = is_sea(land_fraction)
    if not sea.any():
        raise SetdriftError(f"{configuration.path}: grid", "the box holds no sea", "move the box or change land.file")
    source = mean_dynamic_topography(configuration)
    mean = regrid_bilinear(
        source.field,
        source.latitude,
        source.longitude,
        grid.latitude,
        grid.longitude,
        fill_distance_km=FILL_DISTANCE_KM,
        periodic=grid.periodic,
    )
    mean = np.where(sea, mean, np.nan)
    missing = int(np.count_nonzero(sea & np.isnan(mean)))
    if missing == np.count_nonzero(sea):
        raise SetdriftError(
            configuration.mean_dynamic_topography.file,
            "has no value at any sea point of the box",
            "give a mean dynamic topography that covers the box",
        )
    announce(f"{int(sea.sum())} sea points, {missing} of them without mean dynamic topography")
    _save(configuration, grid, mean, land_fraction)


def _land_fraction(land: LandMask, grid: Grid) -> NDArray[np.float64]:
    offset = ((np.arange(_SAMPLES) + 0.5) / _SAMPLES - 0.5) * grid.spacing
    latitude = (grid.latitude[:, None] + offset).ravel()
    longitude = (grid.longitude[:, None] + offset).ravel()
    lon, lat = np.meshgrid(longitude, latitude)
    counted = land.is_land(lon.ravel(), lat.ravel()).reshape(
        grid.latitude.size, _SAMPLES, grid.longitude.size, _SAMPLES
    )
    return np.asarray(counted.mean(axis=(1, 3)))


def _save(
    configuration: Configuration, grid: Grid, mean: NDArray[np.float64], land_fraction: NDArray[np.float64]
) -> None:
    dataset = xr.Dataset(
        {
            "mean_dynamic_topography": (("latitude", "longitude"), mean),
            "land_fraction": (("latitude", "longitude"), land_fraction),
        },
        coords={"latitude": grid.latitude, "longitude": grid.longitude},
    )
    with replacing(configuration.work / "fixed" / "fields.nc") as temporary:
        dataset.to_netcdf(temporary, engine="netcdf4")
    receipt = {
        "mean_dynamic_topography": content_digest(dataset[["mean_dynamic_topography"]]),
        "land_fraction": content_digest(dataset[["land_fraction"]]),
    }
    write_record(configuration.work / "fixed" / "fields.json", receipt)
