"""Repeat orbits: circular, with the secular precession due to the Earth's flattening."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from synthetic_tracks.earth import (
    DEGREE,
    ECCENTRICITY_SQUARED,
    EQUATORIAL_RADIUS,
    GRAVITATIONAL_PARAMETER,
    J2,
    ROTATION_RATE,
    Array,
)

_ITERATIONS = 50


@dataclass(frozen=True)
class GroundTrack:
    """Points below a satellite: degrees, half-revolution counted from time zero, metres since its start."""

    longitude: Array
    latitude: Array
    half_revolution: NDArray[np.int64]
    distance: Array


@dataclass(frozen=True)
class RepeatOrbit:
    """A circular orbit whose ground track closes after a whole number of revolutions and nodal days.

    Parameters
    ----------
    inclination : float
        Degrees.
    revolutions, nodal_days : int
        The track repeats after so many revolutions, which take so many turns of the Earth relative to the
        orbit's plane; without a common divisor.
    ascending_node : float
        Longitude at time zero, when the satellite crosses the equator northward, degrees east.
    """

    inclination: float
    revolutions: int
    nodal_days: int
    ascending_node: float = 0.0

    @property
    def semi_major_axis(self) -> float:
        """Mean semi-major axis, metres, by fixed-point iteration on the nodal period."""
        axis = EQUATORIAL_RADIUS * 1.1
        for _ in range(_ITERATIONS):
            node_rate, stretch = _secular(axis, self.inclination)
            wanted = self.revolutions / self.nodal_days * (ROTATION_RATE - node_rate)
            axis = float(np.cbrt(GRAVITATIONAL_PARAMETER / (wanted / stretch) ** 2))
        return axis

    @property
    def node_rate(self) -> float:
        """Rate of the ascending node in inertial space, rad s-1, positive eastward."""
        return _secular(self.semi_major_axis, self.inclination)[0]

    @property
    def nodal_period(self) -> float:
        """Seconds from one ascending crossing of the equator to the next."""
        axis = self.semi_major_axis
        stretch = _secular(axis, self.inclination)[1]
        return float(2 * np.pi / (np.sqrt(GRAVITATIONAL_PARAMETER / axis**3) * stretch))

    @property
    def repeat_period(self) -> float:
        """Seconds after which the ground track repeats."""
        return self.revolutions * self.nodal_period

    def pass_and_cycle(self, half_revolution: NDArray[np.int64]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Pass number in its cycle (1 to twice the revolutions, odd northward) and cycle number (from 1)."""
        passes = 2 * self.revolutions
        return half_revolution % passes + 1, half_revolution // passes + 1

    def ground_track(self, seconds: Array) -> GroundTrack:
        """Points below the satellite.

        Parameters
        ----------
        seconds : (n,) array
            Time since the satellite stood at its ascending node.

        Returns
        -------
        GroundTrack
            Longitudes -180 to 180, geodetic latitudes. A half-revolution runs from one extreme latitude
            to the other; even ones go north.
        """
        turn = 2 * np.pi * seconds / self.nodal_period
        tilt = self.inclination * DEGREE
        in_plane = np.arctan2(np.cos(tilt) * np.sin(turn), np.cos(turn))
        longitude = self.ascending_node + (in_plane + (self.node_rate - ROTATION_RATE) * seconds) / DEGREE
        latitude = _geodetic_latitude(np.arcsin(np.sin(tilt) * np.sin(turn)), self.semi_major_axis) / DEGREE
        half_revolution = np.floor(turn / np.pi + 0.5).astype(np.int64)
        since_start = turn - (half_revolution - 0.5) * np.pi
        return GroundTrack((longitude + 180) % 360 - 180, latitude, half_revolution, since_start * EQUATORIAL_RADIUS)


def _secular(axis: float, inclination: float) -> tuple[float, float]:
    """Give the secular rates of a circular orbit.

    Returns
    -------
    node_rate, stretch : float
        Node rate (rad s-1), and the ratio of the draconitic to the Keplerian angular rate.

    References
    ----------
    Kaula (1966), Theory of Satellite Geodesy, eqs 3.74 for the mean rates of node, perigee and mean anomaly
    with e = 0 (from memory): perigee and anomaly add up to 1 + (3/2) J2 (R/a)^2 (4 cos^2 i - 1).
    """
    cosine = np.cos(inclination * DEGREE)
    flattening = 1.5 * J2 * (EQUATORIAL_RADIUS / axis) ** 2
    node_rate = -np.sqrt(GRAVITATIONAL_PARAMETER / axis**3) * flattening * cosine
    return float(node_rate), float(1 + flattening * (4 * cosine**2 - 1))


def _geodetic_latitude(geocentric: Array, radius: float) -> Array:
    """Geodetic latitude (rad) below a point at a geocentric latitude (rad) and distance (m)."""
    height, away = radius * np.sin(geocentric), radius * np.cos(geocentric)
    latitude = geocentric
    for _ in range(4):
        sine = np.sin(latitude)
        normal = EQUATORIAL_RADIUS / np.sqrt(1 - ECCENTRICITY_SQUARED * sine**2)
        latitude = np.arctan2(height + ECCENTRICITY_SQUARED * normal * sine, away)
    return latitude
