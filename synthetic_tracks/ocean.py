"""The moving ocean: sea level and velocity anywhere, at any time, by formula."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from synthetic_tracks import circulation, geography
from synthetic_tracks.circulation import Circulation
from synthetic_tracks.earth import Array, coriolis_parameter, gravity, metres_per_degree, smooth_step
from synthetic_tracks.eddies import Eddies, seed
from synthetic_tracks.geography import Geography
from synthetic_tracks.scenario import Scenario, day_number
from synthetic_tracks.waves import Background, KelvinWave, RossbyWave, random_background

_STEP = 0.01
"""Half step of the derivative, degrees: an error of 1e-4 of the slope at the smallest eddy."""
_EDGE_DEGREES = 5.0
_EDGE_DAYS = 40.0
_NO_ROTATION = 1.0
"""Latitude within which the fields differentiated here are flat and f is too small to divide by."""


@dataclass(frozen=True)
class Ocean:
    """The sum of eddies, background, equatorial waves and mean circulation."""

    land: Geography
    eddies: Eddies
    background: Background
    kelvin: KelvinWave
    rossby: RossbyWave
    mean: Circulation
    eddy_fade: tuple[float, float]
    background_fade: tuple[float, float]

    def turbulence(self, lon: Array, lat: Array, day: Array) -> Array:
        """Sea level anomaly of eddies and background (m), faded out toward the equator."""
        eddies = _fade(lat, self.eddy_fade) * self.eddies.sea_level(lon, lat, day)
        return eddies + _fade(lat, self.background_fade) * self.background.sea_level(lon, lat, day)

    def sea_level_anomaly(self, lon: Array, lat: Array, day: Array) -> Array:
        """Sea level anomaly (m) at points: longitude, latitude (degrees) and days since 2000-01-01, (n,) arrays."""
        waves = self.kelvin.sea_level(lon, lat, day) + self.rossby.sea_level(lon, lat, day)
        return self.turbulence(lon, lat, day) + waves

    def velocity_anomaly(self, lon: Array, lat: Array, day: Array) -> tuple[Array, Array]:
        """Eastward and northward velocity (m s-1) that belong to the sea level anomaly, (n,) arrays."""
        u, v = geostrophic(lambda x, y: self.turbulence(x, y, day), lon, lat)
        for wave in (self.kelvin, self.rossby):
            wave_u, wave_v = wave.velocity(lon, lat, day)
            u, v = u + wave_u, v + wave_v
        return u, v

    def mean_dynamic_topography(self, lon: Array, lat: Array) -> Array:
        """Mean dynamic topography, m."""
        return self.mean.topography(lon, lat)

    def mean_velocity(self, lon: Array, lat: Array) -> tuple[Array, Array]:
        """Eastward and northward velocity (m s-1) that belong to the mean dynamic topography."""
        u, v = self.mean.velocity(lon, lat)
        gyre_u, gyre_v = geostrophic(self.mean.gyre_topography, lon, lat)
        return u + gyre_u, v + gyre_v


def geostrophic(field: Callable[[Array, Array], Array], lon: Array, lat: Array) -> tuple[Array, Array]:
    """Geostrophic velocity of a sea level that is flat at the equator.

    Parameters
    ----------
    field : callable
        Sea level (m) as a function of longitude and latitude (degrees).
    lon, lat : (n,) arrays
        Degrees.

    Returns
    -------
    u, v : (n,) arrays
        Eastward and northward velocity, m s-1; zero within one degree of the equator.
    """
    east, north = metres_per_degree(lat)
    slope_x = (field(lon + _STEP, lat) - field(lon - _STEP, lat)) / (2 * _STEP * east)
    slope_y = (field(lon, lat + _STEP) - field(lon, lat - _STEP)) / (2 * _STEP * north)
    turning = np.abs(lat) > _NO_ROTATION
    ratio = np.divide(gravity(lat), coriolis_parameter(lat), out=np.zeros_like(lat), where=turning)
    return -ratio * slope_y, ratio * slope_x


def build(scenario: Scenario) -> Ocean:
    """Build the ocean of a scenario; the same scenario always gives the same ocean."""
    land = geography.build(scenario.geography)
    eddy_rng, background_rng = (np.random.default_rng([scenario.seed, n]) for n in (1, 2))
    days = scenario.observed_days
    span = day_number(days[0]) - _EDGE_DAYS, day_number(days[-1]) + _EDGE_DAYS
    waves = scenario.equatorial_waves
    return Ocean(
        land,
        seed(scenario.eddies, scenario.domain.widened(_EDGE_DEGREES), span, land, eddy_rng),
        random_background(scenario.background, scenario.box.north / 2, background_rng),
        KelvinWave(*_wave(waves, "kelvin")),
        RossbyWave(*_wave(waves, "rossby")),
        circulation.build(scenario.mean, land),
        (scenario.fade["eddies"][0], scenario.fade["eddies"][1]),
        (scenario.fade["background"][0], scenario.fade["background"][1]),
    )


def _fade(lat: Array, limits: tuple[float, float]) -> Array:
    """Rise from 0 to 1 between two latitudes, in both hemispheres."""
    zero, one = limits
    return smooth_step((np.abs(lat) - zero) / (one - zero))


def _wave(values: dict[str, Any], name: str) -> tuple[float, float, float, float]:
    wave = values[name]
    return values["phase_speed"], wave["amplitude_m"], 1e3 * wave["wavelength_km"], wave["phase"]
