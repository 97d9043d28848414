"""Repeat orbits against an independent propagator (SGP4) and against elementary geometry (check 13)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest
from pyproj import Transformer
from scipy.optimize import brentq
from sgp4.api import WGS84, Satrec

from synthetic_tracks.earth import EQUATORIAL_RADIUS, ROTATION_RATE
from synthetic_tracks.orbits import GroundTrack, RepeatOrbit
from synthetic_tracks.sampling import orbit_of
from synthetic_tracks.scenario import load

SGP4 = pytest.mark.source("Hoots and Roehrich (1980), Spacetrack Report 3, SGP4, as in the package sgp4; WGS 84")
GEOMETRY = pytest.mark.source("A repeat track crosses the equator northward every 360 degrees / revolutions")
KM_PER_DEGREE = 111.3195
MIDNIGHT = 2462096.5  # any epoch will do: no drag, no Sun, no Moon

orbits = pytest.mark.parametrize("orbit", [orbit_of(a) for a in load().altimeters], ids=lambda o: str(o.inclination))


def satellite(orbit: RepeatOrbit) -> Satrec:
    """SGP4 satellite with the orbit's mean semi-major axis, node and argument of latitude 0, no drag.

    SGP4 is given Kozai's mean motion and derives Brouwer's; the former is sought that gives our axis.
    """

    def with_motion(radians_a_minute: float) -> Satrec:
        satrec = Satrec()
        tilt = np.radians(orbit.inclination)
        satrec.sgp4init(WGS84, "i", 1, 0.0, 0, 0, 0, 1e-6, 0.0, tilt, 0.0, radians_a_minute, 0.0)
        satrec.jdsatepoch, satrec.jdsatepochF = MIDNIGHT, 0.0
        return satrec

    def axis_error(radians_a_minute: float) -> float:
        return with_motion(radians_a_minute).a * EQUATORIAL_RADIUS - orbit.semi_major_axis

    return with_motion(brentq(axis_error, 0.04, 0.08, xtol=1e-16))


def state(satrec: Satrec, seconds: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Position and velocity (km, km s-1) in SGP4's inertial frame."""
    errors, position, velocity = satrec.sgp4_array(np.full(seconds.size, MIDNIGHT), seconds / 86400)
    assert not errors.any()
    return position, velocity


@dataclass
class Crossings:
    """Northward crossings of the equator: seconds, node and longitude on the Earth (radians)."""

    seconds: np.ndarray
    node: np.ndarray
    longitude: np.ndarray


def crossings(orbit: RepeatOrbit) -> Crossings:
    """All northward crossings of one repeat, by Newton's method on SGP4's positions."""
    satrec = satellite(orbit)
    seconds = np.arange(orbit.revolutions + 1) * orbit.nodal_period
    for _ in range(6):
        position, velocity = state(satrec, seconds)
        seconds = seconds - position[:, 2] / velocity[:, 2]
    position, velocity = state(satrec, seconds)
    assert np.abs(position[:, 2]).max() < 1e-3  # a metre
    normal = np.cross(position, velocity)
    node = np.unwrap(np.arctan2(normal[:, 0], -normal[:, 1]))
    longitude = np.arctan2(position[:, 1], position[:, 0]) - ROTATION_RATE * seconds
    return Crossings(seconds, node, longitude)


def away(longitude_difference: float) -> float:
    """Size of a difference of longitude, degrees, the short way round."""
    return abs((longitude_difference + 180) % 360 - 180)


