"""Where an eddy is expected, and how seeing it changes what is expected next."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from setdrift.numerics.earth import beta_parameter, coriolis_parameter, metres_per_degree
from setdrift.numerics.eddy_states import TrajectoryState

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_SECONDS_A_DAY = 86400.0


@dataclass(frozen=True)
class TrackingSettings:
    """How eddies are linked. The values are common practice, no source, checked on simulated eddies.

    Attributes
    ----------
    gate : float
        m; an eddy farther than this from where a trajectory is expected is never linked to it.
    gap_days : int
        Days a trajectory may go unseen and still be resumed.
    position_gain, velocity_gain : float
        Share of the difference between seen and expected position that corrects the position and, per day, the
        drift (the alpha and beta of an alpha-beta filter).
    size_gain : float
        Share of a new amplitude and radius (of their logarithms) in the trajectory's.
    relaxation_days : float
        Days in which a trajectory's own drift fades into that of long Rossby waves.
    wave_speed : float
        m s-1; of internal gravity waves of the first baroclinic mode.
    distance_scale : float
        m; distance at which the cost of distance begins to rise, after one day; with the root of the days.
    amplitude_scale, radius_scale : float
        The same for the logarithm of the ratio of amplitudes and of radii.
    unlinked_cost : float
        Cost of leaving a trajectory without an eddy: no dearer link is made.
    """

    gate: float = 150e3
    gap_days: int = 5
    position_gain: float = 0.6
    velocity_gain: float = 0.1
    size_gain: float = 0.3
    relaxation_days: float = 20.0
    wave_speed: float = 2.5
    distance_scale: float = 15e3
    amplitude_scale: float = 0.3
    radius_scale: float = 0.3
    unlinked_cost: float = 4.5


def long_rossby_drift(latitude: ArrayLike, wave_speed: float) -> FloatArray:
    """Eastward (negative: westward) drift of long first-mode Rossby waves.

    Minus beta c^2 / f^2; near the equator no faster than the first meridional mode there, c / 3.

    Parameters
    ----------
    latitude : array
        Degrees north.
    wave_speed : float
        c, of internal gravity waves of the first baroclinic mode, m s-1.

    Returns
    -------
    array
        m s-1; the shape of `latitude`.

    References
    ----------
    Gill (1982), Atmosphere-Ocean Dynamics, sections 11.8 and 12.3 (from memory).
    """
    beta = beta_parameter(latitude)
    floor = 3.0 * beta * wave_speed
    drift: FloatArray = -beta * wave_speed**2 / np.maximum(coriolis_parameter(latitude) ** 2, floor)
    return drift


def expect(state: TrajectoryState, day: int, settings: TrackingSettings) -> TrajectoryState:
    """Carry trajectories on to a day; their own drift fades into that of long Rossby waves on the way.

    Parameters
    ----------
    state : TrajectoryState
        Each trajectory as on its last day.
    day : int
        Days since 1970-01-01.
    settings : TrackingSettings
        How fast the drift fades, and the waves' speed.

    Returns
    -------
    TrajectoryState
        With the positions and drifts expected on the day; the last days are left as they are.
    """
    days = (day - state.last_day).astype(np.float64)
    wave = long_rossby_drift(state.latitude, settings.wave_speed)
    fade = np.exp(-days / settings.relaxation_days)
    own_time = _SECONDS_A_DAY * settings.relaxation_days * (1.0 - fade)
    own_drift = state.eastward_drift - wave
    east = wave * days * _SECONDS_A_DAY + own_drift * own_time
    north = state.northward_drift * own_time
    return replace(
        _moved(state, east, north),
        eastward_drift=wave + own_drift * fade,
        northward_drift=state.northward_drift * fade,
    )


def _moved(state: TrajectoryState, east: FloatArray, north: FloatArray) -> TrajectoryState:
    """Displace trajectories by metres."""
    east_metres, north_metres = metres_per_degree(state.latitude)
    return replace(
        state,
        longitude=state.longitude + east / np.maximum(east_metres, 1.0),
        latitude=np.clip(state.latitude + north / north_metres, -90.0, 90.0),
    )


def correct(
    expected: TrajectoryState, seen: TrajectoryState, days: IntArray, settings: TrackingSettings
) -> TrajectoryState:
    """Weigh expected trajectories and what was seen of them by the gains of an alpha-beta filter.

    Parameters
    ----------
    expected, seen : TrajectoryState
        The same trajectories, as expected and as seen.
    days : (n,) int array
        Since each trajectory was last seen.
    settings : TrackingSettings
        The gains.

    Returns
    -------
    TrajectoryState
        As on the day they were seen.

    References
    ----------
    Kalata (1984), The tracking index: a generalized parameter for alpha-beta and alpha-beta-gamma target trackers
    (from memory).
    """
    east_metres, north_metres = metres_per_degree(expected.latitude)
    east = ((seen.longitude - expected.longitude + 180.0) % 360.0 - 180.0) * east_metres
    north = (seen.latitude - expected.latitude) * north_metres
    pace = settings.velocity_gain / (days * _SECONDS_A_DAY)
    keep, gain = 1.0 - settings.position_gain, settings.size_gain
    return replace(
        _moved(seen, -keep * east, -keep * north),
        identifier=expected.identifier,
        first_day=expected.first_day,
        eastward_drift=expected.eastward_drift + pace * east,
        northward_drift=expected.northward_drift + pace * north,
        amplitude=expected.amplitude * (seen.amplitude / expected.amplitude) ** gain,
        radius=expected.radius * (seen.radius / expected.radius) ** gain,
    )
