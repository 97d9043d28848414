"""Each dialect is read back with netCDF4 alone and compared with what was sampled."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest
from netCDF4 import Dataset

from synthetic_tracks import dialects
from synthetic_tracks.sampling import observe
from synthetic_tracks.scenario import day_number

DAY = date(2031, 3, 5)  # the middle one of the tiny scenario

STANDARD = "sea_surface_height_above_mean_sea_level"


@pytest.fixture
def written(tiny, sea, tmp_path):
    """Write one day of an altimeter; return what was sampled and the opened file."""

    def write(name):
        altimeter = next(a for a in tiny.altimeters if a.name == name)
        sampled = observe(tiny, sea, altimeter, DAY)
        path = dialects.file_of(tmp_path, altimeter, DAY)
        dialects.write(path, altimeter, DAY, sampled)
        assert path.name == f"{name}_20310305.nc"
        return sampled, Dataset(path)

    return write


def named(data, standard_name):
    (variable,) = [v for v in data.variables.values() if getattr(v, "standard_name", "") == standard_name]
    return variable


def test_heron(written):
    sampled, data = written("heron")
    assert named(data, "time").units == "days since 2000-01-01"
    np.testing.assert_array_equal(named(data, "time")[:], sampled.day)
    np.testing.assert_array_equal(named(data, "longitude")[:], sampled.longitude)
    height = named(data, STANDARD)
    assert height.units == "m"
    np.testing.assert_array_equal(np.ma.getmaskarray(height[:]), sampled.land)
    np.testing.assert_allclose(height[:][~sampled.land], sampled.measured[~sampled.land], atol=1e-6)
    np.testing.assert_array_equal(data["pass_number"][:], sampled.pass_number)
    np.testing.assert_array_equal(data["cycle_number"][:], sampled.cycle)


def test_plover(written):
    sampled, data = written("plover")
    time, lon, height = named(data, "time"), named(data, "longitude"), named(data, STANDARD)
    assert time.units == "seconds since 2000-01-01 00:00:00"
    np.testing.assert_allclose(time[:], sampled.day * 86400, atol=1e-5)
    assert lon[:].min() > 180
    np.testing.assert_allclose(lon[:] - 360, sampled.longitude, atol=1e-6)
    assert height.dtype == np.int16
    np.testing.assert_allclose(height[:], sampled.measured, atol=2.6e-4)
    good = named(data, "quality_flag")[:] == 0
    np.testing.assert_array_equal(good, ~(sampled.land | sampled.flagged))


def test_curlew(written):
    sampled, data = written("curlew")
    assert not any(hasattr(v, "standard_name") for v in data.variables.values())
    assert "pass" not in " ".join(data.variables)
    assert data["epoch"].units == "minutes since 2031-01-01 00:00:00"
    np.testing.assert_allclose(
        day_number(DAY.replace(month=1, day=1)) + data["epoch"][:] / 1440, sampled.day, atol=1e-9
    )
    corrections = [data["air_pressure_effect"][:], data["sea_tide"][:]]
    assert all(v.std() > 1 for v in corrections)  # centimetres: forgetting one would be seen
    assert {data[v].units for v in ("ssh_raw", "air_pressure_effect", "sea_tide")} == {"cm"}
    np.testing.assert_allclose((data["ssh_raw"][:] - sum(corrections)) / 100, sampled.measured, atol=1e-6)
    bits = data["bits"][:]
    np.testing.assert_array_equal((bits & 5) == 0, ~(sampled.land | sampled.flagged))
    assert ((bits & 2) != 0).any()


def test_dunlin(written):
    sampled, data = written("dunlin")
    time, height = named(data, "time"), named(data, STANDARD)
    assert time.units == "hours since 2031-01-01 00:00:00"
    assert (height.units, height.dtype, height._FillValue) == ("mm", np.int32, -2147483648)
    assert "pass" not in " ".join(data.variables)
    assert (np.diff(time[:]) < 0).sum() >= 3
    order = np.argsort(time[:])
    np.testing.assert_allclose(height[:][order] / 1000, sampled.measured, atol=5.1e-4)
    np.testing.assert_allclose(named(data, "latitude")[:][order], sampled.latitude, atol=1e-12)


def test_every_file_says_that_it_is_invented(written):
    for name in dialects.WRITERS:
        _, data = written(name)
        assert "invented" in data.title
        assert data.Conventions == "CF-1.11"
        assert "truth" not in " ".join(data.variables)
