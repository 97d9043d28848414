"""The sphere that has the ellipsoid's area, zone by zone: areas on it are areas on the Earth."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from setdrift.numerics.earth import WGS84, Earth

FloatArray = NDArray[np.float64]


def authalic_latitude(latitude: FloatArray, earth: Earth = WGS84) -> FloatArray:
    """Latitude on the sphere of the ellipsoid's area that has the same area to its south.

    Parameters
    ----------
    latitude : array
        Geodetic latitude, degrees north.
    earth : Earth
        Earth model.

    Returns
    -------
    array
        Degrees; the shape of `latitude`.

    References
    ----------
    Snyder (1987), Map Projections: A Working Manual, eqs. 3-11 and 3-12.
    """
    pole = float(_area_function(np.array(1.0), earth))
    ratio = _area_function(np.sin(np.deg2rad(latitude)), earth) / pole
    authalic: FloatArray = np.rad2deg(np.arcsin(np.clip(ratio, -1.0, 1.0)))
    return authalic


def authalic_radius(earth: Earth = WGS84) -> float:
    """Radius of the sphere of the ellipsoid's area.

    Parameters
    ----------
    earth : Earth
        Earth model.

    Returns
    -------
    float
        m.

    References
    ----------
    Snyder (1987), Map Projections: A Working Manual, eq. 3-13.
    """
    return float(earth.semi_major_axis * np.sqrt(0.5 * _area_function(np.array(1.0), earth)))


def _area_function(sine: FloatArray, earth: Earth) -> FloatArray:
    """Snyder's q for the sine of a geodetic latitude: proportional to the area between equator and parallel."""
    squared = earth.eccentricity_squared
    if squared == 0.0:
        return 2.0 * sine
    eccentricity = np.sqrt(squared)
    logarithm = np.arctanh(eccentricity * sine) / eccentricity
    q: FloatArray = (1.0 - squared) * (sine / (1.0 - squared * sine**2) + logarithm)
    return q
