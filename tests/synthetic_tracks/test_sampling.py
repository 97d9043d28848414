from __future__ import annotations

from datetime import date, timedelta

import numpy as np
import pytest

from synthetic_tracks.sampling import observe, orbit_of
from synthetic_tracks.scenario import day_number

DAY = date(2031, 3, 5)  # the middle one of the tiny scenario


@pytest.fixture(scope="module")
def days(tiny, sea):
    """Three days of observations of every altimeter."""
    return {a.name: [observe(tiny, sea, a, day) for day in tiny.observed_days] for a in tiny.altimeters}


def joined(days, name):
    return np.concatenate([getattr(o, name) for o in days])


def test_points_lie_on_the_track_in_the_domain(tiny, days):
    for altimeter in tiny.altimeters:
        o = days[altimeter.name][1]
        track = orbit_of(altimeter).ground_track((o.day - day_number(DAY.replace(month=1, day=1))) * 86400)
        np.testing.assert_allclose(o.longitude, track.longitude, atol=1e-5)
        np.testing.assert_allclose(o.latitude, track.latitude, atol=1e-5)
        assert (o.longitude >= -47).all() & (o.longitude <= -9).all() & (o.latitude >= -16).all()
        assert (np.diff(o.day) > 0).all()
        assert (np.floor(o.day) == day_number(DAY)).all()


def test_points_are_six_to_seven_kilometres_apart(days):
    for name in days:
        o = days[name][1]
        north = np.diff(o.latitude) * 110.6
        east = np.diff(o.longitude) * 111.3 * np.cos(np.radians(o.latitude[1:]))
        assert 5.8 < np.median(np.hypot(east, north)) < 7.0


def test_measured_is_truth_and_errors_at_sea_and_wild_on_land(tiny, sea, days):
    for altimeter in tiny.altimeters:
        o = days[altimeter.name][0]
        np.testing.assert_allclose(o.truth, sea.sea_level_anomaly(o.longitude, o.latitude, o.day), atol=1e-7)
        sea_points = ~o.land & (o.spike == 0)
        error = (o.measured - o.truth - o.noise - o.long_wave)[sea_points]
        np.testing.assert_allclose(error, altimeter.bias_m, atol=1e-12)
        assert o.land.any()
        assert np.abs(o.measured[o.land]).min() > 0.5


def test_noise_is_white_and_of_its_size(tiny, days):
    for altimeter in tiny.altimeters:
        noise = joined(days[altimeter.name], "noise")
        # five standard errors
        assert noise.std() == pytest.approx(altimeter.noise_m, rel=5 / np.sqrt(2 * noise.size))
        assert abs(np.corrcoef(noise[1:], noise[:-1])[0, 1]) < 5 / np.sqrt(noise.size)


def test_long_wave_error_is_smooth_and_of_its_size(tiny, days):
    ratios, correlations = [], []
    for altimeter in tiny.altimeters:
        for o in days[altimeter.name]:
            for number in np.unique(o.pass_number):
                along = o.long_wave[o.pass_number == number] / altimeter.long_wave_m
                assert np.abs(np.diff(along)).max(initial=0) < 0.5  # a gap of 120 s at most
                ratios.append(np.mean(along**2))
                if along.size > 250:
                    correlations.append((along[0] * along[230], along[0] ** 2))  # 1500 km apart
    # about 100 independent passes: three standard errors of the variance are 0.4
    assert np.mean(ratios) == pytest.approx(1, abs=0.4)
    products = np.mean(correlations, axis=0)
    assert products[0] / products[1] == pytest.approx(np.exp(-0.5), abs=0.35)


def test_a_pass_over_midnight_keeps_its_long_wave_error(tiny, sea):
    # chance must depend on the pass, not on the day its points are filed under
    for altimeter in tiny.altimeters:
        for first, second in zip(tiny.observed_days, tiny.observed_days[1:], strict=False):
            before, after = (observe(tiny, sea, altimeter, day) for day in (first, second))
            if before.pass_number[-1] == after.pass_number[0] and after.day[0] - before.day[-1] < 5 / 86400:
                step = abs(after.long_wave[0] - before.long_wave[-1])
                assert step < 1e-3


def test_biases_do_not_cancel(tiny):
    biases = [a.bias_m for a in tiny.altimeters]
    assert abs(sum(biases)) > 0.01
    assert max(np.abs(biases)) <= 0.03


def test_spikes_are_rare_large_and_sometimes_double(tiny, days):
    spikes = np.concatenate([joined(days[name], "spike") for name in days])
    hit = spikes != 0
    # about 25,000 points and 75 spikes: four standard errors
    assert hit.mean() == pytest.approx(0.003, abs=0.0018)
    assert np.abs(spikes[hit]).min() >= 0.3
    assert np.abs(spikes[hit]).max() <= 3.0
    assert (hit[1:] & hit[:-1]).any()


def test_flags_mark_only_spikes(days):
    for name in days:
        for o in days[name]:
            assert (o.spike[o.flagged] != 0).all()
    assert any(o.flagged.any() for o in days["plover"] + days["curlew"])
    assert not any(o.flagged.any() for o in days["heron"] + days["dunlin"])


def test_some_passes_have_gaps(tiny, sea):
    # about 160 passes, of which a tenth have a gap between points of the domain
    seconds = []
    for altimeter in tiny.altimeters[:2]:
        for later in range(20):
            o = observe(tiny, sea, altimeter, DAY + timedelta(days=later))
            seconds.append(np.diff(o.day)[np.diff(o.pass_number) == 0] * 86400)
    gaps = np.concatenate(seconds)
    assert (gaps > 10).sum() >= 5
    assert gaps.max() < 130
