"""Horizontal derivatives on a latitude-longitude grid with gaps.

Differences are taken in degrees and divided by the local length of a degree, so the varying metric of
the ellipsoid enters exactly and only the truncation of the stencil remains. Each point uses the best
stencil its neighbours allow: fourth-order centred, second-order centred, second-order one-sided,
first-order one-sided.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from setdrift.numerics.earth import WGS84, Earth, metres_per_degree, transverse_radius

FloatArray = NDArray[np.float64]

_REACH = 2  # points either side that the widest stencil looks at
_IRREGULARITY = 1e-3  # of the spacing; single-precision longitudes stay well below


def slopes(
    field: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    *,
    periodic: bool = False,
    earth: Earth = WGS84,
) -> tuple[FloatArray, FloatArray]:
    """Return the eastward and northward derivative of a gridded field.

    Parameters
    ----------
    field : (..., y, x) array
        Any quantity; NaN where there is none.
    latitude : (y,) array
        Degrees north, ascending, regular.
    longitude : (x,) array
        Degrees east, ascending, regular.
    periodic : bool
        Whether the columns go round the globe.
    earth : Earth
        Earth model.

    Returns
    -------
    slope_x, slope_y : (..., y, x) array
        Field units per metre. NaN where the field is NaN, or where the point has no neighbour in that
        direction (an eastward slope at a pole is NaN too).

    Raises
    ------
    ValueError
        If an axis does not match the field, is not ascending and regular, or `periodic` is asked of
        columns that do not go round.

    References
    ----------
    Fornberg (1988), Mathematics of Computation 51, Tables 1 and 3 (the stencils).
    """
    eastward = eastward_slope(field, latitude, longitude, periodic=periodic, earth=earth)
    return eastward, northward_slope(field, latitude, longitude, earth=earth)


def eastward_slope(
    field: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    *,
    periodic: bool = False,
    earth: Earth = WGS84,
) -> FloatArray:
    """Return the eastward derivative of a gridded field; see `slopes`.

    Parameters
    ----------
    field : (..., y, x) array
        Any quantity; NaN where there is none.
    latitude, longitude : (y,) and (x,) array
        Degrees, ascending, regular.
    periodic : bool
        Whether the columns go round the globe.
    earth : Earth
        Earth model.

    Returns
    -------
    (..., y, x) array
        Field units per metre.

    Raises
    ------
    ValueError
        As `slopes`.
    """
    values, rows, columns = _checked_grid(field, latitude, longitude)
    spacing = _spacing(columns, "longitude")
    if periodic and not np.isclose(abs(spacing) * columns.size, 360.0, rtol=_IRREGULARITY / columns.size):
        raise ValueError(f"longitude spans {spacing * columns.size:g} degrees, not 360: it is not periodic")
    east, _ = metres_per_degree(rows, earth)
    length = np.where(np.abs(rows) < 90.0, east * spacing, np.nan)
    return _index_derivative(values, axis=-1, periodic=periodic) / length[:, np.newaxis]


def northward_slope(field: ArrayLike, latitude: ArrayLike, longitude: ArrayLike, *, earth: Earth = WGS84) -> FloatArray:
    """Return the northward derivative of a gridded field; see `slopes`.

    Parameters
    ----------
    field : (..., y, x) array
        Any quantity; NaN where there is none.
    latitude, longitude : (y,) and (x,) array
        Degrees, ascending, regular.
    earth : Earth
        Earth model.

    Returns
    -------
    (..., y, x) array
        Field units per metre.

    Raises
    ------
    ValueError
        As `slopes`.
    """
    values, rows, _ = _checked_grid(field, latitude, longitude)
    _, north = metres_per_degree(rows, earth)
    length = north * _spacing(rows, "latitude")
    return _index_derivative(values, axis=-2, periodic=False) / length[:, np.newaxis]


def relative_vorticity(
    eastward: ArrayLike,
    northward: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    *,
    periodic: bool = False,
    earth: Earth = WGS84,
) -> FloatArray:
    """Return the vertical component of the curl of a horizontal velocity.

    On an ellipsoid with radii of curvature M along and N across the meridian the curl is
    (d(M v)/dlon - d(N cos(lat) u)/dlat) / (M N cos(lat)); because d(N cos(lat))/dlat = -M sin(lat) it is
    dv/dx - du/dy + u tan(lat) / N.

    Parameters
    ----------
    eastward, northward : (..., y, x) array
        Velocity, m s-1; NaN where there is none.
    latitude, longitude : (y,) and (x,) array
        Degrees, ascending, regular.
    periodic : bool
        Whether the columns go round the globe.
    earth : Earth
        Earth model.

    Returns
    -------
    (..., y, x) array
        s-1, positive counter-clockwise.

    Raises
    ------
    ValueError
        As `slopes`, or if the components differ in shape.

    References
    ----------
    Gill (1982), Atmosphere-Ocean Dynamics, section 4.12 (curl in curvilinear coordinates).
    """
    if np.shape(eastward) != np.shape(northward):
        raise ValueError(f"northward has shape {np.shape(northward)}, eastward {np.shape(eastward)}")
    dv_dx = eastward_slope(northward, latitude, longitude, periodic=periodic, earth=earth)
    du_dy = northward_slope(eastward, latitude, longitude, earth=earth)
    rows = np.asarray(latitude, dtype=np.float64)
    curvature = np.tan(np.deg2rad(rows)) / transverse_radius(rows, earth)
    return dv_dx - du_dy + np.asarray(eastward, dtype=np.float64) * curvature[:, np.newaxis]


def _index_derivative(values: FloatArray, axis: int, periodic: bool) -> FloatArray:
    """Return the derivative along an axis in field units per grid step."""
    axis = values.ndim + axis
    padding = [(_REACH, _REACH) if dimension == axis else (0, 0) for dimension in range(values.ndim)]
    padded = np.pad(values, padding, mode="wrap") if periodic else _nan_padded(values, padding)
    padded = np.moveaxis(padded, axis, -1)
    size = values.shape[axis]
    shifted = {k: padded[..., _REACH + k : _REACH + k + size] for k in range(-_REACH, _REACH + 1)}
    derivative = (8.0 * (shifted[1] - shifted[-1]) - (shifted[2] - shifted[-2])) / 12.0
    centre_missing = np.isnan(shifted[0])
    derivative[centre_missing] = np.nan
    lacking = np.isnan(derivative) & ~centre_missing
    derivative[lacking] = _short_stencil({k: neighbour[lacking] for k, neighbour in shifted.items()})
    return np.moveaxis(derivative, -1, axis)


def _short_stencil(near: dict[int, FloatArray]) -> FloatArray:
    """Return the best derivative of those that need fewer neighbours than the fourth-order one."""
    choices = (
        (near[1] - near[-1]) / 2.0,
        (-3.0 * near[0] + 4.0 * near[1] - near[2]) / 2.0,
        (3.0 * near[0] - 4.0 * near[-1] + near[-2]) / 2.0,
        near[1] - near[0],
        near[0] - near[-1],
    )
    best = choices[0]
    for choice in choices[1:]:
        best = np.where(np.isnan(best), choice, best)
    return best


def _nan_padded(values: FloatArray, padding: list[tuple[int, int]]) -> FloatArray:
    return np.pad(values, padding, mode="constant", constant_values=np.nan)


def _checked_grid(
    field: ArrayLike, latitude: ArrayLike, longitude: ArrayLike
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return the field and its axes as arrays, or say which axis does not fit."""
    values = np.asarray(field, dtype=np.float64)
    rows = np.asarray(latitude, dtype=np.float64)
    columns = np.asarray(longitude, dtype=np.float64)
    if values.ndim < 2:
        raise ValueError(f"field must be (..., y, x), not of shape {values.shape}")
    if rows.shape != values.shape[-2:-1]:
        raise ValueError(f"latitude has shape {rows.shape}, the field {values.shape[-2]} rows")
    if columns.shape != values.shape[-1:]:
        raise ValueError(f"longitude has shape {columns.shape}, the field {values.shape[-1]} columns")
    return values, rows, columns


def _spacing(axis: FloatArray, name: str) -> float:
    """Return the spacing of a regular ascending axis, degrees (1 for a single point: never used)."""
    if axis.size < 2:
        return 1.0
    spacing = float(axis[-1] - axis[0]) / (axis.size - 1)
    if spacing <= 0.0 or np.abs(np.diff(axis) - spacing).max() > _IRREGULARITY * spacing:
        raise ValueError(f"{name} must be ascending and regularly spaced")
    return spacing
