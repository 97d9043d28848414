"""Gridded files that stand beside the observations: mean dynamic topography and land."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
from numpy.typing import NDArray

from setdrift.data.configuration import Configuration
from setdrift.data.netcdf import Floats, attribute, find_variable, floats, in_units, listed, opened, variables
from setdrift.errors import SetdriftError

MEAN_TOPOGRAPHY_NAMES = ("sea_surface_height_above_geoid",)
LAND_NAMES = ("land_binary_mask", "land_area_fraction")
SEA_NAMES = ("sea_binary_mask", "sea_area_fraction")


@dataclass(frozen=True)
class GriddedField:
    """A field on a grid of latitude and longitude.

    Attributes
    ----------
    field : (y, x) array
        Values, NaN where missing.
    latitude, longitude : 1-D array
        Degrees, both ascending; longitudes are continuous and may leave -180..180.
    standard_name, positive : str or None
        CF attributes of the file's variable.
    """

    field: Floats
    latitude: Floats
    longitude: Floats
    standard_name: str | None = None
    positive: str | None = None


@dataclass(frozen=True)
class LandMask:
    """Where land is, on a grid of latitude and longitude.

    Attributes
    ----------
    land : (y, x) bool array
        Whether the cell is land.
    latitude, longitude : 1-D array
        Cell centres, degrees, both ascending.
    """

    land: NDArray[np.bool_]
    latitude: Floats
    longitude: Floats

    def is_land(self, longitude: Floats, latitude: Floats) -> NDArray[np.bool_]:
        """Return which positions lie in a cell of land.

        Parameters
        ----------
        longitude, latitude : (n,) array
            Degrees, any longitude convention.

        Returns
        -------
        (n,) array of bool
            Whether the nearest cell is land. Beyond the mask's cells there is no telling: not land.
        """
        row, column, within = nearest_cells(longitude, latitude, self.longitude, self.latitude)
        return np.asarray(self.land[row, column] & within)


def nearest_cells(
    longitude: Floats, latitude: Floats, columns: Floats, rows: Floats
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.bool_]]:
    """Find the grid cells that positions lie in.

    Parameters
    ----------
    longitude, latitude : (n,) array
        Degrees, any longitude convention.
    columns, rows : 1-D array
        Longitudes and latitudes of the cells' centres, degrees, ascending.

    Returns
    -------
    tuple of (n,) arrays
        Row and column of the nearest cell, and whether the position lies in it, not beyond the outermost cells.
    """
    west = columns[0] - (columns[1] - columns[0]) / 2
    column, across = _nearest((np.asarray(longitude) - west) % 360.0 + west, columns)
    row, along = _nearest(np.asarray(latitude), rows)
    return row, column, across & along


def _nearest(position: Floats, centres: Floats) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """Return the nearest centre's index, and whether the position lies within the outermost cells."""
    middles = (centres[1:] + centres[:-1]) / 2
    low = centres[0] - (middles[0] - centres[0])
    high = centres[-1] + (centres[-1] - middles[-1])
    return np.searchsorted(middles, position), np.asarray((position >= low) & (position <= high))


def load_field(
    path: Path, variable: str | None, what: str, standard_names: tuple[str, ...], units: str = "m"
) -> GriddedField:
    """Read a field from a CF gridded file.

    Parameters
    ----------
    path : Path
        The file.
    variable : str or None
        The variable, if the user named it.
    what : str
        Configuration section the file belongs to, for messages.
    standard_names : tuple of str
        CF standard names it may carry; where none does, the only field of the file is taken.
    units : str
        Units wanted; with "1", a variable without units is taken as it is.

    Returns
    -------
    GriddedField
        The field, latitudes and longitudes ascending.

    Raises
    ------
    SetdriftError
        The file cannot be read, or holds no such field, or several.
    """
    with opened(path) as file:
        found = _field_variable(file, variable, what, standard_names)
        latitude = in_units(_coordinate(file, found, "latitude"), str(path), "degrees")
        longitude = in_units(_coordinate(file, found, "longitude"), str(path), "degrees")
        plain = units == "1" and attribute(found, "units") is None
        values = floats(found) if plain else in_units(found, str(path), units)
        values = _two_dimensional(values, found, _coordinate(file, found, "latitude").dimensions[0], str(path))
        attributes = (attribute(found, "standard_name"), attribute(found, "positive"))
    _check_axes(str(path), latitude, longitude)
    return GriddedField(*_ascending(values, latitude, longitude), *attributes)


def mean_dynamic_topography(configuration: Configuration) -> GriddedField:
    """Read the configured mean dynamic topography, in metres.

    Parameters
    ----------
    configuration : Configuration
        The analysis.

    Returns
    -------
    GriddedField
        Mean dynamic topography on the file's own grid.
    """
    source = configuration.mean_dynamic_topography
    path = configuration.resolve(source.file)
    return load_field(path, source.variable, "mean_dynamic_topography", MEAN_TOPOGRAPHY_NAMES)


