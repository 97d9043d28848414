"""The shape, gravity and rotation of the Earth."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

EARTH_ROTATION_RATE = 7.292115e-5
"""Rotation rate of the Earth, rad s-1 (WGS 84; IERS Conventions 2010, Table 1.2)."""


@dataclass(frozen=True)
class Earth:
    """An ellipsoid of revolution with its normal gravity and rotation.

    Parameters
    ----------
    semi_major_axis : float
        Equatorial radius, m.
    flattening : float
        (a - b) / a; 0 for a sphere.
    equatorial_gravity, polar_gravity : float
        Normal gravity on the surface, m s-2.
    rotation_rate : float
        rad s-1.
    """

    semi_major_axis: float
    flattening: float
    equatorial_gravity: float
    polar_gravity: float
    rotation_rate: float = EARTH_ROTATION_RATE

    @property
    def eccentricity_squared(self) -> float:
        """First eccentricity of the meridian ellipse, squared."""
        return self.flattening * (2.0 - self.flattening)

    @property
    def somigliana_constant(self) -> float:
        """Somigliana's k = b g_p / (a g_e) - 1, dimensionless."""
        return (1.0 - self.flattening) * self.polar_gravity / self.equatorial_gravity - 1.0


WGS84 = Earth(
    semi_major_axis=6378137.0,
    flattening=1.0 / 298.257223563,
    equatorial_gravity=9.7803253359,
    polar_gravity=9.8321849379,
)
"""World Geodetic System 1984 (NGA.STND.0036, 2014, Tables 3.1 and 3.5; gravity values from memory)."""


def spherical_earth(radius: float, gravity: float, rotation_rate: float = EARTH_ROTATION_RATE) -> Earth:
    """Return a sphere with uniform gravity.

    Parameters
    ----------
    radius : float
        m.
    gravity : float
        m s-2, the same everywhere.
    rotation_rate : float
        rad s-1.

    Returns
    -------
    Earth
        The sphere.

    Raises
    ------
    ValueError
        If the radius or gravity is not positive.
    """
    if radius <= 0.0:
        raise ValueError(f"radius must be positive, not {radius}")
    if gravity <= 0.0:
        raise ValueError(f"gravity must be positive, not {gravity}")
    return Earth(radius, 0.0, gravity, gravity, rotation_rate)


def coriolis_parameter(latitude: ArrayLike, earth: Earth = WGS84) -> FloatArray:
    """Return the Coriolis parameter f = 2 Omega sin(latitude).

    Parameters
    ----------
    latitude : array
        Geodetic latitude, degrees north.
    earth : Earth
        Earth model.

    Returns
    -------
    array
        s-1, negative south of the equator; the shape of `latitude`.

    References
    ----------
    Gill (1982), Atmosphere-Ocean Dynamics, section 7.4.
    """
    return 2.0 * earth.rotation_rate * np.sin(_radians(latitude))


def beta_parameter(latitude: ArrayLike, earth: Earth = WGS84) -> FloatArray:
    """Return the northward gradient of the Coriolis parameter along the meridian.

    Parameters
    ----------
    latitude : array
        Geodetic latitude, degrees north.
    earth : Earth
        Earth model; the gradient uses its meridional radius of curvature.

    Returns
    -------
    array
        m-1 s-1; the shape of `latitude`.

    References
    ----------
    Gill (1982), Atmosphere-Ocean Dynamics, section 11.4.
    """
    gradient = 2.0 * earth.rotation_rate * np.cos(_radians(latitude))
    return gradient / meridional_radius(latitude, earth)


def gravity(latitude: ArrayLike, earth: Earth = WGS84) -> FloatArray:
    """Return normal gravity on the surface by Somigliana's closed formula.

    Parameters
    ----------
    latitude : array
        Geodetic latitude, degrees north.
    earth : Earth
        Earth model.

    Returns
    -------
    array
        m s-2; the shape of `latitude`.

    References
    ----------
    Somigliana (1929); Moritz (1980), Geodetic Reference System 1980, Bulletin Geodesique 54, section 4.
    """
    sine_squared = np.sin(_radians(latitude)) ** 2
    numerator = 1.0 + earth.somigliana_constant * sine_squared
    return earth.equatorial_gravity * numerator / np.sqrt(1.0 - earth.eccentricity_squared * sine_squared)


def meridional_radius(latitude: ArrayLike, earth: Earth = WGS84) -> FloatArray:
    """Return the radius of curvature along the meridian, M.

    Parameters
    ----------
    latitude : array
        Geodetic latitude, degrees north.
    earth : Earth
        Earth model.

    Returns
    -------
    array
        m; the shape of `latitude`.

    References
    ----------
    Snyder (1987), Map Projections: A Working Manual, eq. 4-18.
    """
    squared = earth.eccentricity_squared
    denominator = (1.0 - squared * np.sin(_radians(latitude)) ** 2) ** 1.5
    return earth.semi_major_axis * (1.0 - squared) / denominator


def transverse_radius(latitude: ArrayLike, earth: Earth = WGS84) -> FloatArray:
    """Return the radius of curvature across the meridian, N.

    Parameters
    ----------
    latitude : array
        Geodetic latitude, degrees north.
    earth : Earth
        Earth model.

    Returns
    -------
    array
        m; the shape of `latitude`.

    References
    ----------
    Snyder (1987), Map Projections: A Working Manual, eq. 4-20.
    """
    sine_squared = np.sin(_radians(latitude)) ** 2
    return earth.semi_major_axis / np.sqrt(1.0 - earth.eccentricity_squared * sine_squared)


def metres_per_degree(latitude: ArrayLike, earth: Earth = WGS84) -> tuple[FloatArray, FloatArray]:
    """Return the local length of one degree of longitude and of latitude.

    Parameters
    ----------
    latitude : array
        Geodetic latitude, degrees north.
    earth : Earth
        Earth model.

    Returns
    -------
    east, north : array
        m per degree; the shape of `latitude`. `east` falls to zero at the poles.

    References
    ----------
    Snyder (1987), Map Projections: A Working Manual, eqs. 4-19 and 4-21.
    """
    degree = np.pi / 180.0
    # cos(90 degrees) is 6e-17 in floating point, and minus that beyond: never let a length be negative
    cosine = np.maximum(np.cos(_radians(latitude)), 0.0)
    east = transverse_radius(latitude, earth) * cosine * degree
    return east, meridional_radius(latitude, earth) * degree


def _radians(latitude: ArrayLike) -> FloatArray:
    return np.deg2rad(np.asarray(latitude, dtype=np.float64))
