"""The eddy store: ragged arrays as CF has them, the same content in two orders."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from setdrift.data.configuration import Configuration
from setdrift.data.conventions import EDDY_COLUMNS
from setdrift.data.eddy_product import CONTOURS, detections_dataset, publish_eddy_store, trajectories_dataset

Days = dict[dt.date, xr.Dataset]
Identifiers = dict[dt.date, np.ndarray]
NOW = dt.datetime(2031, 3, 21, 6, 0, tzinfo=dt.UTC)
FIRST = dt.date(2031, 3, 1)
OWNERS = [[70, 30], [], [30, 90, 70], [90]]


def day_of(count: int, seed: int) -> xr.Dataset:
    """Make a day of eddies with contours of 3 to 9 points."""
    random = np.random.default_rng(seed)
    columns = {column.name: ("eddy", random.normal(size=count)) for column in EDDY_COLUMNS}
    columns["polarity"] = ("eddy", random.choice([-1, 1], count))
    for contour in CONTOURS:
        size = random.integers(3, 10, count)
        columns[f"{contour}_size"] = ("eddy", size)
        for axis in ("latitude", "longitude"):
            columns[f"{contour}_{axis}"] = (f"{contour}_node", random.normal(size=size.sum()))
    return xr.Dataset(columns)


def made(owners: list[list[int]]) -> tuple[Days, Identifiers]:
    days = {FIRST + dt.timedelta(days=n): day_of(len(owner), n) for n, owner in enumerate(owners)}
    return days, {day: np.array(owner, np.int64) for day, owner in zip(days, owners, strict=True)}


@pytest.fixture
def detections() -> xr.Dataset:
    return detections_dataset(*made(OWNERS))


def test_detections_are_in_the_order_of_days(detections: xr.Dataset) -> None:
    days, _ = made(OWNERS)
    noon = [(FIRST - dt.date(1970, 1, 1)).days * 24 + 12 + 24 * n for n in (0, 0, 2, 2, 2, 3)]
    assert detections["time"].values.tolist() == noon
    assert detections["trajectory"].values.tolist() == [30, 70, 90]
    assert detections["trajectory"].values[detections["trajectory_index"].values].tolist() == [70, 30, 30, 90, 70, 90]
    for column in EDDY_COLUMNS:
        whole = np.concatenate([day[column.name].values for day in days.values()])
        np.testing.assert_allclose(detections[column.name], whole, rtol=1e-6)
    assert detections["trajectory_index"].attrs["instance_dimension"] == "trajectory"
    assert detections["trajectory"].attrs["cf_role"] == "trajectory_id"
    assert detections.attrs["featureType"] == "trajectory"


@pytest.mark.parametrize("contour", CONTOURS)
def test_contours_are_geometry_containers(detections: xr.Dataset, contour: str) -> None:
    container = detections[f"{contour}_contour"].attrs
    count = detections[container["node_count"]]
    latitude, longitude = (detections[name] for name in container["node_coordinates"].split())
    assert count.dims == ("detection",)
    assert count.values.sum() == latitude.size == longitude.size
    assert (latitude.attrs["axis"], longitude.attrs["axis"]) == ("Y", "X")
    third = np.split(latitude.values, np.cumsum(count.values)[:-1])[2]
    day = made(OWNERS)[0][FIRST + dt.timedelta(days=2)]
    np.testing.assert_allclose(third, day[f"{contour}_latitude"].values[: day[f"{contour}_size"].values[0]], rtol=1e-6)


def test_trajectories_are_the_same_content_reordered(detections: xr.Dataset) -> None:
    trajectories = trajectories_dataset(detections)
    assert trajectories["row_size"].values.tolist() == [2, 2, 2]
    assert trajectories["row_size"].values.sum() == trajectories.sizes["point"] == detections.sizes["detection"]
    assert trajectories["row_size"].attrs["sample_dimension"] == "point"
    order = trajectories["detection"].values
    assert sorted(order.tolist()) == list(range(6))
    owner = np.repeat(trajectories["trajectory"].values, trajectories["row_size"].values)
    np.testing.assert_array_equal(owner, detections["trajectory"].values[detections["trajectory_index"].values][order])
    for name in ("time", "polarity", *(column.name for column in EDDY_COLUMNS)):
        np.testing.assert_array_equal(trajectories[name], detections[name].values[order])
        assert trajectories[name].attrs == detections[name].attrs
    for points in np.split(trajectories["time"].values, np.cumsum(trajectories["row_size"].values)[:-1]):
        assert np.all(np.diff(points) > 0)


@pytest.mark.parametrize("owners", [OWNERS, [[], []]], ids=["some", "none"])
@pytest.mark.parametrize("zarr_format", [3, 2])
def test_store_opens_as_a_tree(
    configure: Callable[..., Configuration], owners: list[list[int]], zarr_format: int
) -> None:
    configuration = configure(publish__zarr_format=zarr_format)
    days, identifiers = made(owners)
    assert publish_eddy_store(configuration, days, identifiers, "a", NOW)
    expected = detections_dataset(days, identifiers)
    with xr.open_datatree(configuration.products / "eddies.zarr", engine="zarr") as tree:
        assert tree.attrs["source_digest"] == "a"
        assert "navigation" in tree.attrs["caution"]
        assert set(tree.children) == {"detections", "trajectories"}
        found = tree["detections"].to_dataset().load()
        for name in expected.variables:
            if name != "time":
                np.testing.assert_array_equal(found[name], expected[name])
                assert found[name].dtype == expected[name].dtype
        assert found["time"].dtype.kind == "M"
        assert {"time", "latitude", "longitude"} <= set(found.coords)
        assert tree["trajectories"].to_dataset().sizes["trajectory"] == expected.sizes["trajectory"]


@pytest.mark.parametrize("zarr_format", [3, 2])
def test_unchanged_store_is_left_as_it_is(configure: Callable[..., Configuration], zarr_format: int) -> None:
    configuration = configure(publish__zarr_format=zarr_format)
    store = configuration.products / "eddies.zarr"

    def marks() -> dict[Path, int]:
        return {path: path.stat().st_ino for path in store.rglob("*")}

    assert publish_eddy_store(configuration, *made(OWNERS), "a", NOW)
    before = marks()
    assert not publish_eddy_store(configuration, *made(OWNERS), "a", NOW + dt.timedelta(days=1))
    assert marks() == before
    assert publish_eddy_store(configuration, *made(OWNERS[:1]), "b", NOW)
    with xr.open_datatree(store, engine="zarr") as tree:
        assert tree["detections"].sizes["detection"] == 2
    other = configure(publish__zarr_format=5 - zarr_format)
    assert publish_eddy_store(other, *made(OWNERS[:1]), "b", NOW)
    assert not publish_eddy_store(other, *made(OWNERS[:1]), "b", NOW)
