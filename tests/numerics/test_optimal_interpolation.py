"""Optimal interpolation by tiles: what must hold for any observations, and how well the formal error is kept."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.numerics.covariance import Covariance, CovarianceModel
from setdrift.numerics.local_plane import MEAN_RADIUS_KM, to_plane
from setdrift.numerics.optimal_interpolation import (
    COARSENESS,
    FAR_REACH,
    NEAR_REACH,
    MappingSettings,
    ObservationPool,
    _choose,
    map_sea_level,
)
from setdrift.numerics.superobservations import SeaLevelObservations
from setdrift.numerics.tiles import tiles_over

SIGNAL = 0.1
MODEL = CovarianceModel(SIGNAL, 15.0)
PLAIN = MappingSettings(MODEL)
WITH_ERRORS = MappingSettings(MODEL, long_wave_variance=4e-4, bias_variance=4e-4)
LATITUDE, LONGITUDE = np.arange(38.125, 43.0, 0.25), np.arange(0.125, 5.0, 0.25)
SEA = np.ones((LATITUDE.size, LONGITUDE.size), dtype=bool)

quickly = settings(deadline=None, derandomize=True, max_examples=15)
seeds = st.integers(0, 10_000)


def observed(longitude, latitude, day, value, noise=0.03, altimeter=0, pass_number=None):
    """Return observations; without pass numbers, each is a pass of its own."""
    longitude = np.atleast_1d(np.asarray(longitude, dtype=float))
    shape = longitude.shape
    number = np.arange(longitude.size) if pass_number is None else np.asarray(pass_number)
    floats = (np.broadcast_to(np.asarray(column, dtype=float), shape) for column in (latitude, day, value, noise**2))
    integers = (np.broadcast_to(column, shape).astype(np.int64) for column in (altimeter, number, 1))
    return SeaLevelObservations(longitude, *(column.copy() for column in floats), *integers)


def scattered(seed, count=150, west=-3.0, east=8.0, south=35.0, north=46.0, altimeters=3):
    rng = np.random.default_rng(seed)
    return observed(
        rng.uniform(west, east, count),
        rng.uniform(south, north, count),
        rng.uniform(-15.0, 15.0, count),
        rng.normal(0.0, SIGNAL, count),
        altimeter=rng.integers(0, altimeters, count),
    )


def replaced(observations, **changes):
    columns = {name: getattr(observations, name) for name in SeaLevelObservations.__dataclass_fields__}
    return SeaLevelObservations(**columns | changes)


def mapped(observations, settings=WITH_ERRORS, latitude=LATITUDE, longitude=LONGITUDE, sea=None, day=0.0):
    sea = np.ones((latitude.size, longitude.size), dtype=bool) if sea is None else sea
    return map_sea_level(observations, latitude, longitude, sea, day, settings)


def assert_same_map(a, b, tolerance=1e-10):
    np.testing.assert_allclose(a.estimate, b.estimate, atol=tolerance * SIGNAL)
    np.testing.assert_allclose(a.error, b.error, atol=tolerance * SIGNAL)


NOTHING = observed(np.zeros(0), 0.0, 0.0, 0.0)


def test_without_observations_the_prior_stands():
    result = mapped(NOTHING)
    np.testing.assert_array_equal(result.estimate, 0.0)
    np.testing.assert_allclose(result.error, SIGNAL, rtol=1e-12)
    np.testing.assert_array_equal(result.observation_count, 0)


def test_observations_out_of_reach_leave_the_prior():
    assert_same_map(mapped(scattered(1, west=100.0, east=110.0)), mapped(NOTHING))


def test_observations_outside_the_window_are_left_out():
    late = observed([2.5, 2.5], 40.5, [15.01, -15.01], 0.1)
    np.testing.assert_array_equal(mapped(late).observation_count, 0)


def test_one_observation_at_a_grid_point():
    # a grid point in the middle of its tile, which alone serves it
    result = mapped(observed(2.5, 41.0, 0.0, 0.1), PLAIN, np.array([41.0]), np.array([2.5]))
    share = SIGNAL**2 / (SIGNAL**2 + 0.03**2)
    assert result.estimate[0, 0] == pytest.approx(0.1 * share, rel=1e-12)
    assert result.error[0, 0] == pytest.approx(SIGNAL * np.sqrt(1.0 - share), rel=1e-10)
    assert result.observation_count[0, 0] == 1


def test_one_observation_spreads_as_the_covariance():
    model = CovarianceModel(SIGNAL, 15.0, zonal_scale=160.0, meridional_scale=140.0, zonal_drift=-3.0)
    latitude, longitude = np.array([40.6, 41.0, 41.4]), np.array([0.9, 1.35, 1.8])
    result = mapped(observed(1.35, 41.0, 5.0, 0.1), MappingSettings(model), latitude, longitude)
    tile = next(t for t in tiles_over(latitude, longitude, 2.0) if t.weight.max() == 1.0)
    x, y = to_plane(*(part.ravel() for part in np.meshgrid(longitude, latitude)), tile.longitude, tile.latitude)
    at = to_plane(1.35, 41.0, tile.longitude, tile.latitude)
    covariance = model.at(41.0)(x - at[0], y - at[1], np.full(9, -5.0))
    np.testing.assert_allclose(result.estimate.ravel(), covariance * 0.1 / (0.01 + 9e-4), rtol=1e-10)


def test_land_is_nan_and_does_not_change_the_sea():
    sea = np.random.default_rng(5).random(SEA.shape) < 0.6
    whole, masked = mapped(scattered(2)), mapped(scattered(2), sea=sea)
    for name in ("estimate", "error"):
        part = getattr(masked, name)
        assert np.all(np.isnan(part[~sea]))
        np.testing.assert_allclose(part[sea], getattr(whole, name)[sea], rtol=1e-10)
    np.testing.assert_array_equal(masked.observation_count, np.where(sea, whole.observation_count, 0))


def test_a_tile_all_land():
    sea = SEA & ~((LATITUDE[:, None] > 39.4) & (LATITUDE[:, None] < 42.6))
    result = mapped(scattered(2), sea=sea)
    assert np.all(np.isnan(result.estimate[~sea]))
    assert np.all(np.isfinite(result.estimate[sea]))


def test_all_land():
    result = mapped(scattered(2), sea=~SEA)
    assert np.all(np.isnan(result.estimate))
    assert np.all(np.isnan(result.error))
    np.testing.assert_array_equal(result.observation_count, 0)


def test_sea_of_another_shape_is_refused():
    with pytest.raises(ValueError, match="sea: must have the grid's shape"):
        mapped(NOTHING, sea=SEA[1:])


def test_noise_free_observations_at_one_place_and_time_are_refused():
    with pytest.raises(ValueError, match="observations: their covariance is singular near"):
        mapped(observed(np.full(30, 2.5), 40.5, 0.0, 0.1, noise=0.0), PLAIN)


@quickly
@given(seed=seeds)
def test_error_is_never_above_the_prior_nor_zero(seed):
    result = mapped(scattered(seed))
    assert np.all(result.error <= SIGNAL * (1.0 + 1e-12))
    assert np.all(result.error > 0.0)


@quickly
@given(seed=seeds)
def test_more_observations_never_raise_the_error(seed):
    # few enough and so close that all are taken as they are: means and reach do not differ
    rng = np.random.default_rng(seed)
    close = scattered(seed, 40, west=2.0, east=3.0, south=40.0, north=41.0)
    close = replaced(close, day=rng.uniform(-5.0, 5.0, 40))
    some = close.take(rng.random(40) < 0.5)
    assert np.all(mapped(close).error <= mapped(some).error * (1.0 + 1e-12))


@quickly
@given(seed=seeds, factors=st.tuples(st.floats(-3.0, 3.0), st.floats(-3.0, 3.0)))
def test_linear_in_the_values(seed, factors):
    one, other = scattered(seed), scattered(seed + 1).value
    both = factors[0] * one.value + factors[1] * other
    separate = [mapped(replaced(one, value=value)) for value in (one.value, other, both)]
    expected = factors[0] * separate[0].estimate + factors[1] * separate[1].estimate
    np.testing.assert_allclose(separate[2].estimate, expected, atol=1e-12)
    np.testing.assert_array_equal(separate[0].error, separate[2].error)


@quickly
@given(seed=seeds)
def test_order_of_observations_changes_nothing(seed):
    observations = scattered(seed)
    shuffled = observations.take(np.random.default_rng(seed).permutation(observations.size))
    assert_same_map(mapped(shuffled), mapped(observations))


@quickly
@given(seed=seeds, turns=st.tuples(st.integers(-1, 1), st.integers(-1, 1)))
def test_whole_turns_of_longitude_change_nothing(seed, turns):
    observations = scattered(seed)
    turned = replaced(observations, longitude=observations.longitude + 360.0 * turns[0])
    assert_same_map(mapped(turned, longitude=LONGITUDE + 360.0 * turns[1]), mapped(observations))


@quickly
@given(seed=seeds)
def test_hemispheres_mirror_each_other(seed):
    north = scattered(seed)
    south = mapped(replaced(north, latitude=-north.latitude), latitude=-LATITUDE[::-1])
    mirrored = mapped(north)
    np.testing.assert_allclose(south.estimate[::-1], mirrored.estimate, atol=1e-11)
    np.testing.assert_allclose(south.error[::-1], mirrored.error, atol=1e-11)


def test_rolling_a_periodic_grid_rolls_the_map():
    latitude, longitude = np.array([59.0, 60.5]), np.arange(-178.0, 180.0, 4.0)
    observations = scattered(3, 400, west=-180.0, east=180.0, south=57.0, north=63.0)
    here = mapped(observations, latitude=latitude, longitude=longitude)
    there = mapped(observations, latitude=latitude, longitude=longitude + 180.0)
    half = longitude.size // 2
    np.testing.assert_allclose(np.roll(here.estimate, -half, axis=1), there.estimate, atol=1e-11)
    np.testing.assert_allclose(np.roll(here.error, -half, axis=1), there.error, atol=1e-11)


def test_the_dateline_is_no_edge():
    longitude = LONGITUDE + 177.5
    crossing = scattered(4, west=174.5, east=185.5)
    wrapped = replaced(crossing, longitude=(crossing.longitude + 180.0) % 360.0 - 180.0)
    assert_same_map(mapped(wrapped, longitude=longitude), mapped(crossing, longitude=longitude))
    assert mapped(wrapped, longitude=longitude).observation_count.min() > 0


def test_overlapping_grids_agree():
    observations = scattered(6)
    whole = mapped(observations)
    part = mapped(observations, latitude=LATITUDE[5:], longitude=LONGITUDE[:9])
    np.testing.assert_allclose(part.estimate, whole.estimate[5:, :9], atol=1e-12)
    np.testing.assert_allclose(part.error, whole.error[5:, :9], atol=1e-12)


def around_the_pole(count, seed=0):
    rng = np.random.default_rng(seed)
    return scattered(seed, count, west=-180.0, east=180.0, south=89.7, north=90.0), rng


def test_the_pole_is_one_place():
    # all observations within the near reach, so that every tile takes the same ones
    observations, rng = around_the_pole(30)
    observations = replaced(observations, day=rng.uniform(-3.0, 3.0, 30))
    result = mapped(observations, latitude=np.array([89.5, 90.0]), longitude=np.arange(-180.0, 180.0, 20.0))
    # the tiles' planes differ a little over the 30 km of the observations, and so do their drifts of 10 m a day
    assert np.ptp(result.estimate[1]) < 1e-3 * SIGNAL
    assert np.ptp(result.error[1]) < 1e-3 * SIGNAL


@pytest.mark.parametrize("hemisphere", [-1.0, 1.0])
def test_a_tile_at_89_9_degrees(hemisphere):
    latitude = np.sort(hemisphere * np.array([89.7, 89.85, 89.95, 90.0]))
    observations, _ = around_the_pole(60)
    observations = replaced(observations, latitude=hemisphere * observations.latitude)
    fine = MappingSettings(MODEL, tile_degrees=0.2)
    result = mapped(observations, fine, latitude, np.arange(-180.0, 180.0, 20.0))
    assert np.all(np.isfinite(result.estimate))
    assert np.all(result.error < 0.5 * SIGNAL)
    assert np.all(result.observation_count > 0)


def test_one_pass_only():
    latitude = np.arange(35.0, 46.0, 0.06)
    seconds = np.arange(latitude.size) / 86400.0
    value = 0.1 * np.sin(latitude)
    one = observed(2.5 + 0.3 * (latitude - 40.5), latitude, seconds, value, pass_number=np.zeros(latitude.size))
    result = mapped(one)
    near = np.unravel_index(np.argmin(result.error), result.error.shape)
    assert abs(LONGITUDE[near[1]] - 2.5 - 0.3 * (LATITUDE[near[0]] - 40.5)) < 0.25
    assert result.error.max() > 1.5 * result.error.min()
    # beside the pass the sea level it saw comes back, but for the noise's and the shared errors' share
    under = np.abs(LONGITUDE - 2.5 - 0.3 * (LATITUDE[:, None] - 40.5)) < 0.13
    seen = np.broadcast_to(0.1 * np.sin(LATITUDE)[:, None], SEA.shape)
    assert np.corrcoef(result.estimate[under], seen[under])[0, 1] > 0.95


def test_thousands_of_points_at_one_place():
    rng = np.random.default_rng(8)
    count = 4000
    value = 0.1 + rng.normal(0.0, 0.03, count)
    same = observed(np.full(count, 2.5), 41.0, np.linspace(-1e-2, 1e-2, count), value, pass_number=np.zeros(count))
    result = mapped(same, PLAIN, np.array([41.0]), np.array([2.5]))
    # nearly all noise averages out: what is left is the prior's pull, and at most the noise of some 400 means
    assert result.estimate[0, 0] == pytest.approx(0.1, abs=0.003)
    assert 0.0 < result.error[0, 0] < 0.002
    assert result.observation_count[0, 0] == count


def test_a_constant_bias_of_one_altimeter_is_absorbed():
    observations = scattered(9, 400, altimeters=2)
    biased = replaced(observations, value=np.where(observations.altimeter == 1, 0.05, 0.0))
    aware = MappingSettings(MODEL, bias_variance=0.05**2)
    unaware, absorbed = (np.abs(mapped(biased, kind).estimate).mean() for kind in (PLAIN, aware))
    assert unaware > 0.015
    assert absorbed < 0.25 * unaware


def test_a_long_wave_error_of_a_pass_is_absorbed():
    rng = np.random.default_rng(10)
    passes = rng.integers(0, 40, 1200)
    observations = replaced(scattered(10, 1200, altimeters=1), pass_number=passes)
    observations = replaced(observations, value=rng.normal(0.0, 0.05, 40)[passes])
    aware = MappingSettings(MODEL, long_wave_variance=0.05**2)
    unaware, absorbed = (np.sqrt(np.mean(mapped(observations, kind).estimate ** 2)) for kind in (PLAIN, aware))
    assert absorbed < 0.6 * unaware


def test_shared_errors_raise_the_formal_error():
    observations = scattered(11)
    assert np.all(mapped(observations, WITH_ERRORS).error > mapped(observations, PLAIN).error)


def test_large_scale_reaches_where_the_mesoscale_does_not():
    far = observed(np.linspace(0.0, 5.0, 40), 44.5, 0.0, 0.1)
    both = MappingSettings(CovarianceModel(SIGNAL, 15.0, 0.05))
    row = np.array([42.0])
    assert mapped(far, both, row).estimate.mean() > 0.02
    assert mapped(far, PLAIN, row).estimate.mean() < 0.01
    assert mapped(NOTHING, both, row).error == pytest.approx(np.hypot(SIGNAL, 0.05))


# the pool and its choice


def one_pass_pool(seed, count=60, seconds=3):
    """Return a pool of observations that weigh 1, 2, 4, ... so that a sum of weights tells which are in it."""
    rng = np.random.default_rng(seed)
    latitude = 37.0 + np.sort(rng.uniform(0.0, 9.0, count))
    day = rng.integers(-12, 13, 4).repeat(count // 4) + (latitude - 37.0) * 17.0 / 86400.0
    observations = observed(
        2.5 + rng.uniform(-1.0, 1.0, 4).repeat(count // 4) + 0.3 * (latitude - 41.0),
        latitude,
        day,
        0.0,
        pass_number=np.arange(4).repeat(count // 4),
    )
    observations = replaced(observations, weight=1 << np.arange(count, dtype=np.int64))
    return observations, ObservationPool(observations, seconds)


@quickly
@given(seed=seeds, seconds=st.integers(1, 40))
def test_members_of_all_coarse_means_are_all_fine_means(seed, seconds):
    _, pool = one_pass_pool(seed, seconds=seconds)
    members = pool.members(np.arange(pool.coarse.size))
    np.testing.assert_array_equal(members.weight, pool.fine.weight)
    for index in range(pool.coarse.size):
        part = pool.members(np.array([index]))
        assert 1 <= part.size <= COARSENESS
        assert part.weight.sum() == pool.coarse.weight[index]
        assert part.value.mean() == pytest.approx(pool.coarse.value[index])


@quickly
@given(seed=seeds, seconds=st.integers(1, 40))
def test_an_observation_is_used_once_and_none_in_reach_is_lost(seed, seconds):
    _, pool = one_pass_pool(seed, seconds=seconds)
    covariance = Covariance(0.01, 0.0, 160.0, 120.0, 15.0, -3.0)
    for tile in tiles_over(LATITUDE, LONGITUDE, 2.0):
        chosen = _choose(pool, tile, covariance, 0.0, 15.0)
        once = int(np.bitwise_or.reduce(chosen.weight)) if chosen.size else 0
        assert sum(int(weight) for weight in chosen.weight) == once
        x, y = to_plane(pool.coarse.longitude, pool.coarse.latitude, tile.longitude, tile.latitude)
        east = np.clip(np.abs(x + 3.0 * pool.coarse.day) - tile.half_width, 0.0, None) / 160.0
        north = np.clip(np.abs(y) - tile.half_height, 0.0, None) / 120.0
        late = (pool.coarse.day / 15.0) ** 2
        within = [(east**2 + north**2) / reach**2 + late < 1.0 for reach in (NEAR_REACH, FAR_REACH)]
        assert once == int(np.bitwise_or.reduce(pool.coarse.weight[within[1]], initial=0))
        # near the tile they enter as fine means
        assert np.all(np.isin(pool.members(np.flatnonzero(within[0])).weight, chosen.weight))


def test_an_observation_that_drifts_into_reach_is_found():
    covariance = Covariance(0.01, 0.0, 160.0, 160.0, 15.0, -13.0)
    tile = next(iter(tiles_over(np.array([0.1]), np.array([2.6]), 0.5)))
    # a week ago it was 91 km east of where the pattern is now, which is 1.7 scales from the tile
    x = tile.half_width + 1.7 * 160.0 + 91.0
    longitude = tile.longitude + np.rad2deg(2.0 * np.arcsin(x / (2.0 * MEAN_RADIUS_KM)))
    pool = ObservationPool(observed(longitude, tile.latitude, -7.0, 0.1), 3)
    assert _choose(pool, tile, covariance, 0.0, 15.0).size == 1


@quickly
@given(seed=seeds, distance=st.floats(1.0, 25_000.0))
def test_near_finds_all_within_a_distance_and_no_other(seed, distance):
    rng = np.random.default_rng(seed)
    longitude, latitude = rng.uniform(-180.0, 180.0, 200), np.rad2deg(np.arcsin(rng.uniform(-1.0, 1.0, 200)))
    pool = ObservationPool(observed(longitude, latitude, np.arange(200.0), 0.0), 3)
    phi, lam = np.deg2rad(pool.coarse.latitude), np.deg2rad(pool.coarse.longitude)
    cosine = np.sin(phi) * np.sin(0.5) + np.cos(phi) * np.cos(0.5) * np.cos(lam - 0.2)
    expected = np.flatnonzero(MEAN_RADIUS_KM * np.arccos(cosine) <= distance)
    np.testing.assert_array_equal(pool.near(np.rad2deg(0.2), np.rad2deg(0.5), distance), expected)


# whole maps of dense observations, as altimeters give them


def waves(seed, count=300, scale=160.0, time_scale=15.0):
    """Return the places in wavenumber, frequency and phase of plane waves that add up to the covariance.

    The plane spectrum of the covariance is k^2 (1 + k^2)^(-9/2), so that k^2 / (1 + k^2) is beta-distributed.
    """
    rng = np.random.default_rng(seed)
    part = rng.beta(2.0, 2.5, count)
    wavenumber, direction = 3.34 / scale * np.sqrt(part / (1.0 - part)), rng.uniform(0.0, 2.0 * np.pi, count)
    frequency = rng.normal(0.0, np.sqrt(2.0) / time_scale, count)
    return wavenumber * np.cos(direction), wavenumber * np.sin(direction), frequency, rng.uniform(0, 2 * np.pi, count)


def sea_level(field, x, y, day):
    east, north, frequency, phase = field
    angle = np.outer(x, east) + np.outer(y, north) + np.outer(day, frequency) + phase
    return SIGNAL * np.sqrt(2.0 / phase.size) * np.cos(angle).sum(axis=1)


FIXED = CovarianceModel(SIGNAL, 15.0, zonal_scale=160.0, meridional_scale=160.0, zonal_drift=0.0)


def dense_passes(seed=12):
    """Return three passes a day, 1 Hz, over 15 degrees round the grid, of waves with noise."""
    rng = np.random.default_rng(seed)
    along = np.arange(34.0, 47.0, 0.06)
    parts = []
    for number in range(93):
        longitude = rng.uniform(-5.0, 10.0) + rng.choice([-0.4, 0.4]) * (along - 40.5)
        day = number // 3 - 15 + rng.random() + np.arange(along.size) / 86400.0
        x, y = to_plane(longitude, along, 2.5, 40.5)
        value = sea_level(waves(seed), x, y, day) + rng.normal(0.0, 0.03, along.size)
        parts.append(observed(longitude, along, day, value, pass_number=np.full(along.size, number)))
    return SeaLevelObservations.joined(parts)


def test_tile_edges_leave_no_visible_step():
    step = 0.05
    latitude = np.arange(38.0, 43.0, step) + step / 2
    longitude = np.arange(0.125, 5.0, 0.5)
    result = mapped(dense_passes(), MappingSettings(FIXED), latitude, longitude)
    middle = (latitude[:-3] + latitude[3:]) / 2
    # tiles of 2 degrees meet at even latitudes, and are blended across 0.5 degrees on either side
    blended = np.abs(middle - 2.0 * np.round(middle / 2.0)) < 0.5
    for name in ("estimate", "error"):
        third = np.diff(getattr(result, name), 3, axis=0)
        inside, across = np.abs(third[~blended]), np.abs(third[blended])
        # a step would show as third differences as great as itself; the field's own, which vary from place to place,
        # are the measure: over four seeds the ratios were 0.81 to 1.09
        assert np.sqrt(np.mean(across**2)) < 1.25 * np.sqrt(np.mean(inside**2)), name
        assert across.max() < 1.25 * inside.max(), name


def test_dense_observations_bring_the_field_back():
    x, y = to_plane(*(part.ravel() for part in np.meshgrid(LONGITUDE, LATITUDE)), 2.5, 40.5)
    truth = sea_level(waves(12), x, y, np.zeros(x.size)).reshape(SEA.shape)
    result = mapped(dense_passes(), MappingSettings(FIXED))
    miss = np.sqrt(np.mean((result.estimate - truth) ** 2))
    assert miss < 0.25 * truth.std()
    # one field of some ten eddies: actual and formal error agree to a third
    assert miss == pytest.approx(np.sqrt(np.mean(result.error**2)), rel=0.33)


def block():
    """Return 240 observations that are used as they are, and points that a single tile serves."""
    rng = np.random.default_rng(13)
    longitude, latitude = rng.uniform(2.0, 6.0, 240), rng.uniform(39.6, 42.4, 240)
    passes = np.arange(240) // 20
    day = rng.uniform(-7.0, 7.0, 12)[passes] + (np.arange(240) % 20) * 60.0 / 86400.0
    altimeter = passes % 3
    return observed(longitude, latitude, day, 0.0, altimeter=altimeter, pass_number=passes)


def correlated(kind, seed, draws, places):
    """Return draws of sea level at places (3, n), by the Cholesky factor of their covariance."""
    lag = places[:, :, None] - places[:, None, :]
    factor = np.linalg.cholesky(kind(*lag) + 1e-12 * np.eye(places.shape[1]))
    return np.random.default_rng(seed).standard_normal((draws, places.shape[1])) @ factor.T


def test_actual_error_is_the_formal_error():
    model = CovarianceModel(SIGNAL, 15.0, 0.05)
    kind = MappingSettings(model, long_wave_variance=4e-4, bias_variance=4e-4)
    observations, draws = block(), 20_000
    latitude, longitude = np.array([40.55, 41.0, 41.45]), np.array([3.4, 3.75, 4.1, 4.45])
    tiles = [tile for tile in tiles_over(latitude, longitude, 2.0) if tile.weight.min() == 1.0]
    assert len(tiles) == 1
    # the map is linear in the values (tested above): its response to each observation gives all draws at once
    unit = np.eye(observations.size)
    response = np.array([mapped(replaced(observations, value=row), kind, latitude, longitude).estimate for row in unit])
    result = mapped(observations, kind, latitude, longitude)
    assert np.all(result.observation_count == observations.size)
    centre = tiles[0].longitude, tiles[0].latitude
    x, y = to_plane(observations.longitude, observations.latitude, *centre)
    points = to_plane(*(part.ravel() for part in np.meshgrid(longitude, latitude)), *centre)
    places = np.stack((np.append(x, points[0]), np.append(y, points[1]), np.append(observations.day, np.zeros(12))))
    truth = correlated(model.at(centre[1]), 14, draws, places)
    rng = np.random.default_rng(15)
    values = truth[:, :240] + rng.normal(0.0, 0.03, (draws, 240))
    values += rng.normal(0.0, 0.02, (draws, 12))[:, observations.pass_number]
    values += rng.normal(0.0, 0.02, (draws, 3))[:, observations.altimeter]
    actual = np.mean((values @ response.reshape(240, 12) - truth[:, 240:]) ** 2, axis=0)
    # the variance of 20,000 draws is known to sqrt(2 / 20000) = 1 %: four times that at every point
    np.testing.assert_allclose(actual / result.error.ravel() ** 2, 1.0, atol=0.04)
