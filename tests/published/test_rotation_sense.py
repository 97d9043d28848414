"""Low sea level turns counter-clockwise in the northern and clockwise in the southern hemisphere."""

from __future__ import annotations

import numpy as np
import pytest

from setdrift.numerics.eddy_detection import ANTICYCLONIC, CYCLONIC, EddyLimits, detect_eddies
from setdrift.numerics.geostrophy import geostrophic_velocity


@pytest.mark.source("Gill (1982), Atmosphere-Ocean Dynamics, section 7.6 (from memory): flow round lows is cyclonic")
@pytest.mark.parametrize(
    ("middle", "sign", "polarity", "anticlockwise"),
    [
        (30.0, -1, CYCLONIC, True),
        (30.0, 1, ANTICYCLONIC, False),
        (-30.0, -1, CYCLONIC, False),
        (-30.0, 1, ANTICYCLONIC, True),
    ],
    ids=["northern low", "northern high", "southern low", "southern high"],
)
def test_sense_of_rotation(middle, sign, polarity, anticlockwise):
    latitude, longitude = middle + 0.25 * np.arange(-20, 21), 0.25 * np.arange(41)
    x, y = (longitude - 5)[None, :] * np.cos(np.deg2rad(middle)), (latitude - middle)[:, None]
    height = 0.2 * sign * np.exp(-(x**2 + y**2) / (2 * 0.7**2))
    velocity = geostrophic_velocity(height, latitude, longitude)
    eddies = detect_eddies(height, latitude, longitude, velocity.eastward, velocity.northward, limits=EddyLimits())
    np.testing.assert_array_equal(eddies.polarity, [polarity])
    # exact: just east of the middle anticlockwise flow goes north, just north of it west
    assert np.sign(velocity.northward[20, 22]) == (1 if anticlockwise else -1)
    assert np.sign(velocity.eastward[22, 20]) == (-1 if anticlockwise else 1)
    # the detected rotation: vorticity of the planet's sign is cyclonic
    assert np.sign(eddies.rossby_number[0]) == -polarity
    assert np.sign(eddies.rossby_number[0] * middle) == (1 if anticlockwise else -1)
    assert eddies.rotation_speed[0] > 0
