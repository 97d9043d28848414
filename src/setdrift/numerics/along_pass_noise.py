"""White noise of an altimeter, estimated from how consecutive observations differ."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from setdrift.numerics.segments import usual_step
from setdrift.numerics.spikes import NORMAL_SCALE

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

ORDER = 3
GAIN = math.sqrt(math.comb(2 * ORDER, ORDER))
"""Standard deviation of a difference of this order of white noise, over that of the noise: sqrt(20)."""

EVEN = 0.2
"""Steps in time that depart from the usual one by more than this share of it are not used: common practice,
no source."""

FEWEST = 100
"""Fewer differences tell too little: their scatter is above 15 % (common practice, no source)."""


@dataclass(frozen=True)
class NoiseEstimate:
    """White noise of a set of observations.

    Attributes
    ----------
    standard_deviation : float
        In the units of the values.
    differences : int
        How many differences it is made from.
    """

    standard_deviation: float
    differences: int


def estimate_noise(time: Floats, values: Floats, passes: Integers) -> NoiseEstimate | None:
    """Estimate the standard deviation of the white noise of observations along passes.

    Third differences d = x(0) - 3 x(1) + 3 x(2) - x(3) of evenly spaced observations cancel whatever is a
    quadratic polynomial of time there, and for white noise have the variance 20 sigma^2. sigma is taken from the
    median of abs(d), which a few odd values do not move. Of a signal of wavelength L sampled every s, the share
    (2 sin(pi s / L))^6 / 20 of its variance leaks in: 0.03 % where L is 15 s, 1.4 % where it is 7.5 s.

    Parameters
    ----------
    time : (n,) array
        Seconds, not descending.
    values : (n,) array
        Finite.
    passes : (n,) array of int
        Number of the pass; those of one pass stand together.

    Returns
    -------
    NoiseEstimate or None
        None where fewer than `FEWEST` differences can be formed.

    Raises
    ------
    ValueError
        Sizes differ, or a value is not finite.

    References
    ----------
    Tintner (1940), The Variate Difference Method, variance of the k-th difference over the binomial coefficient
    (2k, k) (from memory); von Neumann et al. (1941), Ann. Math. Stat. 12, the case k = 1 (from memory).
    """
    if not time.shape == values.shape == passes.shape:
        raise ValueError("values: must have one value for each time and pass")
    if not np.all(np.isfinite(values)):
        raise ValueError("values: must be finite")
    if values.size <= ORDER:
        return None
    step, same = np.diff(time), np.diff(passes) == 0
    usual = usual_step(step[same])
    even = same & (step >= (1.0 - EVEN) * usual) & (step <= (1.0 + EVEN) * usual)
    sound = np.lib.stride_tricks.sliding_window_view(even, ORDER).all(axis=1)
    differences = abs(np.diff(values, ORDER)[sound])
    if differences.size < FEWEST:
        return None
    return NoiseEstimate(float(NORMAL_SCALE * np.median(differences) / GAIN), int(differences.size))


def pooled_noise(estimates: list[NoiseEstimate]) -> NoiseEstimate | None:
    """Return the root mean square of several estimates, each with the weight of its differences.

    Parameters
    ----------
    estimates : list of NoiseEstimate
        Of one altimeter.

    Returns
    -------
    NoiseEstimate or None
        None where there is no estimate.
    """
    total = sum(estimate.differences for estimate in estimates)
    if total == 0:
        return None
    square = sum(e.differences * e.standard_deviation**2 for e in estimates) / total
    return NoiseEstimate(math.sqrt(square), total)