def offset(track: GroundTrack, lon: np.ndarray, lat: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Kilometres east and north from a track to other points near it."""
    east = ((lon - track.longitude + 180) % 360 - 180) * np.cos(np.radians(lat))
    return east * KM_PER_DEGREE, (lat - track.latitude) * KM_PER_DEGREE


@SGP4
@orbits
def test_nodal_period(orbit):
    # 0.1 s: ours is of first order in J2; the terms left out are 1e-6 of 6000 s (measured: at most 0.013 s)
    found = crossings(orbit).seconds
    assert (found[-1] - found[0]) / orbit.revolutions == pytest.approx(orbit.nodal_period, abs=0.1)


@SGP4
@orbits
def test_node_rate(orbit):
    # 0.01 degree a day, for the same reason (measured: at most 0.004)
    found = crossings(orbit)
    rate = np.degrees(np.polyfit(found.seconds, found.node, 1)[0]) * 86400
    assert rate == pytest.approx(np.degrees(orbit.node_rate) * 86400, abs=0.01)


@SGP4
@orbits
def test_track_repeats_after_its_nodal_days(orbit):
    # 15 km: 0.004 degree a day of node over 34 days (measured: at most 9 km); neighbouring tracks are 80 km apart
    longitude = np.degrees(crossings(orbit).longitude)
    assert away(longitude[-1] - longitude[0]) * KM_PER_DEGREE < 15


@SGP4
@orbits
def test_track_of_a_day(orbit):
    # SGP4's periodic terms, which ours leaves out. 30 km along the track: J3 gives an orbit of eccentricity 0.001,
    # 4 e a = 29 km between the node and the opposite side (measured: 23 to 28); 4 km across it (measured: 2.4)
    start = crossings(orbit)
    seconds = np.arange(0, 86400, 60.0)
    position, _ = state(satellite(orbit), start.seconds[0] + seconds)
    turned = np.arctan2(position[:, 1], position[:, 0]) - ROTATION_RATE * (start.seconds[0] + seconds)
    turned += np.radians(orbit.ascending_node) - start.longitude[0]
    away_from_axis = np.hypot(position[:, 0], position[:, 1])
    geodetic = Transformer.from_crs("EPSG:4978", "EPSG:4979", always_xy=True)
    x, y = away_from_axis * np.cos(turned), away_from_axis * np.sin(turned)
    lon, lat, _ = geodetic.transform(1e3 * x, 1e3 * y, 1e3 * position[:, 2])
    track, ahead = orbit.ground_track(seconds), orbit.ground_track(seconds + 1)
    east, north = offset(track, lon, lat)
    forward = np.array(offset(track, ahead.longitude, ahead.latitude))
    across = (east * forward[1] - north * forward[0]) / np.hypot(*forward)
    assert np.abs(across).max() < 4
    assert np.hypot(east, north).max() < 30


@SGP4
@orbits
def test_inclination_limits_the_latitude(orbit):
    # 0.02 degree: the short-period change of inclination due to J2 (measured: 0.013)
    position, _ = state(satellite(orbit), np.arange(0, 86400, 10.0))
    highest = np.degrees(np.arcsin(position[:, 2] / np.linalg.norm(position, axis=1))).max()
    limit = min(orbit.inclination, 180 - orbit.inclination)
    assert highest == pytest.approx(limit, abs=0.02)
    # ours: geodetic latitude, which exceeds the geocentric one by at most 0.2 degree
    ours = orbit.ground_track(np.arange(0, 86400, 10.0)).latitude.max()
    assert limit - 0.001 < ours < limit + 0.2


@GEOMETRY
@orbits
def test_spacing_at_the_equator(orbit):
    # 1 km, of 82 to 306 km
    seconds = np.arange(orbit.revolutions) * orbit.nodal_period
    nodes = np.sort(orbit.ground_track(seconds).longitude)
    spacing = np.diff(nodes, append=nodes[0] + 360) * KM_PER_DEGREE
    np.testing.assert_allclose(spacing, 360 / orbit.revolutions * KM_PER_DEGREE, atol=1)


@GEOMETRY
@orbits
def test_own_track_closes(orbit):
    # 1 m: exact but for rounding
    seconds = np.linspace(0, 3 * orbit.nodal_period, 200)
    first, again = (orbit.ground_track(seconds + wait) for wait in (0, orbit.repeat_period))
    assert np.abs((first.longitude - again.longitude + 180) % 360 - 180).max() * KM_PER_DEGREE < 1e-3
    np.testing.assert_allclose(first.latitude, again.latitude, atol=1e-5)
    np.testing.assert_array_equal(first.half_revolution + 2 * orbit.revolutions, again.half_revolution)


@GEOMETRY
def test_repeats_have_no_common_divisor():
    for altimeter in load().altimeters:
        assert np.gcd(altimeter.revolutions, altimeter.nodal_days) == 1
