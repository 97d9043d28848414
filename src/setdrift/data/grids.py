"""The analysis grid, the padded grid that work is done on, and the area observations are taken from."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from setdrift.data.configuration import Configuration
from setdrift.numerics.covariance import FAR_REACH, built_in_scales

Floats = NDArray[np.float64]

STENCIL_CELLS = 4  # the widest finite difference reaches two cells; a second derivative of it, four
KM_PER_DEGREE = 111.2  # mean length of a degree: the reach of observations need not be exact
TILE_KM = 400.0  # half a tile with its overlap, and the drift of patterns within the window


@dataclass(frozen=True)
class Grid:
    """Cell centres of a regular grid.

    Attributes
    ----------
    latitude, longitude : 1-D array
        Ascending, degrees; longitudes are continuous and may leave -180..180.
    spacing : float
        Degrees.
    periodic : bool
        Whether the grid goes once round the globe.
    """

    latitude: Floats
    longitude: Floats
    spacing: float
    periodic: bool

    @property
    def shape(self) -> tuple[int, int]:
        """Rows and columns."""
        return self.latitude.size, self.longitude.size

    def window(self, inner: Grid) -> tuple[slice, slice]:
        """Return the rows and columns of this grid that an inner grid takes."""
        row = int(np.argmin(abs(self.latitude - inner.latitude[0])))
        column = int(np.argmin(abs(self.longitude - inner.longitude[0])))
        return slice(row, row + inner.latitude.size), slice(column, column + inner.longitude.size)


def analysis_grid(configuration: Configuration) -> Grid:
    """Return the grid of the products.

    Parameters
    ----------
    configuration : Configuration
        The analysis.

    Returns
    -------
    Grid
        Cell centres of the configured box.
    """
    box = configuration.grid
    rows = round((box.north - box.south) / box.spacing)
    columns = round(box.width / box.spacing)
    return Grid(
        _centres(box.south, rows, box.spacing),
        _centres(box.west, columns, box.spacing),
        box.spacing,
        box.periodic,
    )


def _centres(edge: float, count: int, spacing: float) -> Floats:
    return np.asarray(edge + (np.arange(count) + 0.5) * spacing, dtype=np.float64)


def working_grid(configuration: Configuration) -> Grid:
    """Return the analysis grid padded so that its edges are as sound as its middle.

    The pad holds the widest finite difference; where the box meets the equatorial band, it also reaches the
    band's edges, so that the equatorial fit sees the whole band.

    Parameters
    ----------
    configuration : Configuration
        The analysis.

    Returns
    -------
    Grid
        Cell centres that hold those of the analysis grid.
    """
    inner = analysis_grid(configuration)
    band = configuration.currents.band_degrees
    south, north = configuration.grid.south, configuration.grid.north
    below = above = STENCIL_CELLS
    if south < configuration.currents.blend_to_degrees and north > -configuration.currents.blend_to_degrees:
        below = max(below, int(np.ceil((south + band) / inner.spacing)))
        above = max(above, int(np.ceil((band - north) / inner.spacing)))
    latitude = inner.latitude[0] + np.arange(-below, inner.latitude.size + above) * inner.spacing
    # a box that nearly goes round is padded no further than it can be without meeting itself
    room = round(360.0 / inner.spacing) - inner.longitude.size
    side = 0 if inner.periodic else min(STENCIL_CELLS, room // 2)
    longitude = inner.longitude[0] + np.arange(-side, inner.longitude.size + side) * inner.spacing
    return Grid(latitude[abs(latitude) < 90], longitude, inner.spacing, inner.periodic)


@dataclass(frozen=True)
class Area:
    """A box of longitude and latitude that observations are taken from, degrees."""

    west: float
    width: float
    south: float
    north: float

    def holds(self, longitude: Floats, latitude: Floats) -> NDArray[np.bool_]:
        """Return which positions, of any longitude convention, lie in the area."""
        east = (longitude - self.west) % 360.0 <= self.width
        return np.asarray(east & (latitude >= self.south) & (latitude <= self.north))


def observation_area(configuration: Configuration) -> Area:
    """Return the area whose observations can reach the working grid.

    Parameters
    ----------
    configuration : Configuration
        The analysis.

    Returns
    -------
    Area
        The working grid and a margin; whole circles of latitude where the margin meets a pole.
    """
    grid, mapping = working_grid(configuration), configuration.mapping
    zonal, meridional = built_in_scales(grid.latitude)
    north_reach = FAR_REACH * (mapping.meridional_scale_km or meridional.max()) + TILE_KM
    east_reach = FAR_REACH * (mapping.zonal_scale_km or zonal.max()) + TILE_KM
    south = max(grid.latitude[0] - north_reach / KM_PER_DEGREE, -90.0)
    north = min(grid.latitude[-1] + north_reach / KM_PER_DEGREE, 90.0)
    narrowest = np.cos(np.deg2rad(max(abs(south), abs(north))))
    margin = east_reach / (KM_PER_DEGREE * max(narrowest, 1e-6))
    width = grid.longitude[-1] - grid.longitude[0] + 2 * margin
    if grid.periodic or width >= 360.0:
        return Area(-180.0, 360.0, float(south), float(north))
    return Area(float(grid.longitude[0] - margin), float(width), float(south), float(north))
