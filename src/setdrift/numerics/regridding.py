"""Carrying a gridded field, with its land, onto another latitude-longitude grid."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.spatial import cKDTree

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.intp]

_MEAN_RADIUS_KM = 6371.0088  # of the sphere on which "nearest" is judged (IUGG mean radius)
_NEGLIGIBLE_WEIGHT = 1e-9  # a target on a grid node gives its other corners rounding errors for weights


def regrid_bilinear(
    field: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    target_latitude: ArrayLike,
    target_longitude: ArrayLike,
    *,
    fill_distance_km: float = 0.0,
    periodic: bool = False,
) -> FloatArray:
    """Interpolate a field bilinearly, using only the corners that are sea.

    The weights of the sea corners are scaled to a sum of one. A target point without any sea corner takes
    the nearest sea value within `fill_distance_km`, so that two coastlines that disagree by a cell or two
    leave no hole.

    Parameters
    ----------
    field : (y, x) array
        Any quantity; NaN on land.
    latitude : (y,) array
        Degrees north, ascending or descending.
    longitude : (x,) array
        Degrees east, eastward in any convention (0 to 360, -180 to 180, or wrapping part of the way).
    target_latitude, target_longitude : (m,) and (n,) array
        Axes of the target grid, degrees, any convention.
    fill_distance_km : float
        How far, along the great circle, a value may be carried; 0 for not at all.
    periodic : bool
        Whether the columns go round the globe.

    Returns
    -------
    (m, n) array
        Field units; NaN where neither applies.

    Raises
    ------
    ValueError
        If an axis does not match the field or is not monotonic, `periodic` is asked of columns that do
        not go round, or `fill_distance_km` is negative.
    """
    if fill_distance_km < 0.0:
        raise ValueError(f"fill_distance_km must not be negative, not {fill_distance_km}")
    values, rows, columns = _ascending(field, latitude, longitude, periodic)
    target_rows = np.asarray(target_latitude, dtype=np.float64)
    target_columns = np.asarray(target_longitude, dtype=np.float64)
    south, north_share = _bracket(rows, target_rows)
    west, east_share = _bracket(columns, _within_turn(target_columns, columns))
    result = _weighted_corners(values, south, north_share, west, east_share)
    if fill_distance_km > 0.0:
        _fill_from_nearest(result, target_rows, target_columns, values, rows, columns, fill_distance_km)
    return result


def _ascending(
    field: ArrayLike, latitude: ArrayLike, longitude: ArrayLike, periodic: bool
) -> tuple[NDArray[np.generic], FloatArray, FloatArray]:
    """Return the field northward and eastward; if periodic, with its first column repeated at the end."""
    values = np.asarray(field)
    rows = np.asarray(latitude, dtype=np.float64)
    columns = np.asarray(longitude, dtype=np.float64)
    if values.shape != (rows.size, columns.size):
        raise ValueError(f"field has shape {values.shape}, its axes {(rows.size, columns.size)}")
    if rows.size > 1 and rows[0] > rows[-1]:
        values, rows = values[::-1], rows[::-1]
    columns = np.unwrap(columns, period=360.0)
    for name, axis in (("latitude", rows), ("longitude", columns)):
        if np.any(np.diff(axis) <= 0.0):
            raise ValueError(f"{name} must be strictly monotonic")
    closing = columns[0] + 360.0 - columns[-1]
    if periodic and closing > 1.5 * np.diff(columns).max(initial=0.0):
        raise ValueError(f"longitude leaves {closing:g} degrees open: it is not periodic")
    if periodic and closing > 1e-6:
        values = np.concatenate([values, values[:, :1]], axis=1)
        columns = np.append(columns, columns[0] + 360.0)
    return values, rows, columns


def _within_turn(longitude: FloatArray, columns: FloatArray) -> FloatArray:
    """Return longitudes shifted by whole turns to lie at or east of the first column."""
    # a target a rounding error west of the first column belongs to it, not a turn further east
    shifted: FloatArray = columns[0] - 1e-9 + np.mod(longitude - columns[0] + 1e-9, 360.0)
    return shifted


def _bracket(axis: FloatArray, target: FloatArray) -> tuple[IndexArray, FloatArray]:
    """Return the lower neighbour of each target and its share of the way up; NaN share if outside."""
    lower = np.clip(np.searchsorted(axis, target, side="right") - 1, 0, max(axis.size - 2, 0))
    upper = np.minimum(lower + 1, axis.size - 1)
    width = np.where(upper > lower, axis[upper] - axis[lower], 1.0)
    share = (target - axis[lower]) / width
    outside = (share < -1e-6) | (share > np.where(upper > lower, 1.0, 0.0) + 1e-6)
    return lower, np.where(outside, np.nan, np.clip(share, 0.0, 1.0))


def _weighted_corners(
    values: NDArray[np.generic],
    south: IndexArray,
    north_share: FloatArray,
    west: IndexArray,
    east_share: FloatArray,
) -> FloatArray:
    """Return the mean of the sea corners, weighted bilinearly; NaN without any."""
    numeric = values.astype(np.float64)
    total = np.zeros((south.size, west.size))
    weight = np.zeros_like(total)
    for row_step, row_share in ((0, 1.0 - north_share), (1, north_share)):
        row = np.minimum(south + row_step, values.shape[0] - 1)
        for column_step, column_share in ((0, 1.0 - east_share), (1, east_share)):
            column = np.minimum(west + column_step, values.shape[1] - 1)
            corner = numeric[np.ix_(row, column)]
            share = np.where(np.isnan(corner), 0.0, np.outer(row_share, column_share))
            total += share * np.nan_to_num(corner)
            weight += share
    known = weight > _NEGLIGIBLE_WEIGHT
    return np.where(known, total / np.where(known, weight, 1.0), np.nan)


def _fill_from_nearest(
    result: FloatArray,
    target_rows: FloatArray,
    target_columns: FloatArray,
    values: NDArray[np.generic],
    rows: FloatArray,
    columns: FloatArray,
    distance_km: float,
) -> None:
    """Give the empty points of `result`, in place, the nearest sea value within the distance."""
    empty_row, empty_column = np.nonzero(np.isnan(result))
    if empty_row.size == 0:
        return
    wanted = target_rows[empty_row]
    margin = np.rad2deg(distance_km / _MEAN_RADIUS_KM)
    # only the sea within reach, by latitude, of an empty point can matter: the tree stays small
    reachable = (rows >= wanted.min() - margin) & (rows <= wanted.max() + margin)
    numeric = values.astype(np.float64)
    row, column = np.nonzero(~np.isnan(numeric) & reachable[:, np.newaxis])
    if row.size == 0:
        return
    tree = cKDTree(_unit_vectors(rows[row], columns[column]))
    chord_limit = 2.0 * np.sin(min(0.5 * distance_km / _MEAN_RADIUS_KM, 0.5 * np.pi))
    query = _unit_vectors(wanted, target_columns[empty_column])
    chord, found = tree.query(query, distance_upper_bound=chord_limit * (1.0 + 1e-9))
    near = np.isfinite(chord)
    nearest = np.asarray(found, dtype=np.intp)[near]
    result[empty_row[near], empty_column[near]] = numeric[row[nearest], column[nearest]]


def _unit_vectors(latitude: FloatArray, longitude: FloatArray) -> FloatArray:
    phi, lam = np.deg2rad(latitude), np.deg2rad(longitude)
    return np.column_stack([np.cos(phi) * np.cos(lam), np.cos(phi) * np.sin(lam), np.sin(phi)])
