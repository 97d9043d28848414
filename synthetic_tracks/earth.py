"""The Earth of the synthetic truth: WGS 84 ellipsoid, rotation and normal gravity."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

EQUATORIAL_RADIUS = 6378137.0
FLATTENING = 1 / 298.257223563
ECCENTRICITY_SQUARED = FLATTENING * (2 - FLATTENING)
ROTATION_RATE = 7.292115e-5
GRAVITATIONAL_PARAMETER = 3.986004418e14
J2 = 1.08262668e-3
"""Second zonal harmonic, unnormalised (from memory; WGS 84 / EGM96)."""

DEGREE = np.pi / 180


def metres_per_degree(lat: Array) -> tuple[Array, Array]:
    """Length of one degree of longitude and of latitude on the WGS 84 ellipsoid.

    Parameters
    ----------
    lat : (...) array
        Geodetic latitude, degrees.

    Returns
    -------
    east, north : (...) arrays
        Metres per degree of longitude and of latitude.
    """
    sine = np.sin(lat * DEGREE)
    w2 = 1 - ECCENTRICITY_SQUARED * sine**2
    prime_vertical = EQUATORIAL_RADIUS / np.sqrt(w2)
    meridional = EQUATORIAL_RADIUS * (1 - ECCENTRICITY_SQUARED) / w2**1.5
    return prime_vertical * np.cos(lat * DEGREE) * DEGREE, meridional * DEGREE


def gravity(lat: Array) -> Array:
    """Give normal gravity on the WGS 84 ellipsoid.

    Parameters
    ----------
    lat : (...) array
        Geodetic latitude, degrees.

    Returns
    -------
    (...) array
        Metres per second squared.

    References
    ----------
    Somigliana (1929); constants of NIMA (2000), TR8350.2, table 3.4 (from memory).
    """
    sine2 = np.sin(lat * DEGREE) ** 2
    return np.asarray(9.7803253359 * (1 + 0.00193185265241 * sine2) / np.sqrt(1 - ECCENTRICITY_SQUARED * sine2))


def coriolis_parameter(lat: Array) -> Array:
    """Coriolis parameter, s-1, at a latitude in degrees."""
    return np.asarray(2 * ROTATION_RATE * np.sin(lat * DEGREE))


def smooth_step(x: Array) -> Array:
    """Rise from 0 (x <= 0) to 1 (x >= 1) with two continuous derivatives."""
    x = np.clip(x, 0.0, 1.0)
    return np.asarray(x**3 * (10 + x * (6 * x - 15)))
