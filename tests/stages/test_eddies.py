"""Eddies of the small sea are the planted ones."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from tiny_analysis import FIRST, HIGH, KM_PER_DEGREE, LOW, Vortex, analysis_of, run_chain, tiny, write_sea

from setdrift.data.configuration import Configuration

Configure = Callable[..., Configuration]


def test_planted_eddies_are_found_with_their_polarity(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    for n in range(3):
        day = FIRST + dt.timedelta(days=n)
        found = analysis_of(configuration, "eddies", day)
        assert found["polarity"].values.tolist() == [-1, 1]
        for k, vortex in enumerate((LOW, HIGH)):
            east = (found["longitude"].values[k] - vortex.centre(day)) * KM_PER_DEGREE * np.cos(np.deg2rad(28))
            north = (found["latitude"].values[k] - vortex.latitude) * KM_PER_DEGREE
            assert np.hypot(east, north) < 5.0
            assert found["extremum"].values[k] == pytest.approx(vortex.height, abs=0.01)
            assert 0.8 * abs(vortex.height) < found["amplitude"].values[k] < abs(vortex.height) + 0.01
            # flow is fastest one radius from the centre; half-degree cells blur that
            assert 0.7 * vortex.radius_km < found["fastest_rotation_radius"].values[k] / 1e3 < 1.3 * vortex.radius_km
            assert np.sign(found["rossby_number"].values[k]) == -np.sign(vortex.height)


def test_contours_hold_their_nodes(analysed_sea: Path, configure: Configure) -> None:
    found = analysis_of(tiny(configure), "eddies", FIRST)
    for contour in ("outer", "fastest"):
        size = found[f"{contour}_size"].values
        assert size.sum() == found.sizes[f"{contour}_node"]
        longitude = np.split(found[f"{contour}_longitude"].values, np.cumsum(size)[:-1])
        latitude = np.split(found[f"{contour}_latitude"].values, np.cumsum(size)[:-1])
        for k in range(2):
            assert longitude[k].min() < found["longitude"].values[k] < longitude[k].max()
            assert latitude[k].min() < found["latitude"].values[k] < latitude[k].max()


def test_topography_may_be_searched_instead(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure, eddies__field="dynamic_topography")
    run_chain(configuration)
    found = analysis_of(configuration, "eddies", FIRST)
    # on a slope that rises northward a high stands out less, and the mean of about 0.56 m counts
    assert found["polarity"].values.tolist() == [-1, 1]
    assert found["extremum"].values[1] == pytest.approx(0.25 + 0.02 * HIGH.latitude, abs=0.03)
    assert found["latitude"].values[1] > HIGH.latitude


def test_eddies_centred_in_the_padding_do_not_count(tmp_path: Path, configure: Configure) -> None:
    inside, outside = Vortex(-28.0, 27.5, 0.25, 60.0), Vortex(-32.4, 27.5, 0.25, 60.0)
    write_sea(tmp_path, vortices=(inside, outside))
    configuration = tiny(configure, period__end="2031-03-01")
    run_chain(configuration)
    found = analysis_of(configuration, "eddies", FIRST)
    assert found.sizes["eddy"] == 1
    assert found["longitude"].values[0] == pytest.approx(-28.0, abs=0.1)
    assert found["outer_size"].values.sum() == found.sizes["outer_node"]
    # moved by its own width, the box holds the other one alone: each eddy counts in one box
    west = {"west": -40, "east": -32, "south": 24, "north": 31, "spacing": 0.5}
    configuration = tiny(configure, period__end="2031-03-01", grid=west)
    run_chain(configuration)
    assert analysis_of(configuration, "eddies", FIRST)["longitude"].values == pytest.approx([-32.4], abs=0.1)


def test_limits_are_the_configured_ones(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure, eddies__minimum_amplitude_m=0.22)
    run_chain(configuration)
    assert analysis_of(configuration, "eddies", FIRST)["polarity"].values.tolist() == [1]
    configuration = tiny(configure, eddies__maximum_radius_km=60)
    run_chain(configuration)
    assert np.all(analysis_of(configuration, "eddies", FIRST)["equal_area_radius"] <= 60e3)
    configuration = tiny(configure, eddies__equatorial_exclusion_degrees=28)
    run_chain(configuration)
    assert analysis_of(configuration, "eddies", FIRST)["polarity"].values.tolist() == [1]
