"""Eddies linked from day to day: a trajectory is one eddy as long as it is seen.

Each trajectory carries a state: where it is, how it drifts, how big it is. A new day's eddies are compared with
the positions the trajectories are expected at, and given to them so that the sum of the costs is least. What
is left over begins new trajectories. A day is a pure function of the state before it, so that going back to a
kept state and on again gives the same trajectories.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from setdrift.numerics.eddy_drift import TrackingSettings, correct, expect, long_rossby_drift
from setdrift.numerics.eddy_links import Pairs, cheapest_links, nearby_pairs
from setdrift.numerics.eddy_states import (
    TrajectoryState,
    arrays_to_state,
    first_identifiers,
    join,
    no_trajectories,
    select,
    state_to_arrays,
)

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

__all__ = [
    "TrackingSettings",
    "TrajectoryState",
    "advance",
    "arrays_to_state",
    "no_trajectories",
    "state_to_arrays",
]


def advance(
    state: TrajectoryState,
    day: int,
    longitude: ArrayLike,
    latitude: ArrayLike,
    polarity: ArrayLike,
    amplitude: ArrayLike,
    equal_area_radius: ArrayLike,
    settings: TrackingSettings,
) -> tuple[TrajectoryState, IntArray]:
    """Link the eddies of one more day.

    Parameters
    ----------
    state : TrajectoryState
        After the day before; left as it is.
    day : int
        Days since 1970-01-01, later than any day in the state.
    longitude, latitude : (n,) array
        Of the day's eddies, degrees; the order of the eddies does not matter.
    polarity : (n,) array
        1 anticyclonic, -1 cyclonic.
    amplitude, equal_area_radius : (n,) array
        m.
    settings : TrackingSettings
        How eddies are linked.

    Returns
    -------
    state : TrajectoryState
        After the day.
    identifier : (n,) int64 array
        Of the trajectory to which each eddy belongs.

    Raises
    ------
    ValueError
        If the day is not later than the state's, or an array has a wrong shape or value.
    """
    if len(state) and day <= state.last_day.max():
        raise ValueError(f"day must be later than {state.last_day.max()}, the last one in the state, not {day}")
    columns = _checked(longitude, latitude, polarity, amplitude, equal_area_radius)
    order = np.lexsort(columns)
    seen = _begin(day, columns[:, order], settings.wave_speed)
    live = select(state, day - state.last_day <= settings.gap_days + 1)
    expected = expect(live, day, settings)
    partner = cheapest_links(_link_costs(expected, seen, settings), len(live), len(seen), settings.unlinked_cost)
    linked, found = np.flatnonzero(partner >= 0), partner[partner >= 0]
    born = np.setdiff1d(np.arange(len(seen)), found)
    after = join(
        select(live, partner < 0),
        correct(select(expected, linked), select(seen, found), day - live.last_day[linked], settings),
        select(seen, born),
    )
    sorted_identifier = seen.identifier.copy()
    sorted_identifier[found] = live.identifier[linked]
    identifier = np.empty_like(sorted_identifier)
    identifier[order] = sorted_identifier
    return select(after, np.argsort(after.identifier)), identifier


def _checked(
    longitude: ArrayLike, latitude: ArrayLike, polarity: ArrayLike, amplitude: ArrayLike, radius: ArrayLike
) -> FloatArray:
    """Eddies' columns (5, n), in the order in which they sort: radius, amplitude, polarity, longitude, latitude."""
    named = {
        "equal_area_radius": radius,
        "amplitude": amplitude,
        "polarity": polarity,
        "longitude": longitude,
        "latitude": latitude,
    }
    columns = {name: np.asarray(column, dtype=np.float64) for name, column in named.items()}
    for name, column in columns.items():
        if column.ndim != 1 or column.size != columns["longitude"].size or not np.isfinite(column).all():
            raise ValueError(f"{name} must be one-dimensional, finite and as long as longitude")
    for name in ("amplitude", "equal_area_radius"):
        if (columns[name] <= 0.0).any():
            raise ValueError(f"{name} must be positive")
    if (np.abs(columns["polarity"]) != 1.0).any():
        raise ValueError("polarity must be 1 or -1")
    if (np.abs(columns["latitude"]) > 90.0).any():
        raise ValueError("latitude must lie between -90 and 90 degrees")
    return np.stack(list(columns.values()))


def _begin(day: int, columns: FloatArray, wave_speed: float) -> TrajectoryState:
    """Trajectories that begin with the eddies of a day."""
    radius, amplitude, polarity, longitude, latitude = columns
    days = np.full(longitude.size, day, dtype=np.int64)
    return TrajectoryState(
        identifier=first_identifiers(day, longitude, latitude, polarity),
        first_day=days,
        last_day=days,
        longitude=longitude,
        latitude=latitude,
        eastward_drift=long_rossby_drift(latitude, wave_speed),
        northward_drift=np.zeros(longitude.size),
        amplitude=amplitude,
        radius=radius,
        polarity=polarity.astype(np.int8),
    )


def _link_costs(expected: TrajectoryState, seen: TrajectoryState, settings: TrackingSettings) -> Pairs:
    """Costs of linking trajectories to eddies of their polarity inside the gate."""
    near = nearby_pairs(expected.longitude, expected.latitude, seen.longitude, seen.latitude, settings.gate)
    alike = expected.polarity[near.first] == seen.polarity[near.second]
    first, second, distance = near.first[alike], near.second[alike], near.value[alike]
    days = seen.last_day[second] - expected.last_day[first]
    reach = settings.distance_scale * np.sqrt(days)
    amplitudes = np.log(seen.amplitude[second] / expected.amplitude[first])
    radii = np.log(seen.radius[second] / expected.radius[first])
    # each term is the negative logarithm of a heavy-tailed (Cauchy) density: one bad property does not decide
    cost = (
        np.log1p((distance / reach) ** 2)
        + np.log1p((amplitudes / settings.amplitude_scale) ** 2)
        + np.log1p((radii / settings.radius_scale) ** 2)
    )
    return Pairs(first, second, cost)
