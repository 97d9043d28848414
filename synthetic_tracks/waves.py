"""Waves: equatorial Kelvin and Rossby waves, and a random background of westward plane waves."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from synthetic_tracks.earth import DEGREE, ROTATION_RATE, Array, gravity, metres_per_degree

EAST, NORTH = (float(length) for length in metres_per_degree(np.asarray(0.0)))
"""Metres per degree at the equator: the waves live on the equatorial beta plane."""
BETA = 2 * ROTATION_RATE * DEGREE / NORTH
GRAVITY = float(gravity(np.asarray(0.0)))
_SECONDS = 86400.0


@dataclass(frozen=True)
class KelvinWave:
    """Eastward equatorial Kelvin wave: u = g eta / c, v = 0.

    References
    ----------
    Gill (1982), Atmosphere-Ocean Dynamics, section 11.5 (from memory).
    """

    speed: float
    amplitude: float
    wavelength: float
    phase: float

    def sea_level(self, lon: Array, lat: Array, day: Array) -> Array:
        """Sea level anomaly, m."""
        travelled = lon * EAST - self.speed * day * _SECONDS
        shape = np.exp(-BETA * (lat * NORTH) ** 2 / (2 * self.speed))
        return self.amplitude * shape * np.cos(2 * np.pi / self.wavelength * travelled + self.phase * DEGREE)

    def velocity(self, lon: Array, lat: Array, day: Array) -> tuple[Array, Array]:
        """Eastward and northward velocity, m s-1."""
        u = GRAVITY / self.speed * self.sea_level(lon, lat, day)
        return u, np.zeros_like(u)


@dataclass(frozen=True)
class RossbyWave:
    """Westward equatorial Rossby wave of the first meridional mode, not only its long-wave limit.

    In units of sqrt(c/beta) and 1/sqrt(beta c), v = y exp(-y^2/2) cos(kx - wt) and, from the equations for
    p + u and p - u,

        p, u = [(1 - 2y^2) / (w - k) +- 1 / (w + k)] / 2 exp(-y^2/2) sin(kx - wt),   p = g eta.

    References
    ----------
    Matsuno (1966), J. Met. Soc. Japan 44, eqs 8 and 9 for n = 1: w^2 - k^2 - k/w = 2n + 1 (from memory).
    """

    speed: float
    amplitude: float
    wavelength: float
    phase: float

    @property
    def wavenumber(self) -> float:
        """Zonal wavenumber in units of the equatorial radius of deformation."""
        return float(2 * np.pi / self.wavelength * np.sqrt(self.speed / BETA))

    @property
    def frequency(self) -> float:
        """Frequency, negative (westward phase), in units of sqrt(beta c): the slow root of w^3 - (k^2+3) w - k = 0."""
        k = self.wavenumber
        roots = np.roots([1.0, 0.0, -(k**2 + 3), -k])
        return float(min(roots.real, key=abs))

    def sea_level(self, lon: Array, lat: Array, day: Array) -> Array:
        """Sea level anomaly, m."""
        phase, y = self._phase(lon, day), self._y(lat)
        return self._scale() * self.speed**2 / GRAVITY * self._shape(y, 1) * np.sin(phase)

    def velocity(self, lon: Array, lat: Array, day: Array) -> tuple[Array, Array]:
        """Eastward and northward velocity, m s-1."""
        phase, y = self._phase(lon, day), self._y(lat)
        u = self._scale() * self.speed * self._shape(y, -1) * np.sin(phase)
        v = self._scale() * self.speed * y * np.exp(-(y**2) / 2) * np.cos(phase)
        return u, v

    def _y(self, lat: Array) -> Array:
        return np.asarray(lat * NORTH / np.sqrt(self.speed / BETA))

    def _phase(self, lon: Array, day: Array) -> Array:
        x = lon * EAST / np.sqrt(self.speed / BETA)
        time = day * _SECONDS * np.sqrt(BETA * self.speed)
        return np.asarray(self.wavenumber * x - self.frequency * time + self.phase * DEGREE)

    def _shape(self, y: Array, sign: int) -> Array:
        k, w = self.wavenumber, self.frequency
        return np.asarray(((1 - 2 * y**2) / (w - k) + sign / (w + k)) / 2 * np.exp(-(y**2) / 2))

    def _scale(self) -> float:
        """Factor that gives the sea level its amplitude."""
        largest = np.abs(self._shape(np.linspace(0, 4, 401), 1)).max()
        return float(self.amplitude * GRAVITY / self.speed**2 / largest)


@dataclass(frozen=True)
class Background:
    """A sum of plane waves of random direction and phase that all move westward; wavenumbers per degree."""

    east: Array
    north: Array
    phase: Array
    drift: float
    amplitude: float

    def sea_level(self, lon: Array, lat: Array, day: Array) -> Array:
        """Sea level anomaly, m."""
        moved = lon + self.drift * day
        total = np.zeros(np.broadcast(lon, lat, day).shape)
        for east, north, phase in zip(self.east, self.north, self.phase, strict=True):
            total += np.cos(east * moved + north * lat + phase)
        return self.amplitude * total


def random_background(values: dict[str, Any], latitude: float, rng: np.random.Generator) -> Background:
    """Draw the background of a scenario's `background` section, metric as at a latitude."""
    count = values["waves"]
    shortest, longest = values["wavelength_km"]
    wavenumber = 2 * np.pi / (1e3 * rng.uniform(shortest, longest, count))
    direction = rng.uniform(0, 2 * np.pi, count)
    east, north = metres_per_degree(np.asarray(latitude))
    return Background(
        wavenumber * np.cos(direction) * east,
        wavenumber * np.sin(direction) * north,
        rng.uniform(0, 2 * np.pi, count),
        float(values["westward_speed"] * _SECONDS / east),
        float(values["standard_deviation_m"] * np.sqrt(2 / count)),
    )
