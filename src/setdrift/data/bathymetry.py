"""The sea floor: how deep the sea is where observations are made."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from setdrift.data.ancillary import GriddedField, load_field, nearest_cells
from setdrift.data.configuration import Configuration
from setdrift.data.netcdf import Floats
from setdrift.errors import SetdriftError

DEPTH_NAMES = (
    "sea_floor_depth_below_geoid",
    "sea_floor_depth_below_geopotential_datum",
    "sea_floor_depth_below_mean_sea_level",
    "sea_floor_depth_below_sea_surface",
)
HEIGHT_NAMES = (
    "height_above_mean_sea_level",
    "height_above_geopotential_datum",
    "surface_altitude",
    "bedrock_altitude",
)


@dataclass(frozen=True)
class SeaFloor:
    """Depth of the sea on a grid of latitude and longitude.

    Attributes
    ----------
    depth : (y, x) array
        Metres, negative above sea level, NaN where not known.
    latitude, longitude : 1-D array
        Cell centres, degrees, both ascending.
    """

    depth: Floats
    latitude: Floats
    longitude: Floats

    def is_shallow(self, longitude: Floats, latitude: Floats, least_depth: float) -> NDArray[np.bool_]:
        """Return which positions are known to be shallow.

        Parameters
        ----------
        longitude, latitude : (n,) array
            Degrees, any longitude convention.
        least_depth : float
            Metres; less is shallow.

        Returns
        -------
        (n,) array of bool
            Whether the nearest cell is shallower. Where the depth is missing, and beyond the cells, there is
            no telling: not shallow.
        """
        row, column, within = nearest_cells(longitude, latitude, self.longitude, self.latitude)
        return np.asarray((self.depth[row, column] < least_depth) & within)


def sea_floor(configuration: Configuration) -> SeaFloor | None:
    """Read the configured depth of the sea.

    The variable's standard name, or else its attribute `positive`, tells depths from heights.

    Parameters
    ----------
    configuration : Configuration
        The analysis.

    Returns
    -------
    SeaFloor or None
        On the file's own grid; None where none is configured.

    Raises
    ------
    SetdriftError
        The file cannot be read, holds no such field or several, or does not tell which way it counts.
    """
    source = configuration.depth
    if source is None:
        return None
    path = configuration.resolve(source.file)
    found = load_field(path, source.variable, "depth", DEPTH_NAMES + HEIGHT_NAMES)
    depth = found.field if _counts_down(found, path) else -found.field
    return SeaFloor(depth, found.latitude, found.longitude)


def _counts_down(found: GriddedField, path: Path) -> bool:
    name = "down" if found.standard_name in DEPTH_NAMES else "up" if found.standard_name in HEIGHT_NAMES else None
    positive = (found.positive or "").lower()
    positive = positive if positive in {"up", "down"} else ""
    if name and positive and name != positive:
        what = f"has standard_name {found.standard_name}, which counts {name}, but positive = {positive}"
        raise SetdriftError(str(path), what, "correct one of these attributes")
    if not name and not positive:
        what = "does not tell whether its values are depths or heights"
        raise SetdriftError(str(path), what, 'give the variable the attribute positive = "down" or "up"')
    return (name or positive) == "down"
