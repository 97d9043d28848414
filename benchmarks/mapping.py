"""Compare the sea level mapping with the exact solution and with SciPy's radial basis functions, in one run.

Random fields with the covariance the mapping assumes are observed along invented passes. The same observations go to

- `map_sea_level`: tiles, fine and coarse means;
- the exact solution: one dense Cholesky factor of all observations;
- `scipy.interpolate.RBFInterpolator` with 50 and 100 neighbours.

Run as ``python benchmarks/mapping.py``, with another seed as an argument if wished (for other passes and fields). It
takes less than two minutes. One core is used, and times are processor time, so that other work on the machine disturbs
them little.
"""

from __future__ import annotations

import itertools
import os
import platform
import sys
import time
from collections.abc import Callable
from dataclasses import dataclass, replace
from types import SimpleNamespace
from typing import Any, Literal
from unittest import mock

import numpy as np
import scipy
from numpy.typing import NDArray
from scipy.interpolate import RBFInterpolator
from scipy.linalg import lapack
from threadpoolctl import threadpool_info, threadpool_limits

from setdrift.numerics import optimal_interpolation
from setdrift.numerics.covariance import CovarianceModel
from setdrift.numerics.local_plane import to_plane
from setdrift.numerics.optimal_interpolation import MappingSettings, map_sea_level
from setdrift.numerics.superobservations import SeaLevelObservations, average_along_pass

Floats = NDArray[np.float64]

CENTRE = (2.5, 40.5)
LATITUDE, LONGITUDE = np.arange(37.625, 43.5, 0.25), np.arange(-0.875, 6.0, 0.25)
SIGNAL, NOISE, LONG_WAVE, BIAS = 0.1, 0.03, 0.02, 0.02  # m
SCALE, TIME_SCALE, DRIFT, WINDOW = 160.0, 10.0, -3.0, 10.0  # km, days, km a day, days
ALTIMETERS, PASSES_A_DAY = 3, 3
FIELDS = 4
MODEL = CovarianceModel(SIGNAL, TIME_SCALE, zonal_scale=SCALE, meridional_scale=SCALE, zonal_drift=DRIFT)


@dataclass(frozen=True)
class Scenario:
    """What errors the observations have, in m."""

    name: str
    long_wave: float
    bias: float


SCENARIOS = (Scenario("white noise only", 0.0, 0.0), Scenario("noise, pass and altimeter errors", LONG_WAVE, BIAS))


def random_field(rng: np.random.Generator, waves: int = 2000) -> Callable[[Floats, Floats, Floats], Floats]:
    """Return a function of x, y (km) and t (days): a sum of plane waves with the spectrum of the covariance.

    The covariance (1 + s + s^2/6 - s^3/6) exp(-s) has the plane spectrum k^2 (1 + k^2)^(-9/2), so that
    k^2 / (1 + k^2) is beta-distributed; exp(-t^2) has a normal one.
    """
    part = rng.beta(2.0, 2.5, waves)
    wavenumber = 3.34 / SCALE * np.sqrt(part / (1.0 - part))
    direction, phase = rng.uniform(0.0, 2.0 * np.pi, (2, waves))
    frequency = rng.normal(0.0, np.sqrt(2.0), waves) / TIME_SCALE

    def sea_level(x: Floats, y: Floats, t: Floats) -> Floats:
        total = np.zeros(x.size)
        for wave in np.array_split(np.arange(waves), 20):
            east, north = wavenumber[wave] * np.cos(direction[wave]), wavenumber[wave] * np.sin(direction[wave])
            angle = np.outer(x - DRIFT * t, east) + np.outer(y, north) + np.outer(t, frequency[wave]) + phase[wave]
            total += np.cos(angle).sum(axis=1)
        return SIGNAL * np.sqrt(2.0 / waves) * total

    return sea_level


