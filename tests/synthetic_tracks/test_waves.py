from __future__ import annotations

import numpy as np
import pytest

from synthetic_tracks.waves import BETA, EAST, GRAVITY, NORTH, random_background

LAT = np.linspace(-9, 9, 181)
LON, DAY = np.full(181, -27.0), np.full(181, 11385.3)
STEP = 1e-3


def derivatives(function, axis):
    """Centred difference of a function of (lon, lat, day) along an axis, per metre or second."""
    steps = np.eye(3)[axis] * (STEP if axis < 2 else 1e-4)
    scale = (EAST, NORTH, 86400.0)[axis] * 2 * steps.sum()
    return (function(LON + steps[0], LAT + steps[1], DAY + steps[2])
            - function(LON - steps[0], LAT - steps[1], DAY - steps[2])) / scale  # fmt: skip


@pytest.mark.parametrize("name", ["kelvin", "rossby"])
def test_waves_obey_the_linear_equations_on_the_beta_plane(sea, name):
    wave = getattr(sea, name)
    u, v = wave.velocity(LON, LAT, DAY)
    f, depth = BETA * LAT * NORTH, wave.speed**2 / GRAVITY
    u_t, v_t = (derivatives(lambda *p, n=n: wave.velocity(*p)[n], 2) for n in (0, 1))
    east_momentum = u_t - f * v + GRAVITY * derivatives(wave.sea_level, 0)
    north_momentum = v_t + f * u + GRAVITY * derivatives(wave.sea_level, 1)
    divergence = derivatives(lambda *p: wave.velocity(*p)[0], 0) + derivatives(lambda *p: wave.velocity(*p)[1], 1)
    continuity = derivatives(wave.sea_level, 2) + depth * divergence
    largest = np.abs(f * u).max()
    assert np.abs(east_momentum).max() < 1e-4 * largest
    assert np.abs(north_momentum).max() < 1e-4 * largest
    assert np.abs(continuity).max() < 1e-4 * np.abs(depth * divergence).max() + 1e-12


def test_kelvin_current_is_g_eta_over_c(sea):
    u, v = sea.kelvin.velocity(LON, LAT, DAY)
    np.testing.assert_allclose(u, 9.7803253359 / 2.5 * sea.kelvin.sea_level(LON, LAT, DAY), rtol=1e-12)
    assert not v.any()


@pytest.mark.parametrize(("name", "speed"), [("kelvin", 2.5), ("rossby", -2.5 / 3)])
def test_phase_speed(sea, name, speed):
    # the Rossby wave is slower than its long-wave limit c/3, but not by much at this wavelength
    wave = getattr(sea, name)
    lat, hours = np.full(2000, 2.0), 24.0
    lon = np.linspace(-60, 20, 2000)
    before, after = (wave.sea_level(lon, lat, np.full(2000, 11385.0 + d)) for d in (0, hours / 24))
    shifts = np.linspace(-3, 3, 1201)
    inner = np.abs(lon + 20) < 30
    misfit = [np.abs(np.interp(lon[inner] - s, lon, before) - after[inner]).max() for s in shifts]
    moved = shifts[int(np.argmin(misfit))] * EAST / (hours * 3600)
    assert moved == pytest.approx(speed, rel=0.2)


@pytest.mark.parametrize("name", ["kelvin", "rossby"])
def test_amplitude(sea, name):
    lon, lat = (a.ravel() for a in np.meshgrid(np.linspace(0, 80, 400), LAT))
    level = getattr(sea, name).sea_level(lon, lat, np.full(lon.size, 11385.0))
    assert np.abs(level).max() == pytest.approx(0.04, rel=1e-3)


def test_background_has_its_standard_deviation_and_moves_west():
    values = {"waves": 60, "standard_deviation_m": 0.02, "wavelength_km": [250, 700], "westward_speed": 0.1}
    background = random_background(values, 10.0, np.random.default_rng(3))
    rng = np.random.default_rng(4)
    lon, lat, day = rng.uniform(-200, 200, 4000), rng.uniform(-200, 200, 4000), np.full(4000, 11385.0)
    level = background.sea_level(lon, lat, day)
    assert level.std() == pytest.approx(0.02, rel=0.06)  # four standard errors
    later = background.sea_level(lon - 0.1 * 10 * 86400 / (1e3 * 109.64), lat, day + 10)
    np.testing.assert_allclose(later, level, atol=1e-4)