def land_mask(configuration: Configuration) -> LandMask:
    """Read the configured land mask, or else take the missing values of the mean dynamic topography for land.

    A fraction above one half is land. A variable named by the user without a standard name of the sea counts
    land; missing values are sea in a mask of land, and land in a mask of the sea.

    Parameters
    ----------
    configuration : Configuration
        The analysis.

    Returns
    -------
    LandMask
        On the file's own grid.
    """
    if configuration.land is None:
        mean = mean_dynamic_topography(configuration)
        return LandMask(np.isnan(mean.field), mean.latitude, mean.longitude)
    source = configuration.land
    mask = load_field(configuration.resolve(source.file), source.variable, "land", LAND_NAMES + SEA_NAMES, units="1")
    above = mask.field > 0.5
    return LandMask(~above if mask.standard_name in SEA_NAMES else above, mask.latitude, mask.longitude)


def _field_variable(file: netCDF4.Dataset, given: str | None, what: str, standard_names: tuple[str, ...]) -> Any:
    known = variables(file)
    named = [v for v in known.values() if attribute(v, "standard_name") in standard_names]
    if given is not None or named:
        return find_variable(file, what, given, standard_names, f"{what}.variable")[1]
    fields = [name for name, v in known.items() if v.ndim >= 2 and _axis_names(v) >= {"latitude", "longitude"}]
    if len(fields) == 1:
        return known[fields[0]]
    if fields:
        what_is_wrong = f"has several fields ({', '.join(fields)})"
    else:
        what_is_wrong = f"has no field on latitude and longitude ({listed(known)})"
    raise SetdriftError(file.filepath(), what_is_wrong, f"name the variable under {what}.variable")


def _axis(variable: Any, dimension: str) -> tuple[str | None, Any]:
    """Return what the coordinate variable of a dimension is (latitude, longitude or neither), and itself."""
    group = variable.group()
    while group is not None:
        if dimension in group.variables:
            coordinate = group.variables[dimension]
            name, units = attribute(coordinate, "standard_name"), (attribute(coordinate, "units") or "").lower()
            for what, ending in (("latitude", ("_north", "_n", "north")), ("longitude", ("_east", "_e", "east"))):
                if name == what or (name is None and units.startswith("degree") and units.endswith(ending)):
                    return what, coordinate
            return None, coordinate
        group = group.parent
    return None, None


def _axis_names(variable: Any) -> set[str]:
    return {name for name, _ in (_axis(variable, d) for d in variable.dimensions) if name}


def _coordinate(file: netCDF4.Dataset, variable: Any, what: str) -> Any:
    for name, coordinate in (_axis(variable, dimension) for dimension in variable.dimensions):
        if name == what:
            return coordinate
    raise SetdriftError(
        file.filepath(),
        f"variable {variable.name} ({', '.join(variable.dimensions)}) has no one-dimensional {what}",
        "give a field on a regular grid with CF coordinates",
    )


def _two_dimensional(values: Floats, variable: Any, latitude_dimension: str, where: str) -> Floats:
    """Drop dimensions of size 1 other than the grid's, and put latitude first."""
    grid = [i for i, d in enumerate(variable.dimensions) if _axis(variable, d)[0] in {"latitude", "longitude"}]
    others = [i for i in range(values.ndim) if i not in grid]
    large = [variable.dimensions[i] for i in others if values.shape[i] != 1]
    if large:
        raise SetdriftError(
            where,
            f"variable {variable.name} varies along {', '.join(large)}",
            "give one field on latitude and longitude",
        )
    plane = values.squeeze(axis=tuple(others))
    return plane if variable.dimensions[grid[0]] == latitude_dimension else plane.T


def _check_axes(where: str, latitude: Floats, longitude: Floats) -> None:
    for name, axis in (("latitude", latitude), ("longitude", np.unwrap(longitude, period=360.0))):
        steps = np.diff(axis)
        if axis.size < 2 or not (np.all(steps > 0) or np.all(steps < 0)):
            raise SetdriftError(
                where, f"its {name} has {axis.size} values that neither rise nor fall throughout", "replace the file"
            )


def _ascending(values: Floats, latitude: Floats, longitude: Floats) -> tuple[Floats, Floats, Floats]:
    longitude = np.unwrap(longitude, period=360.0)
    rows = slice(None, None, 1 if latitude[1] > latitude[0] else -1)
    columns = slice(None, None, 1 if longitude[1] > longitude[0] else -1)
    return np.ascontiguousarray(values[rows, columns]), latitude[rows].copy(), longitude[columns].copy()
