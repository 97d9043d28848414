"""Area of a contour on the Earth, and how far the contour is from a circle.

Contours are laid out on a Lambert azimuthal equal-area plane that touches the authalic sphere at the eddy's
peak: areas are those of the ellipsoid, and within 300 km of the peak lengths are right to 0.4 per cent.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numba import njit
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


@njit("f8(f8[::1], f8, f8)", cache=True)
def interpolate_axis(values: FloatArray, position: float, turn: float) -> Any:
    """Coordinate at a fractional index; an axis that closes on itself goes on by `turn` each time round."""
    size = values.size
    below = int(np.floor(position))
    part = position - below
    start = values[below % size] + turn * (below // size)
    if part == 0.0:
        return start
    return start + part * (values[(below + 1) % size] + turn * ((below + 1) // size) - start)


@njit("void(f8[:, ::1], i8, f8[::1], f8[::1], i8, i8, f8, f8[:, ::1])", cache=True)
def project_points(
    points: FloatArray,
    n: int,
    latitude: FloatArray,
    longitude: FloatArray,
    row: int,
    column: int,
    radius: float,
    plane: FloatArray,
) -> None:
    """Put points of a grid on the equal-area plane that touches it at one grid point.

    Parameters
    ----------
    points : (2, m) array
        Fractional columns and rows.
    n : int
        How many of the points to use.
    latitude, longitude : (y,), (x,) array
        Authalic latitude and longitude of the grid, degrees.
    row, column : int
        The grid point where the plane touches.
    radius : float
        Of the authalic sphere, m.
    plane : (2, m) array
        Filled with eastward and northward distances, m.

    References
    ----------
    Snyder (1987), Map Projections: A Working Manual, eqs. 22-4, 22-5 and 24-2.
    """
    degree = np.pi / 180.0
    sine, cosine = np.sin(degree * latitude[row]), np.cos(degree * latitude[row])
    for k in range(n):
        phi = degree * interpolate_axis(latitude, points[1, k], 0.0)
        away = degree * (interpolate_axis(longitude, points[0, k], 360.0) - longitude[column])
        sine_phi, cosine_phi, cosine_away = np.sin(phi), np.cos(phi), np.cos(away)
        scale = radius * np.sqrt(2.0 / (1.0 + sine * sine_phi + cosine * cosine_phi * cosine_away))
        plane[0, k] = scale * cosine_phi * np.sin(away)
        plane[1, k] = scale * (cosine * sine_phi - sine * cosine_phi * cosine_away)


@njit("UniTuple(f8, 3)(f8[:, ::1], i8)", cache=True)
def _area_and_centroid(plane: FloatArray, n: int) -> Any:
    """Signed area, positive anticlockwise, and x and y of the centroid of the polygon of the first n points."""
    x0, y0 = plane[0, 0], plane[1, 0]
    twice, moment_x, moment_y = 0.0, 0.0, 0.0
    for k in range(1, n - 1):
        ax, ay = plane[0, k] - x0, plane[1, k] - y0
        bx, by = plane[0, k + 1] - x0, plane[1, k + 1] - y0
        cross = ax * by - ay * bx
        twice += cross
        moment_x += cross * (ax + bx)
        moment_y += cross * (ay + by)
    if twice == 0.0:
        return 0.0, x0, y0
    return 0.5 * twice, x0 + moment_x / (3.0 * twice), y0 + moment_y / (3.0 * twice)


@njit("f8(f8, f8, f8, f8, f8)", cache=True)
def _overlap_with_side(ax: float, ay: float, bx: float, by: float, radius: float) -> Any:
    """Signed area common to a circle round the origin and the triangle of the origin, a and b."""
    dx, dy = bx - ax, by - ay
    length = dx * dx + dy * dy
    if length == 0.0:
        return 0.0
    middle = -(ax * dx + ay * dy) / length
    root = middle * middle - (ax * ax + ay * ay - radius * radius) / length
    enter, leave = (middle - np.sqrt(root), middle + np.sqrt(root)) if root > 0.0 else (1.0, 0.0)
    if enter >= 1.0 or leave <= 0.0:  # the side is outside the circle, the triangle holds a sector
        return 0.5 * radius * radius * np.arctan2(ax * by - ay * bx, ax * bx + ay * by)
    px, py, qx, qy = ax, ay, bx, by
    sectors = 0.0
    if enter > 0.0:
        px, py = ax + enter * dx, ay + enter * dy
        sectors += np.arctan2(ax * py - ay * px, ax * px + ay * py)
    if leave < 1.0:
        qx, qy = ax + leave * dx, ay + leave * dy
        sectors += np.arctan2(qx * by - qy * bx, qx * bx + qy * by)
    return 0.5 * (radius * radius * sectors + px * qy - py * qx)


@njit("UniTuple(f8, 2)(f8[:, ::1], i8)", cache=True)
def area_and_misfit(plane: FloatArray, n: int) -> Any:
    """Area of a polygon, and its misfit to the circle that has its area and its centroid.

    Parameters
    ----------
    plane : (2, m) array
        Corners of the polygon, m.
    n : int
        How many of the points to use.

    Returns
    -------
    area : float
        m2, positive.
    misfit : float
        Area that only one of polygon and circle covers, over the area of the circle: 0 for a circle, at most 2.
    """
    signed, x, y = _area_and_centroid(plane, n)
    area = abs(signed)
    if area == 0.0:
        return 0.0, 2.0
    radius = np.sqrt(area / np.pi)
    common = 0.0
    for k in range(n):
        m = (k + 1) % n
        common += _overlap_with_side(plane[0, k] - x, plane[1, k] - y, plane[0, m] - x, plane[1, m] - y, radius)
    return area, 2.0 * (1.0 - abs(common) / area)