def passes(rng: np.random.Generator) -> SeaLevelObservations:
    """Return where and when three altimeters pass, at one point a second and of value zero."""
    along = np.arange(34.5, 46.5, 0.06)
    parts = []
    for number in range(round(2 * WINDOW) * PASSES_A_DAY):
        day = number / PASSES_A_DAY - WINDOW + rng.uniform(0.0, 1.0 / PASSES_A_DAY) + np.arange(along.size) / 86400.0
        longitude = rng.uniform(-7.5, 12.5) + rng.choice([-0.45, 0.45]) * (along - CENTRE[1])
        inside = (longitude > -5.0) & (longitude < 10.0)
        points = np.flatnonzero(inside)
        parts.append(
            SeaLevelObservations(
                longitude[points],
                along[points],
                day[points],
                np.zeros(points.size),
                np.full(points.size, NOISE**2),
                np.full(points.size, number % ALTIMETERS),
                np.full(points.size, number),
                np.ones(points.size, dtype=np.int64),
            )
        )
    return SeaLevelObservations.joined(parts)


def with_errors(
    rng: np.random.Generator, places: SeaLevelObservations, truth: Floats, scenario: Scenario
) -> SeaLevelObservations:
    """Return the truth as it is observed."""
    value = truth + rng.normal(0.0, NOISE, truth.size)
    value += rng.normal(0.0, scenario.long_wave, places.pass_number.max() + 1)[places.pass_number]
    value += rng.normal(0.0, scenario.bias, ALTIMETERS)[places.altimeter]
    return replace(places, value=value)


@dataclass(frozen=True)
class Problem:
    """Observations of several fields, and the truth on the grid at day zero."""

    scenario: Scenario
    observations: list[SeaLevelObservations]
    truth: Floats

    @classmethod
    def drawn(cls, scenario: Scenario, seed: int, count: int) -> Problem:
        """Return so many fields, all observed at the same places."""
        rng = np.random.default_rng(seed)
        places = passes(rng)
        x, y = to_plane(places.longitude, places.latitude, *CENTRE)
        observations, truth = [], []
        for _ in range(count):
            field = random_field(rng)
            observations.append(with_errors(rng, places, field(x, y, places.day), scenario))
            truth.append(field(*grid_plane(), np.zeros(grid_plane()[0].size)))
        return cls(scenario, observations, np.array(truth))


def grid_plane() -> tuple[Floats, Floats]:
    """Return the grid points' x and y, km."""
    east, north = np.meshgrid(LONGITUDE, LATITUDE)
    return to_plane(east.ravel(), north.ravel(), *CENTRE)


@dataclass(frozen=True)
class Score:
    """One method's result: error over the signal, and time a grid point for one map."""

    name: str
    error: float
    microseconds: float
    note: str


def rms(values: Floats) -> float:
    """Return the root mean square."""
    return float(np.sqrt(np.mean(np.square(values))))


def tiled(problem: Problem) -> Score:
    """Map with the project's own code, timing LAPACK and the covariance loops apart."""
    scenario = problem.scenario
    settings = MappingSettings(MODEL, WINDOW, scenario.long_wave**2, scenario.bias**2)
    sea = np.ones((LATITUDE.size, LONGITUDE.size), dtype=bool)
    watch = _Watch()
    loops = ("fill_observation_covariance", "fill_cross_covariance")
    watched = {name: watch("covariance", getattr(optimal_interpolation, name)) for name in loops}
    routines = {name: watch("LAPACK", getattr(lapack, name)) for name in ("dpotrf", "dtrtrs")}
    with mock.patch.multiple(optimal_interpolation, lapack=SimpleNamespace(**routines), **watched):
        start = time.process_time()
        maps = [map_sea_level(data, LATITUDE, LONGITUDE, sea, 0.0, settings) for data in problem.observations]
        seconds = time.process_time() - start
    shares = ", ".join(f"{name} {spent / seconds:.0%}" for name, spent in watch.seconds.items())
    miss = np.array([part.estimate.ravel() for part in maps]) - problem.truth
    actual = rms(miss) ** 2 / rms(maps[0].error) ** 2
    note = f"of the time: {shares}; actual/formal variance {actual:.2f}"
    return Score("setdrift, tiled", rms(miss) / SIGNAL, seconds / problem.truth.size * 1e6, note)


