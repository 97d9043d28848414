"""The mean circulation: zonal currents, gyres and a western boundary current that joins them.

Away from the coast the zonal currents U(latitude) are prescribed, and sea level follows from geostrophic balance,
Z = -integral of f U / g from the equator: Z and its slope vanish at the equator, so -g/f dZ/dy is U there too.
Toward the coast everything is multiplied by G(d) = 1 - (1 + d/w) exp(-d/w): sea level is constant along the
coast, no current crosses it, and currents turn into a jet centred a distance w from it.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from scipy.interpolate import CubicSpline

from synthetic_tracks.earth import Array, coriolis_parameter, gravity, metres_per_degree
from synthetic_tracks.geography import Geography

_LATITUDES = np.linspace(-40, 40, 8001)
_STEP = 0.01


@dataclass(frozen=True)
class Circulation:
    """Mean dynamic topography and its currents; see the module's text."""

    zonal_currents: list[list[float]]
    gyres: list[list[float]]
    boundary_scale: float
    land: Geography
    zonal_topography: CubicSpline
    zonal_transport: CubicSpline

    def topography(self, lon: Array, lat: Array) -> Array:
        """Mean dynamic topography, m."""
        growth = self._growth(self.land.from_mainland(lon, lat))
        return np.asarray(self.zonal_topography(lat)) * growth + self.gyre_topography(lon, lat)

    def gyre_topography(self, lon: Array, lat: Array) -> Array:
        """Part of the mean dynamic topography due to the gyres, m; flat at the equator."""
        total = np.zeros(np.broadcast(lon, lat).shape)
        for height, centre_lon, centre_lat, wide, high in self.gyres:
            total += height * np.exp(-0.5 * (((lon - centre_lon) / wide) ** 2 + ((lat - centre_lat) / high) ** 2))
        flat = -np.expm1(-((lat / 4.0) ** 4))
        return total * flat * self._growth(self.land.from_mainland(lon, lat))

    def zonal_velocity(self, lat: Array) -> Array:
        """Prescribed zonal current far from the coast, m s-1."""
        return _zonal_velocity(self.zonal_currents, lat)

    def velocity(self, lon: Array, lat: Array) -> tuple[Array, Array]:
        """Eastward and northward velocity of the zonal currents and their boundary current, m s-1.

        Finite at the equator: Z/f is a smooth function there. The gyres' part is geostrophic and is left to
        the caller.

        Returns
        -------
        u, v : (...) arrays
            Metres per second.
        """
        d, dx, dy = self._distance_and_slopes(lon, lat)
        boundary = np.asarray(self.zonal_transport(lat)) * self._growth_rate(d)
        return self.zonal_velocity(lat) * self._growth(d) - boundary * dy, boundary * dx

    def _growth(self, d: Array) -> Array:
        s = np.maximum(d, 0) / self.boundary_scale
        return 1 - (1 + s) * np.exp(-s)

    def _growth_rate(self, d: Array) -> Array:
        s = np.maximum(d, 0) / self.boundary_scale
        return s * np.exp(-s) / self.boundary_scale

    def _distance_and_slopes(self, lon: Array, lat: Array) -> tuple[Array, Array, Array]:
        east, north = metres_per_degree(lat)
        away = self.land.from_mainland
        dx = (away(lon + _STEP, lat) - away(lon - _STEP, lat)) / (2 * _STEP * east)
        dy = (away(lon, lat + _STEP) - away(lon, lat - _STEP)) / (2 * _STEP * north)
        return away(lon, lat), dx, dy


def build(values: dict[str, Any], land: Geography) -> Circulation:
    """Build the circulation of a scenario's `mean` section."""
    currents = values["zonal_currents"]
    f, g = coriolis_parameter(_LATITUDES), gravity(_LATITUDES)
    slope = -f * _zonal_velocity(currents, _LATITUDES) * metres_per_degree(_LATITUDES)[1] / g
    integral = CubicSpline(_LATITUDES, slope).antiderivative()
    topography = integral(_LATITUDES) - integral(0.0)
    off_equator = np.abs(_LATITUDES) > 1e-6
    transport = np.divide(g * topography, f, out=np.zeros_like(f), where=off_equator)
    return Circulation(
        currents,
        values["gyres"],
        1e3 * values["boundary_scale_km"],
        land,
        CubicSpline(_LATITUDES, topography),
        CubicSpline(_LATITUDES, transport),
    )


def _zonal_velocity(currents: list[list[float]], lat: Array) -> Array:
    return np.asarray(sum(speed * np.exp(-0.5 * ((lat - centre) / width) ** 2) for speed, centre, width in currents))
