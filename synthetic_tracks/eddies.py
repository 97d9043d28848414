"""Eddies: drifting, growing and decaying Gaussian bumps of sea level of both signs."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np

from synthetic_tracks.earth import Array, coriolis_parameter, gravity, metres_per_degree, smooth_step
from synthetic_tracks.geography import Geography
from synthetic_tracks.scenario import Box

_REACH = 6.0
"""Radii beyond which an eddy is left out: exp(-18), a millionth of a millimetre."""
_BLOCK = 512
_ATTEMPTS = 60_000
_COAST_CLEARANCE = 1.3
_SECONDS = 86400.0


@dataclass(frozen=True)
class Eddies:
    """A population: one value per eddy. Place at day `middle`; drift in degrees a day; radius in metres."""

    longitude: Array
    latitude: Array
    eastward_drift: Array
    northward_drift: Array
    amplitude: Array
    radius: Array
    middle: Array
    birth: Array
    death: Array
    growth: float
    decay: float

    def __len__(self) -> int:
        """Count the eddies."""
        return self.longitude.size

    def centre(self, day: Array | float) -> tuple[Array, Array]:
        """Longitude and latitude of the centres (degrees)."""
        elapsed = day - self.middle
        return self.longitude + self.eastward_drift * elapsed, self.latitude + self.northward_drift * elapsed

    def height(self, day: Array | float) -> Array:
        """Signed height of the centres (m): zero before birth and after death."""
        grown = smooth_step((day - self.birth) / self.growth)
        return np.asarray(self.amplitude * grown * smooth_step((self.death - day) / self.decay))

    def sea_level(self, lon: Array, lat: Array, day: Array) -> Array:
        """Sea level anomaly of all eddies (m) at points in space and time.

        Parameters
        ----------
        lon, lat : (n,) arrays
            Degrees; neighbours in the list should be neighbours in space.
        day : (n,) array
            Days since 2000-01-01.

        Returns
        -------
        (n,) array
            Metres.
        """
        total = np.zeros(lon.shape)
        for start in range(0, lon.size, _BLOCK):
            block = slice(start, start + _BLOCK)
            near = self._near(lon[block], lat[block], day[block])
            total[block] = _summed(near, lon[block, None], lat[block, None], day[block, None])
        return total

    def chosen(self, which: Array) -> Eddies:
        """Return the eddies at some indices (or where a mask is true)."""
        arrays = {f.name: getattr(self, f.name) for f in fields(self)}
        return Eddies(**{k: v[which] if isinstance(v, np.ndarray) else v for k, v in arrays.items()})

    def _near(self, lon: Array, lat: Array, day: Array) -> Eddies:
        """Eddies that reach into the box round some points during their days."""
        first, last = self.centre(day.min()), self.centre(day.max())
        east, north = metres_per_degree(self.latitude)
        near = (self.birth < day.max()) & (self.death > day.min())
        for points, start, end, metres in ((lon, first[0], last[0], east), (lat, first[1], last[1], north)):
            reach = _REACH * self.radius / metres
            near &= (np.maximum(start, end) > points.min() - reach) & (np.minimum(start, end) < points.max() + reach)
        return self.chosen(near)


def seed(
    values: dict[str, Any], box: Box, days: tuple[float, float], land: Geography, rng: np.random.Generator
) -> Eddies:
    """Throw eddies into the sea at random, refusing those that would come too close to another.

    Parameters
    ----------
    values : dict
        The scenario's `eddies` section.
    box : Box
        Where the centres are at mid-life.
    days : (first, last)
        Days between which the mid-lives lie.
    land : Geography
        An eddy dies when it reaches the mainland's coast.
    rng : numpy.random.Generator
        Source of chance.

    Returns
    -------
    Eddies
        `values["count"]` eddies.

    Raises
    ------
    ValueError
        If there is no room for so many.
    """
    candidates = _candidates(values, box, days, land, rng)
    kept: list[int] = []
    for index in range(len(candidates)):
        if not kept or _clear(candidates.chosen(np.array(kept)), candidates.chosen(np.array([index])), values):
            kept.append(index)
        if len(kept) == values["count"]:
            return candidates.chosen(np.array(kept))
    raise ValueError(f"eddies.count: there is room for only {len(kept)} of {values['count']} eddies")


def _summed(eddies: Eddies, lon: Array, lat: Array, day: Array) -> Array:
    """Sum over eddies (second axis) at points (first axis)."""
    centre_lon, centre_lat = eddies.centre(day)
    east, north = metres_per_degree(eddies.latitude)
    x = (lon - centre_lon) * (east / eddies.radius)
    y = (lat - centre_lat) * (north / eddies.radius)
    return np.asarray((eddies.height(day) * np.exp(-0.5 * (x**2 + y**2))).sum(axis=1))


def _candidates(
    values: dict[str, Any], box: Box, days: tuple[float, float], land: Geography, rng: np.random.Generator
) -> Eddies:
    lon = rng.uniform(box.west, box.east, _ATTEMPTS)
    lat = rng.uniform(box.south, box.north, _ATTEMPTS)
    radius = _radius(lat, values, rng)
    middle = rng.uniform(*days, _ATTEMPTS)
    shortest, longest = values["life_days"]
    half_life = rng.uniform(shortest, longest, _ATTEMPTS) / 2
    amplitude = _amplitude(lat, radius, values, rng)
    east, north = metres_per_degree(lat)
    eastward = -_westward_speed(lat, values) * rng.uniform(0.9, 1.1, _ATTEMPTS) * _SECONDS / east
    northward = rng.normal(0, values["meridional_drift"], _ATTEMPTS) * _SECONDS / north
    eddies = Eddies(
        lon, lat, eastward, northward, amplitude, radius, middle, middle - half_life, middle + half_life,
        values["growth_days"], values["decay_days"],
    )  # fmt: skip
    return _ended_at_coast(eddies, values, land)


def _ended_at_coast(eddies: Eddies, values: dict[str, Any], land: Geography) -> Eddies:
    """Let each eddy die on reaching the coast, and drop those too short-lived or too near the equator."""
    east, _ = metres_per_degree(eddies.latitude)
    shore = land.coastline(eddies.latitude) + _COAST_CLEARANCE * eddies.radius / east
    arrival = eddies.middle + (shore - eddies.longitude) / eddies.eastward_drift
    death = np.minimum(eddies.death, arrival)
    ended = Eddies(**{**eddies.__dict__, "death": death})
    nearest = np.minimum(np.abs(ended.centre(ended.birth)[1]), np.abs(ended.centre(death)[1]))
    lasting = death - eddies.birth > eddies.growth + eddies.decay
    return ended.chosen(lasting & (nearest > values["equatorward_limit"]))


def _radius(lat: Array, values: dict[str, Any], rng: np.random.Generator) -> Array:
    """Radii that shrink away from the equator, metres."""
    smallest, largest = values["radius_km"]
    fraction = np.clip((np.abs(lat) - values["equatorward_limit"]) / 17, 0, 1)
    typical = largest - (largest - 1.25 * smallest) * fraction
    return np.asarray(1e3 * np.clip(typical * rng.uniform(0.72, 1.0, lat.size), smallest, largest))


def _amplitude(lat: Array, radius: Array, values: dict[str, Any], rng: np.random.Generator) -> Array:
    """Signed amplitudes (m): most near the mode, few large; bounded by the Rossby number."""
    smallest, largest = values["amplitude_m"]
    size = smallest + rng.gamma(2.0, values["amplitude_mode_m"] - smallest, lat.size)
    f_radius = coriolis_parameter(lat) * radius
    bound = values["rossby_number_limit"] * f_radius**2 * np.exp(0.5) / gravity(lat)
    bounded = np.clip(size, smallest, np.minimum(largest, bound))
    return np.asarray(bounded * rng.choice([-1.0, 1.0], lat.size))


def _westward_speed(lat: Array, values: dict[str, Any]) -> Array:
    """Invented speed (m s-1), shaped like that of long baroclinic Rossby waves but bounded."""
    slow, fast = values["westward_speed"]
    return np.asarray(slow + (fast - slow) * np.exp(-(((np.abs(lat) - 5) / 7) ** 2)))


def _clear(eddies: Eddies, other: Eddies, values: dict[str, Any]) -> bool:
    """Whether an eddy stays clear of all others while both live (both move in straight lines)."""
    east, north = metres_per_degree(other.latitude)
    start = np.maximum(eddies.birth, other.birth)
    end = np.minimum(eddies.death, other.death)
    (lon, lat), (other_lon, other_lat) = eddies.centre(start), other.centre(start)
    x, y = (lon - other_lon) * east, (lat - other_lat) * north
    u = (eddies.eastward_drift - other.eastward_drift) * east
    v = (eddies.northward_drift - other.northward_drift) * north
    closest = np.clip(-(x * u + y * v) / (u**2 + v**2 + 1e-9), 0, np.maximum(end - start, 0))
    distance = np.hypot(x + u * closest, y + v * closest)
    alike = eddies.amplitude * other.amplitude > 0
    limit = np.where(alike, values["separation"]["alike"], values["separation"]["opposite"])
    apart = distance > limit * (eddies.radius + other.radius)
    return bool(np.all(apart | (end <= start)))