class _Watch:
    """Adds up the time spent in functions, by a name for each kind."""

    def __init__(self) -> None:
        self.seconds: dict[str, float] = {}

    def __call__(self, kind: str, function: Callable[..., Any]) -> Callable[..., Any]:
        self.seconds[kind] = 0.0

        def timed(*arguments: Any, **options: Any) -> Any:
            start = time.process_time()
            result = function(*arguments, **options)
            self.seconds[kind] += time.process_time() - start
            return result

        return timed


def exact(problem: Problem) -> Score:
    """Solve with all observations at once; the fields share the factor, which the first one pays for."""
    data, scenario = problem.observations[0], problem.scenario
    start = time.process_time()
    x, y = to_plane(data.longitude, data.latitude, *CENTRE)
    covariance = MODEL.at(CENTRE[1])
    here, there = np.stack((x, y, data.day)), np.stack((*grid_plane(), np.zeros(problem.truth.shape[1])))
    matrix = np.empty((x.size, x.size), order="F")
    for rows in np.array_split(np.arange(x.size), 40):
        shared = data.altimeter[rows, None] == data.altimeter
        matrix[rows] = covariance(*(here[:, rows, None] - here[:, None, :])) + scenario.bias**2 * shared
        matrix[rows] += scenario.long_wave**2 * (data.pass_number[rows, None] == data.pass_number)
    matrix[np.diag_indices(x.size)] += NOISE**2
    factor, _ = lapack.dpotrf(matrix, lower=True, clean=False, overwrite_a=True)
    cross = covariance(*(here[:, :, None] - there[:, None, :]))
    right_hand_sides = np.column_stack((cross, *(part.value for part in problem.observations)))
    solved, _ = lapack.dtrtrs(factor, right_hand_sides, lower=True)
    weights, values = solved[:, : cross.shape[1]], solved[:, cross.shape[1] :]
    seconds = time.process_time() - start
    miss = values.T @ weights - problem.truth
    formal = np.sqrt(SIGNAL**2 - np.einsum("ij,ij->j", weights, weights))
    note = f"all {x.size:,} observations; actual/formal variance {rms(miss) ** 2 / rms(formal) ** 2:.2f}"
    return Score("exact, dense", rms(miss) / SIGNAL, seconds / problem.truth.shape[1] * 1e6, note)


@dataclass(frozen=True)
class Tuning:
    """How the radial basis functions are used."""

    kernel: Literal["gaussian", "inverse_multiquadric", "thin_plate_spline"]
    width: float
    smoothing: float
    time_factor: float
    seconds: float

    def estimate(self, data: SeaLevelObservations, neighbours: int) -> Floats:
        """Return the estimate on the grid: means along the passes, coordinates scaled by the covariance's scales.

        Each altimeter's mean is taken off first, which removes what can be known of its bias without a model.
        """
        centred = (
            data.value - np.array([data.value[data.altimeter == k].mean() for k in range(ALTIMETERS)])[data.altimeter]
        )
        means = average_along_pass(replace(data, value=centred), self.seconds)
        x, y = to_plane(means.longitude, means.latitude, *CENTRE)
        interpolator = RBFInterpolator(
            self._scaled(x, y, means.day),
            means.value,
            neighbors=neighbours,
            smoothing=self.smoothing * means.noise_variance / SIGNAL**2,
            kernel=self.kernel,
            epsilon=1.0 / self.width,
        )
        return np.asarray(interpolator(self._scaled(*grid_plane(), np.zeros(LATITUDE.size * LONGITUDE.size))))

    def _scaled(self, x: Floats, y: Floats, t: Floats) -> Floats:
        space = 3.34 / SCALE
        return np.column_stack(((x - DRIFT * t) * space, y * space, t * self.time_factor / TIME_SCALE))


