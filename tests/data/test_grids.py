"""The analysis grid, its padding, and the area of the observations."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from setdrift.data.configuration import Configuration
from setdrift.data.grids import STENCIL_CELLS, Area, analysis_grid, observation_area, working_grid

Configure = Callable[..., Configuration]
BOXES: dict[str, dict[str, Any]] = {
    "north": {"west": -30, "east": -26, "south": 20, "north": 23, "spacing": 0.5},
    "dateline": {"west": 176, "east": -176, "south": -40, "north": -30, "spacing": 0.25},
    "equator": {"west": -30, "east": -10, "south": 2, "north": 9, "spacing": 0.25},
    "ring": {"west": -180, "east": 180, "south": 20, "north": 40, "spacing": 1},
    "globe": {"west": 0, "east": 360, "south": -90, "north": 90, "spacing": 2},
    "pole": {"west": 0, "east": 40, "south": 80, "north": 90, "spacing": 1},
    "nearly round": {"west": -180, "east": 179, "south": 20, "north": 40, "spacing": 1},
    "thirds": {"west": 0.1, "east": 10.1, "south": 20.2, "north": 30.2, "spacing": 0.1},
}


@pytest.mark.parametrize("name", BOXES)
def test_points_are_the_centres_of_the_boxes_cells(configure: Configure, name: str) -> None:
    box = BOXES[name]
    grid = analysis_grid(configure(grid=box))
    half = box["spacing"] / 2
    assert grid.latitude[0] == pytest.approx(box["south"] + half)
    assert grid.latitude[-1] == pytest.approx(box["north"] - half)
    assert grid.longitude[0] == pytest.approx(box["west"] + half)
    assert (grid.longitude[-1] - box["east"] + half) % 360 == pytest.approx(0, abs=1e-9)
    for axis in (grid.latitude, grid.longitude):
        np.testing.assert_allclose(np.diff(axis), box["spacing"])
    assert grid.shape == (grid.latitude.size, grid.longitude.size)


@pytest.mark.parametrize("name", BOXES)
def test_working_grid_holds_it(configure: Configure, name: str) -> None:
    configuration = configure(grid=BOXES[name])
    inner, outer = analysis_grid(configuration), working_grid(configuration)
    rows, columns = outer.window(inner)
    np.testing.assert_allclose(outer.latitude[rows], inner.latitude, atol=1e-9)
    np.testing.assert_allclose(outer.longitude[columns], inner.longitude, atol=1e-9)
    assert np.all(np.abs(outer.latitude) < 90)
    np.testing.assert_allclose(np.diff(outer.longitude), inner.spacing)
    assert outer.longitude.size * inner.spacing <= 360.0
    assert outer.periodic == inner.periodic == (name in {"ring", "globe"})


@pytest.mark.parametrize(
    ("name", "pads"),
    [
        ("north", (4, 4, 4)),
        ("equator", (32, 4, 4)),  # to 6 degrees south: eight degrees
        ("ring", (4, 4, 0)),
        ("globe", (0, 0, 0)),
        ("pole", (4, 0, 4)),
        ("nearly round", (4, 4, 0)),
    ],
)
def test_pads_are_as_wide_as_needed(configure: Configure, name: str, pads: tuple[int, int, int]) -> None:
    configuration = configure(grid=BOXES[name])
    inner, outer = analysis_grid(configuration), working_grid(configuration)
    rows, columns = outer.window(inner)
    assert (rows.start, outer.latitude.size - rows.stop, columns.start) == pads
    assert outer.longitude.size - columns.stop == pads[2]
    assert STENCIL_CELLS == 4


def test_band_reaches_as_far_as_configured(configure: Configure) -> None:
    wide = {"band_degrees": 9, "blend_to_degrees": 8}
    grid = working_grid(configure(grid=BOXES["equator"], currents=wide))
    assert grid.latitude[0] == pytest.approx(-9 + 0.125)
    beyond = BOXES["equator"] | {"south": 8.5, "north": 12.5}
    assert working_grid(configure(grid=beyond, currents=wide)).latitude[0] == pytest.approx(8.5 + 0.125 - 1)


def test_area_holds_positions_in_any_convention() -> None:
    area = Area(170.0, 20.0, -10.0, 10.0)
    longitude = np.array([175.0, -175.0, 185.0, 169.9, -169.9, 535.0])
    np.testing.assert_array_equal(area.holds(longitude, np.zeros(6)), [True, True, True, False, False, True])
    np.testing.assert_array_equal(area.holds(np.full(3, 180.0), np.array([-10.0, 10.0, 10.1])), [True, True, False])
    assert Area(-180.0, 360.0, -90.0, 90.0).holds(np.array([-180.0, 179.999, 360.0]), np.zeros(3)).all()


@pytest.mark.parametrize("name", BOXES)
def test_observations_are_taken_from_all_round_the_grid(configure: Configure, name: str) -> None:
    configuration = configure(grid=BOXES[name])
    grid, area = working_grid(configuration), observation_area(configuration)
    longitude, latitude = np.meshgrid(grid.longitude, grid.latitude)
    assert area.holds(longitude, latitude).all()
    # two zero crossings of the covariance at these latitudes are more than 190 km
    reach = 190.0 / 111.2
    assert area.south <= max(grid.latitude[0] - reach, -90)
    assert area.north >= min(grid.latitude[-1] + reach, 90)
    assert -90 <= area.south < area.north <= 90
    if name in {"ring", "globe", "pole", "nearly round"}:
        assert area.width == 360
    else:
        narrow = reach / np.cos(np.deg2rad(np.abs(grid.latitude).max()))
        assert area.width >= grid.longitude[-1] - grid.longitude[0] + 2 * narrow


def test_longer_scales_reach_farther(configure: Configure) -> None:
    near = observation_area(configure(grid=BOXES["north"]))
    far = observation_area(
        configure(grid=BOXES["north"], mapping__zonal_scale_km=900, mapping__meridional_scale_km=500)
    )
    assert far.width > near.width
    assert far.north > near.north
