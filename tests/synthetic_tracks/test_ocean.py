from __future__ import annotations

from datetime import date

import numpy as np
import pytest

from synthetic_tracks import truth
from synthetic_tracks.earth import coriolis_parameter, gravity, metres_per_degree
from synthetic_tracks.scenario import day_number

DAY = date(2031, 3, 5)  # the middle one of the tiny scenario


@pytest.fixture(scope="module")
def places(sea):
    """Places at sea all over the box, with one time."""
    rng = np.random.default_rng(1)
    lon, lat = rng.uniform(-40, -16, 3000), rng.uniform(-9, 17, 3000)
    at_sea = ~sea.land.is_land(lon, lat)
    lon, lat = lon[at_sea], lat[at_sea]
    return lon, lat, np.full(lon.size, day_number(DAY) + 0.5)


def fourth_order_slopes(field, lon, lat, step=0.04):
    """Slopes by a wider and higher-order stencil than the generator's own."""
    east, north = metres_per_degree(lat)

    def slope(x, y):
        return (8 * (field(lon + x, lat + y) - field(lon - x, lat - y)) - field(lon + 2 * x, lat + 2 * y)
                + field(lon - 2 * x, lat - 2 * y)) / (12 * step)  # fmt: skip

    return slope(step, 0) / east, slope(0, step) / north


def test_velocity_is_geostrophic_away_from_the_equator(sea, places):
    # without the waves, which obey more than geostrophy; 3 mm/s: the stencils' error at the smallest eddies;
    # the slope of the mean has a kink at the coast, which a wide stencil must not touch
    chosen = (np.abs(places[1]) > 4) & (sea.land.from_mainland(*places[:2]) > 15e3)
    lon, lat, day = (p[chosen] for p in places)
    level = lambda x, y: sea.turbulence(x, y, day) + sea.mean_dynamic_topography(x, y)  # noqa: E731 - closes over day
    slope_x, slope_y = fourth_order_slopes(level, lon, lat)
    u, v = sea.velocity_anomaly(lon, lat, day)
    mean_u, mean_v = sea.mean_velocity(lon, lat)
    waves_u, waves_v = (sea.kelvin.velocity(lon, lat, day)[n] + sea.rossby.velocity(lon, lat, day)[n] for n in (0, 1))
    ratio = gravity(lat) / coriolis_parameter(lat)
    np.testing.assert_allclose(u + mean_u - waves_u, -ratio * slope_y, atol=3e-3)
    np.testing.assert_allclose(v + mean_v - waves_v, ratio * slope_x, atol=3e-3)


def test_mean_is_flat_at_the_equator(sea):
    lon = np.linspace(-37, -9, 200)
    slope_x, slope_y = fourth_order_slopes(sea.mean_dynamic_topography, lon, np.zeros(200))
    assert np.abs(slope_x).max() < 1e-12
    assert np.abs(slope_y).max() < 1e-11  # g/f at half a degree times this is 1e-4 m/s


def test_mean_current_is_balanced_on_the_equatorial_beta_plane(sea):
    lon = np.linspace(-37, -9, 100)
    zero, (_, north) = np.zeros(100), metres_per_degree(np.zeros(100))
    h = sea.mean_dynamic_topography
    curvature = (h(lon, zero + 0.1) - 2 * h(lon, zero) + h(lon, zero - 0.1)) / (0.1 * north) ** 2
    beta = coriolis_parameter(np.asarray(1e-3)) / (1e-3 * north)
    u, v = sea.mean_velocity(lon, zero)
    np.testing.assert_allclose(u, -gravity(zero) / beta * curvature, atol=1e-3)
    np.testing.assert_allclose(v, 0, atol=1e-6)


def test_mean_flow_runs_along_the_coast_not_through_it(sea):
    lat = np.linspace(-8, 16, 500)
    coast = sea.land.coastline(lat, smooth=True)
    lon = coast + 0.05  # 5 km offshore
    u, v = sea.mean_velocity(lon, lat)
    ahead = sea.land.coastline(lat + 0.01, smooth=True)
    along = np.array([(ahead - coast) * np.cos(np.radians(lat)), np.full(lat.size, 0.01)])
    along /= np.hypot(*along)
    through = u * along[1] - v * along[0]
    jet_u, jet_v = sea.mean_velocity(coast + 0.33, lat)
    assert np.abs(through).max() < 0.03
    assert np.hypot(jet_u, jet_v)[lat > 8].min() > 0.3
    assert jet_v[lat > 5].min() > 0


def test_truth_is_finite_at_sea_and_moderate(sea, places):
    lon, lat, day = places
    u, v = (
        np.add(*parts) for parts in zip(sea.velocity_anomaly(lon, lat, day), sea.mean_velocity(lon, lat), strict=True)
    )
    assert np.isfinite(u).all()
    assert np.isfinite(v).all()
    assert np.percentile(np.hypot(u, v), 99) < 1.5


def test_no_seam_where_eddies_fade_out(sea, tiny):
    # the fade has two continuous derivatives: velocity changes by little from one step of 0.01 degree to the next
    lat = np.arange(3.0, 9.0, 0.01)
    u, v = sea.velocity_anomaly(np.full(lat.size, -25.0), lat, np.full(lat.size, day_number(DAY)))
    assert np.abs(np.diff(u)).max() < 0.02
    assert np.abs(np.diff(v)).max() < 0.02


def test_eddies_are_where_the_table_says(sea, tiny):
    table = truth.eddies_at_noon(sea.eddies, tiny.truth_box, DAY)
    lon, lat = table["longitude"], table["latitude"]
    day = np.full(lon.size, day_number(DAY) + 0.5)
    assert lon.size > 5
    north = metres_per_degree(lat)[1]
    level = [sea.eddies.sea_level(lon, lat + side * table["radius"] / north, day) for side in (-1, 0, 1)]
    # neighbours' tails add to an eddy; in the middle of the population they stay small
    assert np.median(np.abs(level[1] / table["amplitude"] - 1)) < 0.02
    assert np.median(np.abs((level[0] + level[2]) / 2 / table["amplitude"] / np.exp(-0.5) - 1)) < 0.1


def test_eddies_drift_westward_faster_near_the_equator(sea):
    metres = sea.eddies.eastward_drift * metres_per_degree(sea.eddies.latitude)[0] / 86400
    far = np.abs(sea.eddies.latitude) > 15
    assert metres.min() > -0.25
    assert metres.max() < -0.03
    assert metres[~far].mean() < metres[far].mean() - 0.03


def test_eddies_of_both_signs_die_before_the_coast(sea):
    lon, lat = sea.eddies.centre(sea.eddies.death)
    assert (lon > sea.land.coastline(lat)).all()
    assert 0.35 < (sea.eddies.amplitude > 0).mean() < 0.65


def test_sea_level_does_not_depend_on_how_points_are_grouped(sea, places):
    lon, lat, day = places
    together = sea.sea_level_anomaly(lon, lat, day)
    order = np.argsort(lat)
    apart = np.empty_like(together)
    apart[order] = sea.sea_level_anomaly(lon[order], lat[order], day[order])
    np.testing.assert_allclose(together, apart, atol=1e-7)
