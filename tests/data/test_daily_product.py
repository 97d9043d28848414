"""The daily store: what is committed, in which order, and what readers see."""

from __future__ import annotations

import datetime as dt
import json

import numpy as np
import pytest
import xarray as xr

from setdrift.data.conventions import DAILY_VARIABLES, METRE_STEP
from setdrift.data.daily_product import DailyProduct
from setdrift.data.days import days_between
from setdrift.data.grids import analysis_grid
from setdrift.data.product_store import is_chunk

NOW = dt.datetime(2031, 3, 21, 6, 0, tzinfo=dt.UTC)
FIRST = dt.date(2031, 3, 1)


def fields(configuration, seed):
    shape = analysis_grid(configuration).shape
    values = {}
    for number, variable in enumerate(DAILY_VARIABLES):
        random = np.random.default_rng([seed, number])
        values[variable.name] = random.normal(size=shape) if variable.step else random.integers(0, 2, shape)
    return values


def product(configuration, load=None, fixed_seed=99):
    load = load or (lambda day: fields(configuration, day.toordinal()))
    return DailyProduct(configuration, fields(configuration, fixed_seed), load, NOW)


def sources(days, version="a"):
    return {day: f"{version}{day}" for day in days}


def snapshot(folder):
    return {str(p.relative_to(folder)): p.read_bytes() for p in sorted(folder.rglob("*")) if p.is_file()}


@pytest.fixture(params=[3, 2])
def configuration(request, configure):
    return configure(publish__zarr_format=request.param)


def test_first_publication_reads_back_rounded(configuration):
    days = days_between(FIRST, dt.date(2031, 3, 3))
    account = product(configuration).publish(sources(days))
    assert account == {"added": days, "rewritten": [], "retired": []}
    for consolidated in (True, False):
        with xr.open_zarr(configuration.products / "daily.zarr", consolidated=consolidated) as store:
            assert [str(t)[:13] for t in store.time.values] == [f"{day}T12" for day in days]
            expected = fields(configuration, days[1].toordinal())["eastward_velocity"]
            assert np.abs(store.eastward_velocity[1].values - expected).max() <= METRE_STEP / 2 + 1e-7
            assert store.eastward_velocity.attrs["standard_name"].startswith("surface_geostrophic_eastward")
            assert "navigation" in store.attrs["caution"]


def test_appending_leaves_earlier_chunks_alone(configuration):
    days = days_between(FIRST, dt.date(2031, 3, 3))
    path = configuration.products / "daily.zarr"
    product(configuration).publish(sources(days[:2]))
    before = snapshot(path)
    product(configuration).publish(sources(days))
    after = snapshot(path)
    changed = {key for key in before if is_chunk(key) and before[key] != after[key]}
    assert changed == {key for key in changed if key.split("/")[0] in {"time", "revision"}}
    product(configuration).publish(sources(days))
    assert snapshot(path) == after


def test_append_equals_publication_at_once(configuration):
    days = days_between(FIRST, dt.date(2031, 3, 3))
    path = configuration.products / "daily.zarr"
    for count in (1, 2, 3):
        product(configuration).publish(sources(days[:count]))
    in_steps = snapshot(path)
    for file in sorted(path.rglob("*"), reverse=True):
        file.unlink() if file.is_file() else file.rmdir()
    path.rmdir()
    product(configuration).publish(sources(days))
    assert snapshot(path) == in_steps


def test_rewritten_day_has_new_values_and_even_revision(configuration):
    days = days_between(FIRST, dt.date(2031, 3, 3))
    product(configuration).publish(sources(days))
    changed = sources(days) | {days[1]: "b"}
    account = product(configuration, lambda _: fields(configuration, 7)).publish(changed)
    assert account["rewritten"] == [days[1]]
    with xr.open_zarr(configuration.products / "daily.zarr") as store:
        assert store.revision.values.tolist() == [0, 2, 0]
        assert np.allclose(store.dynamic_topography[1], fields(configuration, 7)["dynamic_topography"], atol=METRE_STEP)
        assert json.loads(store.attrs["source_digests"])["2031-03-02"] == "b"


def test_interrupted_rewrite_shows_an_odd_revision_and_is_repeated(configuration, monkeypatch):
    days = days_between(FIRST, dt.date(2031, 3, 3))
    product(configuration).publish(sources(days))
    changed = sources(days) | {days[1]: "b"}
    interrupted = product(configuration, lambda _: fields(configuration, 7))
    monkeypatch.setattr(DailyProduct, "_commit", lambda *_: (_ for _ in ()).throw(KeyboardInterrupt))
    with pytest.raises(KeyboardInterrupt):
        interrupted.publish(changed)
    monkeypatch.undo()
    with xr.open_zarr(configuration.products / "daily.zarr") as store:
        assert store.revision.values.tolist() == [0, 1, 0]
        before = fields(configuration, days[1].toordinal())["dynamic_topography"]
        assert np.allclose(store.dynamic_topography[1], before, atol=METRE_STEP)
    assert interrupted.publish(changed)["rewritten"] == [days[1]]
    with xr.open_zarr(configuration.products / "daily.zarr") as store:
        assert store.revision.values.tolist() == [0, 2, 0]


def test_earlier_start_rebuilds_and_keeps_revisions(configuration):
    days = days_between(FIRST, dt.date(2031, 3, 3))
    product(configuration).publish(sources(days[1:]))
    product(configuration, lambda _: fields(configuration, 7)).publish(sources(days[1:], "b"))
    account = product(configuration).publish(sources(days[:1]) | sources(days[1:], "b"))
    assert account["added"] == [days[0]]
    with xr.open_zarr(configuration.products / "daily.zarr") as store:
        assert store.sizes["time"] == 3
        assert store.revision.values.tolist() == [0, 2, 2]


def test_days_taken_away_are_named(configuration):
    days = days_between(FIRST, dt.date(2031, 3, 3))
    product(configuration).publish(sources(days))
    assert product(configuration).publish(sources(days[:2]))["retired"] == [days[2]]
    with xr.open_zarr(configuration.products / "daily.zarr") as store:
        assert store.sizes["time"] == 2


def test_changed_fixed_field_rebuilds(configuration):
    days = days_between(FIRST, dt.date(2031, 3, 2))
    product(configuration).publish(sources(days))
    product(configuration, fixed_seed=98).publish(sources(days))
    with xr.open_zarr(configuration.products / "daily.zarr") as store:
        expected = fields(configuration, 98)["mean_dynamic_topography"]
        assert np.allclose(store.mean_dynamic_topography, expected, atol=METRE_STEP)


def test_other_format_rebuilds(configure):
    days = days_between(FIRST, dt.date(2031, 3, 2))
    product(configure()).publish(sources(days))
    configuration = configure(publish__zarr_format=2)
    product(configuration).publish(sources(days))
    assert (configuration.products / "daily.zarr" / ".zmetadata").exists()
    assert not (configuration.products / "daily.zarr" / "zarr.json").exists()


def test_failing_day_leaves_the_store_as_it_was(configuration):
    days = days_between(FIRST, dt.date(2031, 3, 3))
    product(configuration).publish(sources(days[:2]))
    before = snapshot(configuration.products)

    def fail(_):
        raise OSError("gone")

    with pytest.raises(OSError, match="gone"):
        product(configuration, fail).publish(sources(days))
    assert snapshot(configuration.products) == before
