"""Eddies of one sea level map: closed contours round single extremes, with their size and rotation.

High sea level is an anticyclone in both hemispheres. Either sign is sought on its own, in the field or in its
negative, so the two agree exactly under a change of sign.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from setdrift.numerics.authalic import authalic_latitude, authalic_radius
from setdrift.numerics.earth import WGS84, Earth, coriolis_parameter, metres_per_degree
from setdrift.numerics.eddy_contours import contour_buffers, outer_contour
from setdrift.numerics.eddy_flood import find_maxima
from setdrift.numerics.eddy_geometry import (
    area_and_misfit,
    project_points,
)
from setdrift.numerics.eddy_outlines import Bounds, Buffers, outermost_level
from setdrift.numerics.eddy_peaks import fit_peaks
from setdrift.numerics.eddy_rotation import Flow, fastest_level, velocity_along
from setdrift.numerics.eddy_table import Eddies, Eddy, collect_eddies

FloatArray = NDArray[np.float64]

__all__ = ["ANTICYCLONIC", "CYCLONIC", "Eddies", "EddyLimits", "detect_eddies"]

ANTICYCLONIC, CYCLONIC = 1, -1


@dataclass(frozen=True)
class EddyLimits:
    """What counts as an eddy. The defaults are common practice, no source, except where a reason is given.

    Attributes
    ----------
    minimum_amplitude : float
        m; about the error of a sea level map in the open ocean.
    minimum_prominence : float
        m; an extreme that stands out less from a stronger one is a bump on it. Also how far a point inside may
        fall below the outline's level.
    minimum_radius, maximum_radius : float
        m; of the circle of the outline's area.
    minimum_cells : int
        Grid points inside the outline.
    maximum_circle_misfit : float
        Of the outline; an ellipse with axes of ratio 2 has 0.43.
    equatorial_exclusion : float
        Degrees; no eddy is centred nearer the equator, where flow along the contours no longer balances.
    """

    minimum_amplitude: float = 0.02
    minimum_prominence: float = 0.01
    minimum_radius: float = 20e3
    maximum_radius: float = 250e3
    minimum_cells: int = 6
    maximum_circle_misfit: float = 0.5
    equatorial_exclusion: float = 5.0


@dataclass(frozen=True, eq=False)
class _Map:
    """Everything about a map and the limits that does not depend on the sign sought."""

    latitude: FloatArray
    longitude: FloatArray
    authalic: FloatArray
    periodic: bool
    flow: Flow
    bounds: Bounds
    buffers: Buffers
    earth: Earth


def detect_eddies(
    field: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    eastward: ArrayLike,
    northward: ArrayLike,
    *,
    limits: EddyLimits,
    periodic: bool = False,
    earth: Earth = WGS84,
) -> Eddies:
    """Eddies of a sea level map.

    Each extreme that stands out is bounded by the outermost closed contour that holds no other one, no land, no
    gap and no dip deeper than the minimum prominence, does not reach the edge, and keeps to the limits.

    Parameters
    ----------
    field : (y, x) array
        Sea level anomaly or dynamic topography, m; NaN on land and where there is no data.
    latitude, longitude : (y,), (x,) array
        Degrees, ascending.
    eastward, northward : (y, x) array
        Geostrophic velocity on the same grid, m s-1; NaN where unknown. Used for the rotation only.
    limits : EddyLimits
        What counts as an eddy.
    periodic : bool
        The last column neighbours the first.
    earth : Earth
        Earth model.

    Returns
    -------
    Eddies
        None, one or many; the same input gives the same eddies in the same order.

    Raises
    ------
    ValueError
        If shapes do not agree or coordinates do not ascend.
    """
    sea_level, latitude, longitude, u, v = _checked(field, latitude, longitude, eastward, northward, periodic)
    east_metres, north_metres = metres_per_degree(latitude, earth)
    points, crossings = contour_buffers(sea_level.shape)
    setting = _Map(
        latitude,
        longitude,
        authalic_latitude(latitude, earth),
        periodic,
        Flow(u, v, longitude, latitude, east_metres, north_metres, periodic),
        _bounds(limits, earth),
        Buffers(points, np.empty_like(points), crossings),
        earth,
    )
    eddies = [
        eddy
        for polarity in (ANTICYCLONIC, CYCLONIC)
        for eddy in _eddies_of_sign(polarity * sea_level, polarity, limits, setting)
    ]
    return collect_eddies(eddies)


def _checked(
    field: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    eastward: ArrayLike,
    northward: ArrayLike,
    periodic: bool,
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray, FloatArray]:
    """Float64 arrays that fit together, infinities made NaN."""
    axes = []
    for name, values in (("latitude", latitude), ("longitude", longitude)):
        axis = np.ascontiguousarray(values, dtype=np.float64)
        if axis.ndim != 1 or axis.size == 0 or not np.isfinite(axis).all() or not (np.diff(axis) > 0.0).all():
            raise ValueError(f"{name} must be one-dimensional, finite and ascending")
        axes.append(axis)
    maps = []
    for name, values in (("field", field), ("eastward", eastward), ("northward", northward)):
        plane = np.ascontiguousarray(values, dtype=np.float64)
        if plane.shape != (axes[0].size, axes[1].size):
            raise ValueError(
                f"{name} must have the shape (latitude, longitude) = {axes[0].size, axes[1].size}, not {plane.shape}"
            )
        maps.append(np.where(np.isfinite(plane), plane, np.nan))
    if abs(axes[0]).max() > 90.0:
        raise ValueError("latitude must lie between -90 and 90 degrees")
    seam = 360.0 - (axes[1][-1] - axes[1][0])
    if seam <= 0.0 or (periodic and seam > 1.5 * np.diff(axes[1]).max(initial=0.0)):
        raise ValueError(f"longitude must go once round the globe if periodic, and no further; {seam} degrees left")
    return maps[0], axes[0], axes[1], maps[1], maps[2]


def _bounds(limits: EddyLimits, earth: Earth) -> Bounds:
    return Bounds(
        np.pi * limits.minimum_radius**2,
        np.pi * limits.maximum_radius**2,
        float(limits.minimum_cells),
        float(limits.maximum_circle_misfit),
        float(limits.minimum_prominence),
        authalic_radius(earth),
    )


def _eddies_of_sign(field: FloatArray, polarity: int, limits: EddyLimits, setting: _Map) -> list[Eddy]:
    """Eddies round the maxima of `field`, which is the sea level times the polarity."""
    maxima = find_maxima(field, limits.minimum_prominence, periodic=setting.periodic)
    y, x, extremum = fit_peaks(field, maxima.row, maxima.column)
    latitude, longitude = _along(setting.latitude, y, 0.0), _along(setting.longitude, x, 360.0)
    west = setting.longitude[0]
    longitude = np.where(setting.periodic, west + (longitude - west) % 360.0, longitude)
    innermost = extremum - limits.minimum_amplitude
    candidates = (innermost >= maxima.closing_level) & (np.abs(latitude) >= limits.equatorial_exclusion)
    eddies = []
    for k in np.flatnonzero(candidates):
        row, column = int(maxima.row[k]), int(maxima.column[k])
        level = outermost_level(
            field,
            setting.longitude,
            setting.authalic,
            setting.periodic,
            maxima.closing_level[k],
            innermost[k],
            row,
            column,
            setting.bounds,
            setting.buffers,
        )
        if not np.isnan(level):
            peak = (float(longitude[k]), float(latitude[k]), float(extremum[k]))
            eddies.append(_measured(field, level, row, column, polarity, peak, setting))
    return eddies


def _along(axis: FloatArray, position: FloatArray, turn: float) -> FloatArray:
    """Coordinates at fractional indices; an axis that closes on itself goes on by `turn` each time round."""
    below = np.floor(position).astype(np.int64)
    start = axis[below % axis.size] + turn * (below // axis.size)
    end = axis[(below + 1) % axis.size] + turn * ((below + 1) // axis.size)
    along: FloatArray = start + (position - below) * (end - start)
    return along


def _measured(
    field: FloatArray,
    level: float,
    row: int,
    column: int,
    polarity: int,
    peak: tuple[float, float, float],
    setting: _Map,
) -> Eddy:
    """Measure the eddy that the contour of a level bounds."""
    points, plane, crossings = setting.buffers
    longitude, latitude, extremum = peak
    sense = -polarity * float(np.copysign(1.0, latitude))

    def size_and_line(n: int) -> tuple[float, float, FloatArray]:
        project_points(points, n, setting.authalic, setting.longitude, row, column, setting.bounds.radius, plane)
        area, misfit = area_and_misfit(plane, n)
        x, y = points[0, :n], points[1, :n]
        return area, misfit, np.stack([_along(setting.longitude, x, 360.0), _along(setting.latitude, y, 0.0)])

    n, _ = outer_contour(field, level, row, column, setting.periodic, points, crossings)
    area, misfit, outer = size_and_line(n)
    fastest_at, speed = fastest_level(field, level, sense, row, column, setting.flow, points, crossings)
    n, _ = outer_contour(field, fastest_at, row, column, setting.periodic, points, crossings)
    fastest_area, _, fastest = size_and_line(n)
    velocity, length = velocity_along(points, n, setting.flow)
    if np.isnan(velocity):
        speed, fastest_area = np.nan, np.nan
    planetary = float(coriolis_parameter(latitude, setting.earth)) * fastest_area
    rossby_number = velocity * length / planetary if planetary != 0.0 else np.nan
    return Eddy(
        longitude,
        latitude,
        polarity,
        polarity * extremum,
        polarity * level,
        area,
        misfit,
        speed,
        fastest_area,
        rossby_number,
        outer,
        fastest,
    )
