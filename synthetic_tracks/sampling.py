"""Sampling: what an altimeter measures of the moving ocean, errors and accidents included."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from datetime import date
from typing import Any

import numpy as np
from numpy.typing import NDArray

from synthetic_tracks.earth import Array
from synthetic_tracks.ocean import Ocean
from synthetic_tracks.orbits import GroundTrack, RepeatOrbit
from synthetic_tracks.scenario import Altimeter, Box, Scenario, day_number

Flags = NDArray[np.bool_]
Counts = NDArray[np.int64]

_EPOCH = day_number(date(2031, 1, 1))
"""Day on which every altimeter stands at its ascending node and begins its first cycle."""
_SECONDS = 86400.0
_SINES = 16
_REMARKED_SHARE = 0.04
_WILD_M = (0.8, 6.0)


@dataclass(frozen=True)
class Observations:
    """One day of one altimeter, in order of time; one value per point. Degrees, metres, days since 2000-01-01."""

    day: Array
    longitude: Array
    latitude: Array
    cycle: Counts
    pass_number: Counts
    truth: Array
    """Sea level anomaly without error."""
    noise: Array
    long_wave: Array
    spike: Array
    """Zero nearly everywhere."""
    wild: Array
    """What the instrument returns in place of sea level over land."""
    land: Flags
    flagged: Flags
    """Points at sea that the altimeter's own processing marks as bad: some of the spikes."""
    remarked: Flags
    """Points marked with a condition that does no harm."""
    bias: float

    @property
    def measured(self) -> Array:
        """Sea level anomaly as measured, m."""
        at_sea = self.truth + self.bias + self.long_wave + self.noise + self.spike
        return np.where(self.land, self.wild, at_sea)

    def chosen(self, which: Flags | Counts) -> Observations:
        """Return the points at some indices (or where a mask is true)."""
        arrays = [f.name for f in fields(self) if f.name != "bias"]
        return replace(self, **{name: getattr(self, name)[which] for name in arrays})


def orbit_of(altimeter: Altimeter) -> RepeatOrbit:
    """Orbit of an altimeter."""
    return RepeatOrbit(altimeter.inclination, altimeter.revolutions, altimeter.nodal_days, altimeter.ascending_node)


def observe(scenario: Scenario, ocean: Ocean, altimeter: Altimeter, day: date) -> Observations:
    """Sample the ocean along one day of an altimeter's track.

    Parameters
    ----------
    scenario : Scenario
        Gives the domain, the error settings and the seed.
    ocean : Ocean
        The moving ocean.
    altimeter : Altimeter
        Which altimeter.
    day : date
        Which day (UTC). A pass over midnight is shared by two days and has the same long-wave error in both.

    Returns
    -------
    Observations
        Points inside the scenario's domain that were not lost.
    """
    number = [a.name for a in scenario.altimeters].index(altimeter.name)
    rng = np.random.default_rng([scenario.seed, 10 + number, int(day_number(day))])
    orbit = orbit_of(altimeter)
    time, track = _points_of_day(orbit, scenario.domain, day)
    seeds = [scenario.seed, 20 + number]
    long_wave, kept = _pass_errors(track, seeds, scenario)
    pass_number, cycle = orbit.pass_and_cycle(track.half_revolution)
    lon, lat, count = track.longitude, track.latitude, time.size
    spike = _spikes(count, scenario.errors, rng)
    observations = Observations(
        time, lon, lat, cycle, pass_number,
        truth=ocean.sea_level_anomaly(lon, lat, time),
        noise=rng.normal(0, altimeter.noise_m, count),
        long_wave=altimeter.long_wave_m * long_wave,
        spike=spike,
        wild=rng.uniform(*_WILD_M, count) * rng.choice([-1.0, 1.0], count),
        land=ocean.land.is_land(lon, lat),
        flagged=(spike != 0) & (rng.random(count) < altimeter.flagged_share),
        remarked=rng.random(count) < _REMARKED_SHARE,
        bias=altimeter.bias_m,
    )  # fmt: skip
    return observations.chosen(kept)


def _points_of_day(orbit: RepeatOrbit, domain: Box, day: date) -> tuple[Array, GroundTrack]:
    """Whole seconds of a day at which the satellite is over the domain: days since 2000-01-01, and points."""
    seconds = (day_number(day) - _EPOCH) * _SECONDS + np.arange(_SECONDS)
    track = orbit.ground_track(seconds)
    inside = (track.longitude >= domain.west) & (track.longitude <= domain.east)
    inside &= (track.latitude >= domain.south) & (track.latitude <= domain.north)
    values = (getattr(track, f.name)[inside] for f in fields(track))
    return _EPOCH + seconds[inside] / _SECONDS, GroundTrack(*values)


def _pass_errors(track: GroundTrack, seeds: list[int], scenario: Scenario) -> tuple[Array, Flags]:
    """Long-wave error of unit variance, and which points were not lost, pass by pass.

    Chance depends on the pass alone, whichever day its points fall on.

    Returns
    -------
    long_wave, kept : (n,) arrays
        Error in standard deviations; true where the point was received.
    """
    long_wave = np.zeros(track.distance.size)
    kept = np.ones(track.distance.size, dtype=bool)
    length = 1e3 * scenario.errors["long_wave_km"]
    for half_revolution in np.unique(track.half_revolution):
        rng = np.random.default_rng([*seeds, int(half_revolution)])
        here = track.half_revolution == half_revolution
        long_wave[here] = _smooth_function(track.distance[here], length, rng)
        kept[here] = _received(track.latitude[here], scenario, rng)
    return long_wave, kept


def _smooth_function(distance: Array, length: float, rng: np.random.Generator) -> Array:
    """One draw of a smooth random function of unit variance and correlation exp(-s^2 / 2 length^2).

    Random sines whose wavenumbers follow the spectrum.

    Returns
    -------
    (n,) array
        One value per distance.

    References
    ----------
    Rahimi and Recht (2007), Advances in Neural Information Processing Systems 20, algorithm 1 (from memory).
    """
    wavenumber = rng.normal(0, 1 / length, _SINES)
    phase = rng.uniform(0, 2 * np.pi, _SINES)
    size = rng.standard_normal(_SINES)
    return np.asarray(np.sqrt(2 / _SINES) * np.cos(np.outer(distance, wavenumber) + phase) @ size)


def _received(lat: Array, scenario: Scenario, rng: np.random.Generator) -> Flags:
    """Points not lost to a missing stretch or to the pass ending early, both placed by latitude."""
    settings, domain = scenario.errors, scenario.domain
    gap, interrupted = rng.random(2) < (settings["gap_probability"], settings["interruption_probability"])
    gap_lat, end_lat = rng.uniform(domain.south, domain.north, 2)
    half_gap = rng.uniform(*settings["gap_seconds"]) / 2
    seconds = np.arange(lat.size)
    kept = np.ones(lat.size, dtype=bool)
    if gap:
        kept &= np.abs(seconds - np.abs(lat - gap_lat).argmin()) > half_gap
    if interrupted:
        kept &= seconds < np.abs(lat - end_lat).argmin()
    return kept


def _spikes(count: int, settings: dict[str, Any], rng: np.random.Generator) -> Array:
    """Rare large errors, alone or two in a row."""
    starts = rng.random(count) < settings["spike_share"] / 1.5
    followed = starts & (rng.random(count) < 0.5)
    hit = starts | np.concatenate(([False], followed[:-1]))[:count]
    smallest, largest = settings["spike_m"]
    return np.asarray(hit * rng.uniform(smallest, largest, count) * rng.choice([-1.0, 1.0], count))
