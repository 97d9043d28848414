"""Global attributes of the products: what they are, whose, from what, and what they must not be used for."""

from __future__ import annotations

import datetime as dt
from collections.abc import Sequence
from dataclasses import dataclass

from setdrift import __version__
from setdrift.data.configuration import Configuration
from setdrift.data.conventions import CAUTION, LIMITS
from setdrift.data.digests import digest
from setdrift.data.grids import Grid


@dataclass(frozen=True)
class Product:
    """What a product is: the name of its store without ending, a title and a summary."""

    name: str
    title: str
    summary: str


DAILY_PRODUCT = Product(
    "daily",
    "Sea level and balanced surface currents",
    "Daily snapshots at 12:00 UTC of sea level anomaly with its formal error, dynamic topography and balanced surface "
    "currents, by optimal interpolation of along-track altimeter sea level.",
)
EDDY_PRODUCT = Product(
    "eddies",
    "Eddies and their trajectories",
    "Eddies found as closed contours of the daily maps at 12:00 UTC, with size, rotation and contours, and the "
    "trajectories they form from day to day.",
)


def global_attributes(
    configuration: Configuration, product: Product, grid: Grid, days: Sequence[dt.date], now: dt.datetime
) -> dict[str, object]:
    """Return CF and ACDD global attributes of a product.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    product : Product
        Which product.
    grid : Grid
        The product's grid.
    days : sequence of date
        Days it holds.
    now : datetime
        Time of publication, UTC.

    Returns
    -------
    dict
        Attributes by name.
    """
    publish = configuration.publish
    stamp = now.strftime("%Y-%m-%dT%H:%M:%SZ")
    half = grid.spacing / 2.0
    settings = digest(configuration.model_dump(mode="json", exclude={"output", "period", "block_days"}))
    return {
        "Conventions": "CF-1.11, ACDD-1.3",
        "title": f"{product.title}: {configuration.analysis}",
        "summary": f"{product.summary} {LIMITS}",
        "caution": CAUTION,
        "keywords": "sea level anomaly, dynamic topography, surface currents, eddies, altimetry",
        "source": "along-track altimeter sea level of " + ", ".join(configuration.altimeters),
        "processing_level": "gridded analysis",
        "institution": publish.institution,
        "license": publish.licence,
        "creator_name": publish.creator_name,
        "creator_email": publish.creator_email,
        "naming_authority": publish.institution,
        "id": f"{configuration.analysis}.{product.name}",
        "history": f"{stamp}: published by setdrift {__version__} with settings {settings}",
        "settings_digest": settings,
        "date_created": stamp,
        "geospatial_lat_min": float(grid.latitude[0] - half),
        "geospatial_lat_max": float(grid.latitude[-1] + half),
        "geospatial_lon_min": float(grid.longitude[0] - half),
        "geospatial_lon_max": float(grid.longitude[-1] + half),
        "geospatial_lat_resolution": f"{grid.spacing:g} degrees",
        "geospatial_lon_resolution": f"{grid.spacing:g} degrees",
        "time_coverage_start": f"{days[0]}T12:00:00Z",
        "time_coverage_end": f"{days[-1]}T12:00:00Z",
        "time_coverage_resolution": "P1D",
        "standard_name_vocabulary": "CF Standard Name Table",
    }
