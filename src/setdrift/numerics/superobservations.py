"""Observations of sea level, and means of consecutive ones that stand for them at a distance."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

_SECONDS_PER_DAY = 86400.0


@dataclass(frozen=True)
class SeaLevelObservations:
    """Along-track observations, all arrays of the same length.

    Attributes
    ----------
    longitude, latitude : (n,) array
        Degrees.
    day : (n,) array
        Days since an epoch.
    value : (n,) array
        Sea level anomaly, m.
    noise_variance : (n,) array
        Variance of the part of the error that no two observations share, m2.
    altimeter : (n,) integer array
        Which altimeter.
    pass_number : (n,) integer array
        Which pass; unique within the altimeter.
    weight : (n,) integer array
        How many original observations each stands for.
    """

    longitude: Floats
    latitude: Floats
    day: Floats
    value: Floats
    noise_variance: Floats
    altimeter: Integers
    pass_number: Integers
    weight: Integers

    def __post_init__(self) -> None:
        """Refuse arrays of different lengths."""
        for field in fields(self):
            if getattr(self, field.name).shape != self.longitude.shape:
                raise ValueError(f"{field.name}: must have the length of longitude ({self.longitude.size})")

    @property
    def size(self) -> int:
        """Number of observations."""
        return int(self.longitude.size)

    def take(self, index: NDArray[np.bool_] | Integers) -> SeaLevelObservations:
        """Return the observations at an index or mask."""
        return SeaLevelObservations(*(getattr(self, field.name)[index] for field in fields(self)))

    @classmethod
    def joined(cls, parts: Sequence[SeaLevelObservations]) -> SeaLevelObservations:
        """Return several sets of observations as one, in their order."""
        return cls(*(np.concatenate([getattr(part, field.name) for part in parts]) for field in fields(cls)))


def average_along_pass(observations: SeaLevelObservations, seconds: float) -> SeaLevelObservations:
    """Replace the observations of each pass within each span of time by their mean.

    Spans are counted from the epoch, not from the first observation, so that two analyses that hold the same
    observations make the same means.

    Parameters
    ----------
    observations : SeaLevelObservations
        n observations.
    seconds : float
        Length of a span, s.

    Returns
    -------
    SeaLevelObservations
        At most n means, ordered by altimeter, pass and time; white noise is divided by their number.

    Raises
    ------
    ValueError
        `seconds` is not positive.
    """
    if not seconds > 0:
        raise ValueError(f"seconds: must be above 0, found {seconds}")
    if observations.size == 0:
        return observations
    span = np.floor(observations.day * (_SECONDS_PER_DAY / seconds)).astype(np.int64)
    order = np.lexsort((observations.day, span, observations.pass_number, observations.altimeter))
    observations, span = observations.take(order), span[order]
    keys = np.stack((observations.altimeter, observations.pass_number, span))
    first = np.flatnonzero(np.concatenate(([True], np.any(keys[:, 1:] != keys[:, :-1], axis=0))))
    count = np.diff(np.append(first, span.size))

    def mean(values: Floats) -> Floats:
        return np.asarray(np.add.reduceat(values, first) / count)

    start = observations.longitude[first]
    offset = (observations.longitude - np.repeat(start, count) + 180.0) % 360.0 - 180.0
    return SeaLevelObservations(
        start + mean(offset),
        mean(observations.latitude),
        mean(observations.day),
        mean(observations.value),
        mean(observations.noise_variance) / count,
        observations.altimeter[first],
        observations.pass_number[first],
        np.add.reduceat(observations.weight, first),
    )
