"""Eddies as a table: one column a property, contours as ragged arrays."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]


@dataclass(frozen=True, eq=False)
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
        Distance between the two, m.
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
        anticyclones. NaN where the velocity is unknown and on the equator.
    outer_longitude, outer_latitude : (m,) array
        Points of the outer contours, eddy after eddy, degrees; anticlockwise, the first point not repeated.
        Longitudes are continuous along a contour, also where it crosses the seam of a periodic grid.
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


@dataclass(frozen=True, eq=False)
class Eddy:
    """One eddy, field by field as in `Eddies`; contours as (2, m) arrays of longitude and latitude."""

    longitude: float
    latitude: float
    polarity: int
    extremum: float
    outer_level: float
    area: float
    circle_misfit: float
    rotation_speed: float
    fastest_area: float
    rossby_number: float
    outer: FloatArray
    fastest: FloatArray


def collect_eddies(eddies: list[Eddy]) -> Eddies:
    """Arrange single eddies as a table.

    Parameters
    ----------
    eddies : list of Eddy
        In any order.

    Returns
    -------
    Eddies
        From south to north, then by longitude.
    """
    eddies = sorted(eddies, key=lambda eddy: (eddy.latitude, eddy.longitude, eddy.polarity))

    def column(name: str) -> FloatArray:
        return np.array([getattr(eddy, name) for eddy in eddies], dtype=np.float64)

    outer = np.concatenate([np.empty((2, 0)), *(eddy.outer for eddy in eddies)], axis=1)
    fastest = np.concatenate([np.empty((2, 0)), *(eddy.fastest for eddy in eddies)], axis=1)
    extremum, outer_level, area = column("extremum"), column("outer_level"), column("area")
    return Eddies(
        longitude=column("longitude"),
        latitude=column("latitude"),
        polarity=column("polarity").astype(np.int8),
        extremum=extremum,
        outer_level=outer_level,
        amplitude=np.abs(extremum - outer_level),
        area=area,
        equal_area_radius=np.sqrt(area / np.pi),
        circle_misfit=column("circle_misfit"),
        rotation_speed=column("rotation_speed"),
        fastest_rotation_radius=np.sqrt(column("fastest_area") / np.pi),
        rossby_number=column("rossby_number"),
        outer_longitude=outer[0],
        outer_latitude=outer[1],
        outer_size=np.array([eddy.outer.shape[1] for eddy in eddies], dtype=np.int64),
        fastest_longitude=fastest[0],
        fastest_latitude=fastest[1],
        fastest_size=np.array([eddy.fastest.shape[1] for eddy in eddies], dtype=np.int64),
    )
