"""Tiles of the globe that are mapped one at a time and blended into one another."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

OVERLAP = 0.25
"""A tile reaches this part of its own height beyond each edge, and fades out across twice that."""

_KM_PER_DEGREE = 111.2  # mean length of a degree; only tells how far observations are searched for


@dataclass(frozen=True)
class Tile:
    """One tile and the grid points it serves.

    Attributes
    ----------
    longitude, latitude : float
        Centre, degrees.
    half_width, half_height : float
        From the centre to the farthest point it serves, km.
    rows, columns : (r,), (c,) integer array
        Grid rows and columns within reach.
    weight : (r, c) array
        Blending weight; the weights of all tiles sum to one at every grid point once normalised.
    """

    longitude: float
    latitude: float
    half_width: float
    half_height: float
    rows: NDArray[np.int64]
    columns: NDArray[np.int64]
    weight: Floats


def tiles_over(latitude: Floats, longitude: Floats, size: float) -> Iterator[Tile]:
    """Yield the tiles that serve a grid, south to north and west to east.

    Tiles are anchored to the globe, not to the grid: overlapping grids are served by the same tiles. Each row
    of tiles goes round the globe a whole number of times its width, so that widths stay near `size` on the ground.

    Parameters
    ----------
    latitude, longitude : 1-D array
        Grid coordinates, degrees, ascending.
    size : float
        Height of a tile, degrees; must divide 180.

    Yields
    ------
    Tile
        Every tile with at least one grid point in reach.

    Raises
    ------
    ValueError
        `size` does not divide 180 degrees.
    """
    count = round(180.0 / size)
    if abs(count * size - 180.0) > 1e-9:
        raise ValueError(f"size: must divide 180 degrees, found {size}")
    for k in range(count):
        centre = -90.0 + (k + 0.5) * size
        row_weight = _ramp(latitude - centre, size)
        rows = np.flatnonzero(row_weight)
        if rows.size:
            yield from _row_of_tiles(centre, size, rows, row_weight[rows], longitude)


def _row_of_tiles(
    centre_latitude: float, size: float, rows: NDArray[np.int64], row_weight: Floats, longitude: Floats
) -> Iterator[Tile]:
    around = max(3, round(360.0 * np.cos(np.deg2rad(centre_latitude)) / size))
    width = 360.0 / around
    reach = 0.5 + OVERLAP
    # the widest parallel of the tile decides how far east and west it reaches on the ground
    nearest_equator = max(abs(centre_latitude) - reach * size, 0.0)
    half_width = reach * width * _KM_PER_DEGREE * np.cos(np.deg2rad(nearest_equator))
    for j in range(around):
        centre = -180.0 + (j + 0.5) * width
        offset = (longitude - centre + 180.0) % 360.0 - 180.0
        weight = _ramp(offset, width)
        columns = np.flatnonzero(weight)
        if columns.size:
            yield Tile(
                centre,
                centre_latitude,
                float(half_width),
                reach * size * _KM_PER_DEGREE,
                rows,
                columns,
                row_weight[:, None] * weight[columns],
            )


def _ramp(offset: Floats, size: float) -> Floats:
    """Weight across a tile: one in the middle, falling smoothly to zero beyond the edge, neighbours adding to one."""
    part = np.clip((0.5 + OVERLAP - np.abs(offset) / size) / (2.0 * OVERLAP), 0.0, 1.0)
    return np.asarray(part * part * (3.0 - 2.0 * part))
