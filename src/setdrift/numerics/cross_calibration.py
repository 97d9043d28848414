"""Biases of altimeters and errors of their passes, from the differences where passes cross."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_factor, cho_solve, cholesky, solve_triangular

from setdrift.numerics.covariance import CovarianceModel
from setdrift.numerics.covariance_kernels import fill_observation_covariance
from setdrift.numerics.crossovers import Crossovers
from setdrift.numerics.local_plane import MEAN_RADIUS_KM

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

MOST_CROSSOVERS = 2000
"""Of each window only so many are used, those of the shortest lags, which say most."""
_ROUNDS = 12
"""Rounds that estimate the variance of the errors of passes: on the Tarn Sea, 48 more change less than 0.1 %."""


@dataclass(frozen=True)
class Estimates:
    """Values and their standard errors, of one shape.

    Attributes
    ----------
    value, error : array
        NaN where nothing tells.
    """

    value: Floats
    error: Floats


@dataclass(frozen=True)
class CrossCalibration:
    """What the crossovers tell of k altimeters and p passes, metres and days.

    Attributes
    ----------
    bias : Estimates of (k,)
        Relative to the mean of the altimeters, each weighted equally.
    slope : Estimates of (k,)
        Of a straight line through the bias, m a day, relative to the mean of the slopes.
    window_bias : Estimates of (w, k)
        The bias in each window on its own.
    pass_error : (p,) array
        Error common to a whole pass; zero where no crossover tells of it.
    long_wave_deviation : (k,) array
        Standard deviation of those errors, with what their estimates miss.
    used : Crossovers
        Those that entered.
    residual : (2, n) array
        Their differences less the biases, and less the errors of the passes as well, m.
    """

    bias: Estimates
    slope: Estimates
    window_bias: Estimates
    pass_error: Floats
    long_wave_deviation: Floats
    used: Crossovers
    residual: Floats


def calibrate(
    crossovers: Crossovers,
    altimeters: int,
    model: CovarianceModel,
    bias_variance: float,
    long_wave_variance: float,
    edges: Floats,
) -> CrossCalibration:
    """Estimate biases, their drift and the errors of passes, by Gauss-Markov estimation.

    The difference at a crossover is the first altimeter's bias and pass error less the second's, plus white noise,
    plus what the sea changed in between. That change has the covariance of the mapping, with the scales of one
    latitude, the mean distance from the equator; it is taken for independent from window to window.

    Parameters
    ----------
    crossovers : Crossovers
        n of them.
    altimeters : int
        Number of altimeters, k.
    model : CovarianceModel
        Covariance of the sea.
    bias_variance, long_wave_variance : float
        Prior variance of a bias, and the first guess of that of a pass's error, m2, both positive.
    edges : (w + 1,) array
        Days between which windows lie; crossovers count by the mean of their two times.

    Returns
    -------
    CrossCalibration
        The estimates.

    Raises
    ------
    ValueError
        A variance is not positive, or no crossover of two altimeters lies in the windows.

    References
    ----------
    Bretherton et al. (1976), Deep-Sea Res. 23, for the estimate; Dempster et al. (1977), J. R. Stat. Soc. B 39, for
    the variance of the passes' errors (from memory).
    """
    for name, prior in (("bias_variance", bias_variance), ("long_wave_variance", long_wave_variance)):
        if not prior > 0:
            raise ValueError(f"{name}: must be above 0, found {prior}")
    windows = [_of_window(crossovers, low, high) for low, high in itertools.pairwise(edges)]
    used = crossovers.take(np.concatenate(windows))
    if not used.between.any():
        raise ValueError("crossovers: none of two altimeters lies in the windows")
    centre = float(edges[0] + edges[-1]) / 2.0
    equations = [_equations(crossovers.take(w), altimeters, model, centre) for w in windows]
    solver = _Solver(crossovers.pass_altimeter, altimeters, bias_variance)
    total = _Equations(np.sum([e.matrix for e in equations], axis=0), np.sum([e.right for e in equations], axis=0))
    variance = np.full(altimeters, long_wave_variance)
    for _ in range(_ROUNDS):
        variance = solver.long_wave_variance(total, variance)
    bias, pass_error = solver.bias(total, variance, _met(used, altimeters))
    base = np.nan_to_num(bias.value)
    each = [
        solver.bias(e.without(solver.biases, base), variance, _met(crossovers.take(w), altimeters))[0]
        for e, w in zip(equations, windows, strict=True)
    ]
    without_bias = used.difference - (base[used.altimeter[0]] - base[used.altimeter[1]])
    without_pass = without_bias - (pass_error[used.pass_index[0]] - pass_error[used.pass_index[1]])
    return CrossCalibration(
        bias,
        solver.slope(total, variance, _met(used, altimeters)),
        Estimates(np.stack([e.value + base for e in each]), np.stack([e.error for e in each])),
        pass_error,
        np.where(np.isin(np.arange(altimeters), used.altimeter), np.sqrt(variance), np.nan),
        used,
        np.stack((without_bias, without_pass)),
    )


@dataclass(frozen=True)
class _Equations:
    """Normal equations: of the passes' errors, then the biases, then their slopes."""

    matrix: Floats
    right: Floats

    def without(self, columns: slice, values: Floats) -> _Equations:
        """Return the equations of what is left when some unknowns are set to values and sought anew from there."""
        return _Equations(self.matrix, self.right - self.matrix[:, columns] @ values)


