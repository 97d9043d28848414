"""Land of the invented sea: a western mainland and an arc of islands, known anywhere by formula."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from synthetic_tracks.earth import DEGREE, Array, metres_per_degree

_WAVES_OF_THE_SMOOTH_COAST = 2


@dataclass(frozen=True)
class Island:
    """An island: an ellipse with an uneven shore; position and axis in degrees, half sizes in km."""

    longitude: float
    latitude: float
    half_length: float
    half_width: float
    axis: float

    def offshore(self, lon: Array, lat: Array) -> Array:
        """Distance from the shore in metres (approximate), negative on the island."""
        east, north = metres_per_degree(np.asarray(self.latitude))
        x, y = (lon - self.longitude) * east, (lat - self.latitude) * north
        cosine, sine = np.cos(self.axis * DEGREE), np.sin(self.axis * DEGREE)
        along = (x * cosine + y * sine) / (1e3 * self.half_length)
        across = (y * cosine - x * sine) / (1e3 * self.half_width)
        angle = np.arctan2(across, along)
        shore = 1 + 0.10 * np.cos(3 * angle + self.latitude) + 0.05 * np.cos(5 * angle + self.longitude)
        return np.asarray(1e3 * np.sqrt(self.half_length * self.half_width) * (np.hypot(along, across) - shore))


@dataclass(frozen=True)
class Geography:
    """The mainland's coast (sine waves in latitude about a meridian) and the islands."""

    coast_longitude: float
    coast_waves: list[list[float]]
    islands: tuple[Island, ...]

    def coastline(self, lat: Array, *, smooth: bool = False) -> Array:
        """Longitude of the mainland's coast, degrees; `smooth` leaves out capes and bays."""
        waves = self.coast_waves[:_WAVES_OF_THE_SMOOTH_COAST] if smooth else self.coast_waves
        wiggle = sum(size * np.sin(2 * np.pi * lat / period + phase * DEGREE) for size, period, phase in waves)
        return np.asarray(self.coast_longitude + wiggle)

    def from_mainland(self, lon: Array, lat: Array) -> Array:
        """Distance in metres east of the mainland's smooth coast, negative inland.

        Measured along the parallel and shortened by the coast's slant, which is close to the shortest
        distance within the width of the boundary current.

        Returns
        -------
        (...) array
            Metres.
        """
        east, north = metres_per_degree(lat)
        ahead, behind = (self.coastline(lat + step, smooth=True) for step in (0.01, -0.01))
        slant = (ahead - behind) / 0.02 * east / north
        return (lon - self.coastline(lat, smooth=True)) * east / np.hypot(1, slant)

    def is_land(self, lon: Array, lat: Array) -> NDArray[np.bool_]:
        """Whether a place is land."""
        land = np.asarray(lon < self.coastline(lat))
        for island in self.islands:
            land = land | (island.offshore(lon, lat) < 0)
        return land


def build(values: dict[str, Any]) -> Geography:
    """Build the geography of a scenario's `geography` section."""
    islands = tuple(Island(**island) for island in values["islands"])
    return Geography(values["coast_longitude"], values["coast_waves"], islands)
