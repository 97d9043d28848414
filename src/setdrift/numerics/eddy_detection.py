"""Eddies of one sea level map: closed contours round single extremes, with their size and rotation.

High sea level is an anticyclone in both hemispheres. Either sign is sought on its own, in the field or in its
negative, so the two agree exactly under a change of sign.
"""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import ArrayLike, NDArray

from setdrift.numerics.earth import WGS84, Earth, coriolis_parameter, metres_per_degree
from setdrift.numerics.eddy_contours import contour_buffers, outer_contour
from setdrift.numerics.eddy_flood import find_maxima
from setdrift.numerics.eddy_geometry import (
    area_and_misfit,
    authalic_latitude,
    authalic_radius,
    interpolate_axis,
    project_points,
)
from setdrift.numerics.eddy_outlines import Bounds, Buffers, outermost_level
from setdrift.numerics.eddy_rotation import Flow, circulation, fastest_level

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

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


@dataclass(frozen=True)
class Eddies:
    """Eddies of one map, from south to north, then by longitude.

    Attributes
    ----------
    longitude, latitude : (n,) array
        Fitted peak, degrees; longitudes in the range of the grid's.
    polarity : (n,) int8 array
        1 anticyclonic (high sea level), -1 cyclonic (low sea level), in both hemispheres.
    extremum : (n,) array
        Fitted extreme sea level, m.
    outer_level : (n,) array
        Sea level of the outer contour, m.
    amplitude : (n,) array
        \\|extremum - outer_level\\|, m.
    area : (n,) array
        Inside the outer contour, m2.
    equal_area_radius : (n,) array
        Of the circle of that area, m.
    circle_misfit : (n,) array
        Area between the outer contour and the circle of its area round its centroid, over that area.
    rotation_speed : (n,) array
        Mean velocity along the contour where it is greatest, m s-1; positive in the sense that the polarity
        demands. NaN where the velocity is unknown.
    fastest_rotation_radius : (n,) array
        Of the circle of the area inside that contour, m; NaN where the velocity is unknown.
    rossby_number : (n,) array
        Mean relative vorticity inside that contour over the Coriolis parameter at the peak; negative for
        anticyclones. NaN where the velocity is unknown.
    outer_longitude, outer_latitude : (m,) array
        Points of the outer contours, eddy after eddy, degrees; anticlockwise round an anticyclone, clockwise
        round a cyclone; the first point is not repeated. Longitudes are continuous along a contour.
    outer_size : (n,) int64 array
        Points in each outer contour.
    fastest_longitude, fastest_latitude, fastest_size
        The same for the contours of fastest rotation; the outer contour where the velocity is unknown.
    """

    longitude: FloatArray
    latitude: FloatArray
    polarity: NDArray[np.int8]
    extremum: FloatArray
    outer_level: FloatArray
    amplitude: FloatArray
    area: FloatArray
    equal_area_radius: FloatArray
    circle_misfit: FloatArray
    rotation_speed: FloatArray
    fastest_rotation_radius: FloatArray
    rossby_number: FloatArray
    outer_longitude: FloatArray
    outer_latitude: FloatArray
    outer_size: IntArray
    fastest_longitude: FloatArray
    fastest_latitude: FloatArray
    fastest_size: IntArray

    def __len__(self) -> int:
        """Return the number of eddies."""
        return self.longitude.size
