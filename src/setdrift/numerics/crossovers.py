"""Where two passes cross, and what each measured there."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.spatial import cKDTree

from setdrift.numerics.superobservations import SeaLevelObservations, average_along_pass

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

MEAN_SECONDS = 5.0
"""Observations are averaged over spans so long before they are compared: common practice, no source."""
LARGEST_GAP_SECONDS = 15.0
"""Nothing is interpolated between means farther apart in time: common practice, no source."""


@dataclass(frozen=True)
class Crossovers:
    """Places where two passes cross; arrays of two rows hold the two passes' values there.

    The first row's altimeter never has the higher number.

    Attributes
    ----------
    longitude, latitude : (n,) array
        Degrees.
    day : (2, n) array
        When each pass was there, days since an epoch.
    value : (2, n) array
        Sea level anomaly, m.
    noise_variance : (2, n) array
        Variance of the white noise of the values, m2.
    altimeter : (2, n) integer array
        Which altimeter.
    pass_index : (2, n) integer array
        Which pass, counted over all altimeters.
    pass_altimeter, pass_number : (p,) integer array
        Altimeter of each pass, and its number there.
    """

    longitude: Floats
    latitude: Floats
    day: Floats
    value: Floats
    noise_variance: Floats
    altimeter: Integers
    pass_index: Integers
    pass_altimeter: Integers
    pass_number: Integers

    @property
    def size(self) -> int:
        """Number of crossovers."""
        return int(self.longitude.size)

    @property
    def difference(self) -> Floats:
        """First value less second, m."""
        return np.asarray(self.value[0] - self.value[1])

    @property
    def between(self) -> NDArray[np.bool_]:
        """Whether the passes are of two altimeters."""
        return np.asarray(self.altimeter[0] != self.altimeter[1])

    def take(self, index: NDArray[np.bool_] | Integers) -> Crossovers:
        """Return the crossovers at an index or mask, the passes left as they are."""
        return Crossovers(
            self.longitude[index],
            self.latitude[index],
            self.day[:, index],
            self.value[:, index],
            self.noise_variance[:, index],
            self.altimeter[:, index],
            self.pass_index[:, index],
            self.pass_altimeter,
            self.pass_number,
        )


def find_crossovers(observations: SeaLevelObservations, largest_lag_days: float) -> Crossovers:
    """Find where passes cross one another within some days, on means along each pass.

    Steps between consecutive means are arcs of great circles, so that poles and the dateline need nothing special.
    Values are interpolated linearly along the arc.

    Parameters
    ----------
    observations : SeaLevelObservations
        Of one or more altimeters, in any order.
    largest_lag_days : float
        Longest time between the two passes.

    Returns
    -------
    Crossovers
        In the order of altimeter, pass and time of the first row, whatever the observations' order.

    Raises
    ------
    ValueError
        `largest_lag_days` is not positive.
    """
    if not largest_lag_days > 0:
        raise ValueError(f"largest_lag_days: must be above 0, found {largest_lag_days}")
    means = average_along_pass(observations, MEAN_SECONDS)
    keys = np.stack((means.altimeter, means.pass_number))
    new = np.ones(means.size, dtype=bool)
    new[1:] = np.any(keys[:, 1:] != keys[:, :-1], axis=0)
    pass_index = np.cumsum(new) - 1
    place = _unit_vectors(means)
    start = np.flatnonzero(~new[1:] & (np.diff(means.day) * 86400.0 <= LARGEST_GAP_SECONDS))
    pairs = start[_near_pairs(place[start], place[start + 1])].T
    apart = np.abs(means.day[pairs[0]] - means.day[pairs[1]])
    pairs = pairs[:, (pass_index[pairs[0]] != pass_index[pairs[1]]) & (apart <= largest_lag_days)]
    share, crossing = _arcs_crossing(place[pairs], place[pairs + 1])
    pairs, share = pairs[:, crossing], share[:, crossing]

    def along(values: Floats) -> Floats:
        return np.asarray((1.0 - share) * values[pairs] + share * values[pairs + 1])

    noise = means.noise_variance
    where = place[pairs[0]] + share[0][:, None] * (place[pairs[0] + 1] - place[pairs[0]])
    return Crossovers(
        np.rad2deg(np.arctan2(where[:, 1], where[:, 0])),
        np.rad2deg(np.arctan2(where[:, 2], np.hypot(where[:, 0], where[:, 1]))),
        along(means.day),
        along(means.value),
        np.asarray((1.0 - share) ** 2 * noise[pairs] + share**2 * noise[pairs + 1]),
        means.altimeter[pairs],
        pass_index[pairs],
        means.altimeter[new],
        means.pass_number[new],
    )


def _unit_vectors(means: SeaLevelObservations) -> Floats:
    longitude, latitude = np.deg2rad(means.longitude), np.deg2rad(means.latitude)
    cosine = np.cos(latitude)
    return np.stack((cosine * np.cos(longitude), cosine * np.sin(longitude), np.sin(latitude)), axis=1)


def _near_pairs(begin: Floats, end: Floats) -> Integers:
    """Return pairs of arcs whose middles are as near as those of crossing arcs must be, in order."""
    if len(begin) == 0:
        return np.empty((0, 2), dtype=np.int64)
    longest = float(np.linalg.norm(end - begin, axis=1).max())
    pairs = cKDTree((begin + end) / 2.0).query_pairs(longest, output_type="ndarray").astype(np.int64)
    return np.asarray(pairs[np.lexsort((pairs[:, 1], pairs[:, 0]))])


def _arcs_crossing(begin: Floats, end: Floats) -> tuple[Floats, NDArray[np.bool_]]:
    """Tell which pairs of short arcs cross, and where along each.

    Parameters
    ----------
    begin, end : (2, n, 3) array
        Ends of the arcs as unit vectors.

    Returns
    -------
    share : (2, n) array
        Share of each arc that lies before the crossing; without meaning where there is none.
    crossing : (n,) array
        Whether they cross: the ends of each lie on different sides of the other's great circle.
    """
    normal = np.cross(begin, end)[::-1]
    before, after = np.sum(normal * begin, axis=2), np.sum(normal * end, axis=2)
    # an end exactly on the other's circle counts as being to the left: the next arc then does not cross again
    crossing = np.all((before >= 0.0) != (after >= 0.0), axis=0)
    step = before - after
    return before / np.where(step == 0.0, 1.0, step), crossing