def _of_window(crossovers: Crossovers, low: float, high: float) -> NDArray[np.int64]:
    middle = crossovers.day.mean(axis=0)
    inside = np.flatnonzero((middle >= low) & (middle < high))
    lag = np.abs(crossovers.day[0] - crossovers.day[1])[inside]
    return np.sort(inside[np.argsort(lag, kind="stable")[:MOST_CROSSOVERS]])


def _met(crossovers: Crossovers, altimeters: int) -> Flags:
    """Tell which altimeters have a crossover with another."""
    return np.isin(np.arange(altimeters), crossovers.altimeter[:, crossovers.between])


def _equations(crossovers: Crossovers, altimeters: int, model: CovarianceModel, centre: float) -> _Equations:
    passes, count = crossovers.pass_altimeter.size, crossovers.size
    design = np.zeros((count, passes + 2 * altimeters))
    rows = np.arange(count)
    for end, sign in ((0, 1.0), (1, -1.0)):
        column = passes + crossovers.altimeter[end]
        np.add.at(design, (rows, crossovers.pass_index[end]), sign)
        np.add.at(design, (rows, column), sign)
        np.add.at(design, (rows, column + altimeters), sign * (crossovers.day[end] - centre))
    if count == 0:
        return _Equations(design.T @ design, design.T @ crossovers.difference)
    upper = cholesky(_error_covariance(crossovers, model), lower=False)
    whitened = solve_triangular(upper, np.column_stack((design, crossovers.difference)), trans="T", lower=False)
    product = whitened.T @ whitened
    return _Equations(product[:-1, :-1], product[:-1, -1])


def _error_covariance(crossovers: Crossovers, model: CovarianceModel) -> Floats:
    """Covariance of what the sea changed between the passes, and of the white noise; the upper triangle only."""
    latitude = crossovers.latitude
    centre = np.angle(np.mean(np.exp(1j * np.deg2rad(crossovers.longitude))), deg=True)
    east = np.deg2rad((crossovers.longitude - centre + 180.0) % 360.0 - 180.0) * np.cos(np.deg2rad(latitude))
    covariance = model.at(float(np.mean(np.abs(latitude))))
    north = np.tile(np.deg2rad(latitude), 2)
    day = crossovers.day.ravel() - crossovers.day.mean()
    places = covariance.scaled(np.tile(east, 2) * MEAN_RADIUS_KM, north * MEAN_RADIUS_KM, day)
    none = np.zeros(day.size, dtype=np.int64)
    noise = np.ascontiguousarray(crossovers.noise_variance.ravel())
    both = fill_observation_covariance(
        np.ascontiguousarray(places), covariance.variance, covariance.large_variance, noise, none, none, 0.0, 0.0
    )
    n = crossovers.size
    crossed = both[:n, n:]
    # below the diagonal the kernel leaves whatever was in memory
    return np.asarray(np.triu(both[:n, :n]) + np.triu(both[n:, n:]) - crossed - crossed.T)


class _Solver:
    """Solves normal equations under the priors."""

    def __init__(self, pass_altimeter: NDArray[np.int64], altimeters: int, bias_variance: float) -> None:
        self._pass_altimeter = pass_altimeter
        self._altimeters = altimeters
        self._bias_variance = bias_variance
        self._passes = pass_altimeter.size
        self.biases = slice(self._passes, self._passes + altimeters)
        self._slopes = slice(self.biases.stop, self.biases.stop + altimeters)

    def _solved(self, equations: _Equations, variance: Floats, unknowns: int) -> tuple[Floats, Floats]:
        """Return estimate and covariance of the first unknowns, the others being none."""
        # a slope's prior: the whole bias in a day, which is no restraint
        prior = np.concatenate((variance[self._pass_altimeter], np.full(2 * self._altimeters, self._bias_variance)))
        matrix = equations.matrix[:unknowns, :unknowns] + np.diag(1.0 / prior[:unknowns])
        covariance = cho_solve(cho_factor(matrix), np.eye(unknowns))
        return covariance @ equations.right[:unknowns], covariance

    def long_wave_variance(self, equations: _Equations, variance: Floats) -> Floats:
        """Return the variance of each altimeter's pass errors expected from estimates made with another."""
        estimate, covariance = self._solved(equations, variance, self.biases.stop)
        expected = (estimate**2 + np.diag(covariance))[: self._passes]
        told = np.diag(equations.matrix)[: self._passes] > 0.0
        count = np.bincount(self._pass_altimeter[told], minlength=self._altimeters)
        total = np.bincount(self._pass_altimeter[told], expected[told], minlength=self._altimeters)
        return np.asarray(np.where(count > 0, total / np.maximum(count, 1), variance))

    def bias(self, equations: _Equations, variance: Floats, met: Flags) -> tuple[Estimates, Floats]:
        """Return the biases of the altimeters met, and the passes' errors."""
        estimate, covariance = self._solved(equations, variance, self.biases.stop)
        of_bias = estimate[self.biases], covariance[self.biases, self.biases]
        return _about_mean(*of_bias, met), estimate[: self._passes]

    def slope(self, equations: _Equations, variance: Floats, met: Flags) -> Estimates:
        """Return the slopes of straight lines through the biases of the altimeters met."""
        estimate, covariance = self._solved(equations, variance, self._slopes.stop)
        return _about_mean(estimate[self._slopes], covariance[self._slopes, self._slopes], met)


def _about_mean(estimate: Floats, covariance: Floats, met: Flags) -> Estimates:
    """Return estimates less their mean over the altimeters met."""
    centring = np.eye(met.size) - met / max(int(met.sum()), 1)
    error = np.sqrt(np.diag(centring @ covariance @ centring.T))
    return Estimates(np.where(met, centring @ estimate, np.nan), np.where(met, error, np.nan))
