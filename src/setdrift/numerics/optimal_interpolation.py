"""Optimal interpolation of sea level, tile by tile, with its formal error.

Each tile takes fine means of the observations near it and coarse means of those farther off, never both of the same
observations; one Cholesky factor gives the estimates and their errors at all the tile's grid points.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import lapack
from scipy.spatial import cKDTree

from setdrift.numerics.covariance import FAR_REACH, Covariance, CovarianceModel
from setdrift.numerics.covariance_kernels import fill_cross_covariance, fill_observation_covariance
from setdrift.numerics.local_plane import MEAN_RADIUS_KM, to_plane
from setdrift.numerics.superobservations import SeaLevelObservations, average_along_pass
from setdrift.numerics.tiles import Tile, tiles_over

Floats = NDArray[np.float64]

NEAR_REACH = 0.5
"""Fine means are taken within this many zero-crossing scales of the tile."""
FINE_LENGTH = 0.15
"""Length of a fine mean in zero-crossing scales."""
COARSENESS = 4
"""Fine means to a coarse one."""

_GROUND_SPEED = 6.7  # km s-1 of a satellite some 1000 km up; only decides how many points make a mean


@dataclass(frozen=True)
class MappingSettings:
    """What the mapping assumes of the ocean, of the altimeters, and how finely it works.

    Attributes
    ----------
    model : CovarianceModel
        Sea level covariance by latitude.
    window : float
        Observations up to so many days before and after are used.
    long_wave_variance : float
        Variance of the error shared by a pass, m2.
    bias_variance : float
        Variance of the bias of each altimeter, m2.
    tile_degrees : float
        Height of a tile.
    """

    model: CovarianceModel
    window: float = 15.0
    long_wave_variance: float = 0.0
    bias_variance: float = 0.0
    tile_degrees: float = 2.0


@dataclass(frozen=True)
class SeaLevelMap:
    """A map of one moment; all arrays (latitude, longitude), NaN on land.

    Attributes
    ----------
    estimate, error : array
        Sea level anomaly and its formal standard error, m.
    observation_count : integer array
        Original observations behind the point's most weighted tile; 0 on land.
    """

    estimate: Floats
    error: Floats
    observation_count: NDArray[np.int32]


class ObservationPool:
    """Observations of a window, as fine and coarse means that tiles choose from.

    Parameters
    ----------
    observations : SeaLevelObservations
        The observations of the window.
    seconds : int
        Length along the pass of a fine mean; coarse ones are `COARSENESS` times as long.
    """

    def __init__(self, observations: SeaLevelObservations, seconds: int) -> None:
        coarse_seconds = seconds * COARSENESS
        self.fine = average_along_pass(observations, seconds)
        self.coarse = average_along_pass(self.fine, coarse_seconds)
        self._first_fine = _first_members(self.fine, coarse_seconds)
        self._tree = cKDTree(_unit_vectors(self.coarse.longitude, self.coarse.latitude))

    def near(self, longitude: float, latitude: float, distance: float) -> NDArray[np.int64]:
        """Return the coarse means within a distance (km) of a place, in a fixed order."""
        chord = 2.0 * np.sin(min(distance / (2.0 * MEAN_RADIUS_KM), np.pi / 2.0))
        found = self._tree.query_ball_point(_unit_vectors(longitude, latitude), chord, return_sorted=True)
        return np.asarray(found, dtype=np.int64)

    def members(self, coarse: NDArray[np.int64]) -> SeaLevelObservations:
        """Return the fine means that the given coarse means are made of."""
        first, after = self._first_fine[coarse], self._first_fine[coarse + 1]
        count = after - first
        start = np.repeat(first - np.concatenate(([0], np.cumsum(count)[:-1])), count)
        return self.fine.take(start + np.arange(count.sum()))


def map_sea_level(
    observations: SeaLevelObservations,
    latitude: Floats,
    longitude: Floats,
    sea: NDArray[np.bool_],
    day: float,
    settings: MappingSettings,
) -> SeaLevelMap:
    """Map sea level anomaly at one moment.

    Parameters
    ----------
    observations : SeaLevelObservations
        Observations in and around the grid; those outside the window are left out.
    latitude, longitude : (y,), (x,) array
        Grid coordinates, degrees, ascending.
    sea : (y, x) boolean array
        Where to map.
    day : float
        The moment, in days since the observations' epoch.
    settings : MappingSettings
        Covariance, errors, window and tiles.

    Returns
    -------
    SeaLevelMap
        Estimate, formal error and observation count. Where nothing is in reach, zero and the prior's
        standard deviation.

    Raises
    ------
    ValueError
        `sea` does not have the shape of the grid.

    References
    ----------
    Bretherton, Davis and Fandry (1976), Deep-Sea Res. 23, equations for the estimate and its error; blended tiles
    and two levels of means are this project's own.
    """
    if sea.shape != (latitude.size, longitude.size):
        raise ValueError(f"sea: must have the grid's shape {(latitude.size, longitude.size)}, found {sea.shape}")
    pools = _Pools(observations.take(np.abs(observations.day - day) <= settings.window))
    estimate, error, total = np.zeros(sea.shape), np.zeros(sea.shape), np.zeros(sea.shape)
    count, heaviest = np.zeros(sea.shape, dtype=np.int32), np.zeros(sea.shape)
    for tile in tiles_over(latitude, longitude, settings.tile_degrees):
        rows, columns = np.nonzero(sea[np.ix_(tile.rows, tile.columns)])
        if rows.size == 0:
            continue
        weight = tile.weight[rows, columns]
        points = tile.rows[rows], tile.columns[columns]
        value, deviation, used = _solve_tile(pools, tile, latitude[points[0]], longitude[points[1]], day, settings)
        estimate[points] += weight * value
        error[points] += weight * deviation
        total[points] += weight
        wins = weight > heaviest[points]
        won = points[0][wins], points[1][wins]
        heaviest[won], count[won] = weight[wins], used
    with np.errstate(invalid="ignore"):
        # neighbouring tiles share most of their errors: the mean of the deviations is their blend's upper bound
        return SeaLevelMap(estimate / total, error / total, count)


class _Pools:
    """Pools by the length of their means: tiles with longer scales need fewer of them."""

    def __init__(self, observations: SeaLevelObservations) -> None:
        self._observations = observations
        self._pools: dict[int, ObservationPool] = {}

    def suited_to(self, covariance: Covariance) -> ObservationPool:
        shortest = min(covariance.zonal_scale, covariance.meridional_scale)
        seconds = max(1, int(FINE_LENGTH * shortest / _GROUND_SPEED))
        if seconds not in self._pools:
            self._pools[seconds] = ObservationPool(self._observations, seconds)
        return self._pools[seconds]


def _solve_tile(
    pools: _Pools, tile: Tile, latitude: Floats, longitude: Floats, day: float, settings: MappingSettings
) -> tuple[Floats, Floats, int]:
    covariance = settings.model.at(tile.latitude)
    chosen = _choose(pools.suited_to(covariance), tile, covariance, day, settings.window)
    if chosen.size == 0:
        return np.zeros(latitude.size), np.full(latitude.size, np.sqrt(covariance.prior_variance)), 0
    points = _scaled_places(tile, covariance, longitude, latitude, np.zeros(latitude.size))
    places = _scaled_places(tile, covariance, chosen.longitude, chosen.latitude, chosen.day - day)
    variances = covariance.variance, covariance.large_variance
    matrix = fill_observation_covariance(
        places,
        *variances,
        chosen.noise_variance,
        chosen.altimeter,
        chosen.pass_number,
        settings.long_wave_variance,
        settings.bias_variance,
    )
    # the kernels fill C-ordered arrays; LAPACK sees their transposes, so the upper triangle is its lower one
    factor, failed = lapack.dpotrf(matrix.T, lower=True, clean=False, overwrite_a=True)
    if failed:
        raise ValueError(
            f"observations: their covariance is singular near {tile.latitude:g} N {tile.longitude:g} E (row {failed})"
        )
    right_hand_sides = fill_cross_covariance(places, points, *variances, chosen.value)
    solved, _ = lapack.dtrtrs(factor, right_hand_sides.T, lower=True, overwrite_b=True)
    weights, values = solved[:, :-1], solved[:, -1]
    explained = np.einsum("ij,ij->j", weights, weights)
    error = np.sqrt(np.maximum(covariance.prior_variance - explained, 0.0))
    return values @ weights, error, int(chosen.weight.sum())


def _scaled_places(tile: Tile, covariance: Covariance, longitude: Floats, latitude: Floats, lag: Floats) -> Floats:
    x, y = to_plane(longitude, latitude, tile.longitude, tile.latitude)
    return np.ascontiguousarray(covariance.scaled(x, y, lag), dtype=np.float64)


def _choose(
    pool: ObservationPool, tile: Tile, covariance: Covariance, day: float, window: float
) -> SeaLevelObservations:
    """Choose fine means near the tile (in space and time) and coarse means up to the far reach."""
    scale = max(covariance.zonal_scale, covariance.meridional_scale)
    drift = abs(covariance.zonal_drift) * window
    reach = np.hypot(tile.half_width, tile.half_height) + FAR_REACH * scale + drift
    found = pool.near(tile.longitude, tile.latitude, reach)
    coarse = pool.coarse.take(found)
    lag = coarse.day - day
    x, y = to_plane(coarse.longitude, coarse.latitude, tile.longitude, tile.latitude)
    east = np.maximum(np.abs(x - covariance.zonal_drift * lag) - tile.half_width, 0.0) / covariance.zonal_scale
    north = np.maximum(np.abs(y) - tile.half_height, 0.0) / covariance.meridional_scale
    distance_squared = east * east + north * north
    late_squared = (lag / window) ** 2
    near = distance_squared / NEAR_REACH**2 + late_squared < 1.0
    far = (distance_squared / FAR_REACH**2 + late_squared < 1.0) & ~near
    return SeaLevelObservations.joined((pool.members(found[near]), coarse.take(far)))


def _first_members(fine: SeaLevelObservations, coarse_seconds: float) -> NDArray[np.int64]:
    """Return where each coarse mean's fine members begin, and one index more."""
    keys = np.stack((fine.altimeter, fine.pass_number, np.floor(fine.day * (86400.0 / coarse_seconds))))
    changes = np.flatnonzero(np.any(keys[:, 1:] != keys[:, :-1], axis=0)) + 1
    return np.concatenate(([0], changes, [fine.size])).astype(np.int64)


def _unit_vectors(longitude: Floats | float, latitude: Floats | float) -> Floats:
    lam, phi = np.deg2rad(longitude), np.deg2rad(latitude)
    return np.stack((np.cos(phi) * np.cos(lam), np.cos(phi) * np.sin(lam), np.sin(phi)), axis=-1)