CANDIDATES = tuple(
    Tuning(*choice)
    for choice in itertools.product(
        ("gaussian", "inverse_multiquadric", "thin_plate_spline"),
        (1.0, 1.5, 2.5),
        (0.1, 0.3, 1.0, 5.0),
        (1.0, 1.5),
        (5, 10),
    )
    if choice[0] != "thin_plate_spline" or choice[1] == 1.0  # a spline has no width
)


def radial_basis_functions(problem: Problem, neighbours: int, tuning_problem: Problem) -> Score:
    """Choose the best candidate on two other fields, then map with it."""

    def error_of(candidate: Tuning) -> float:
        estimates = [candidate.estimate(data, neighbours) for data in tuning_problem.observations]
        return rms(np.array(estimates) - tuning_problem.truth)

    best = min(CANDIDATES, key=error_of)
    start = time.process_time()
    estimates = [best.estimate(data, neighbours) for data in problem.observations]
    seconds = time.process_time() - start
    error = rms(np.array(estimates) - problem.truth) / SIGNAL
    note = (
        f"{best.kernel}, width {best.width}, smoothing x{best.smoothing:g}, time x{best.time_factor}, {best.seconds} s"
    )
    return Score(f"RBFInterpolator, {neighbours}", error, seconds / problem.truth.size * 1e6, note)


def warm_up() -> None:
    """Load the compiled kernels, so that no timing holds it."""
    nothing = Problem.drawn(SCENARIOS[0], 0, 1).observations[0].take(np.arange(100))
    map_sea_level(nothing, LATITUDE[:2], LONGITUDE[:2], np.ones((2, 2), dtype=bool), 0.0, MappingSettings(MODEL))


def table(scores: list[Score]) -> str:
    """Return the scores as a Markdown table, ratios to the project's own map."""
    own = scores[0]
    lines = [
        "| method | RMSE / signal | RMSE ratio to ours | us a grid point | time ratio to ours | |",
        "|---|---|---|---|---|---|",
    ]
    for score in scores:
        ratio, slower = score.error / own.error, score.microseconds / own.microseconds
        cells = (
            score.name,
            f"{score.error:.3f}",
            f"{ratio:.2f}",
            f"{score.microseconds:.0f}",
            f"{slower:.2f}",
            score.note,
        )
        lines.append(f"| {' | '.join(cells)} |")
    return "\n".join(lines)


def machine() -> str:
    """Return what the figures depend on."""
    blas = ", ".join(sorted({f"{part['internal_api']} {part['version']}" for part in threadpool_info()}))
    return (
        f"{os.cpu_count()} cores ({platform.machine()}), one used; Python {platform.python_version()}, "
        f"numpy {np.__version__}, scipy {scipy.__version__}, {blas}"
    )


def main(seed: int) -> None:
    """Run both scenarios and print a table of each."""
    start = time.perf_counter()
    with threadpool_limits(1):
        print(machine())
        warm_up()
        for number, scenario in enumerate(SCENARIOS):
            problem, other = (
                Problem.drawn(scenario, seed + number, FIELDS),
                Problem.drawn(scenario, seed + 10 + number, 2),
            )
            scores = [tiled(problem), exact(problem)]
            scores += [radial_basis_functions(problem, neighbours, other) for neighbours in (50, 100)]
            size = problem.observations[0].size
            print(
                f"\n{scenario.name}: {FIELDS} fields, {size:,} observations, {problem.truth.shape[1]:,} grid points\n"
            )
            print(table(scores))
    print(f"\n{time.perf_counter() - start:.0f} s in all")


if __name__ == "__main__":
    main(int(sys.argv[1]) if len(sys.argv) > 1 else 10)
