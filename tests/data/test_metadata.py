"""Global attributes say whose, from what, where and when."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable

import pytest

from setdrift import __version__
from setdrift.data.configuration import Configuration
from setdrift.data.conventions import CAUTION, LIMITS
from setdrift.data.days import days_between
from setdrift.data.grids import analysis_grid
from setdrift.data.metadata import DAILY_PRODUCT, EDDY_PRODUCT, Product, global_attributes

NOW = dt.datetime(2031, 3, 21, 6, 5, 7, tzinfo=dt.UTC)
DAYS = days_between(dt.date(2031, 3, 1), dt.date(2031, 3, 3))


def attributes(configuration: Configuration, product: Product = DAILY_PRODUCT) -> dict[str, object]:
    return global_attributes(configuration, product, analysis_grid(configuration), DAYS, NOW)


@pytest.mark.parametrize("product", [DAILY_PRODUCT, EDDY_PRODUCT], ids=lambda product: product.name)
def test_what_and_whose(configure: Callable[..., Configuration], product: Product) -> None:
    publish = {"institution": "Tarn Office", "licence": "free", "creator_name": "A", "creator_email": "a@tarn.example"}
    found = attributes(configure(publish=publish, altimeters__plover={"files": "p/*.nc"}), product)
    assert found["title"] == f"{product.title}: small_sea"
    assert str(found["summary"]).endswith(LIMITS)
    assert found["caution"] == CAUTION
    assert found["source"] == "along-track altimeter sea level of heron, plover"
    assert [found[k] for k in ("institution", "license", "creator_name", "creator_email")] == list(publish.values())
    assert found["id"] == f"small_sea.{product.name}"
    assert str(found["Conventions"]).startswith("CF-1.")


def test_where_and_when(configure: Callable[..., Configuration]) -> None:
    found = attributes(configure())
    edges = [found[f"geospatial_{axis}_{end}"] for axis in ("lon", "lat") for end in ("min", "max")]
    assert edges == [-30.0, -26.0, 8.0, 11.0]
    assert found["geospatial_lat_resolution"] == "0.5 degrees"
    assert (found["time_coverage_start"], found["time_coverage_end"]) == (
        "2031-03-01T12:00:00Z",
        "2031-03-03T12:00:00Z",
    )
    assert found["date_created"] == "2031-03-21T06:05:07Z"
    assert str(found["history"]).startswith(f"2031-03-21T06:05:07Z: published by setdrift {__version__} with settings ")
    assert str(found["history"]).endswith(str(found["settings_digest"]))


def test_settings_digest_is_of_what_may_change_values(configure: Callable[..., Configuration]) -> None:
    digest = attributes(configure())["settings_digest"]
    assert attributes(configure(output="x", period__end="2031-04-01", block_days=9))["settings_digest"] == digest
    assert attributes(configure(mapping__signal_m=0.2))["settings_digest"] != digest


def test_values_fit_in_a_store(configure: Callable[..., Configuration]) -> None:
    assert all(isinstance(value, str | float) for value in attributes(configure()).values())
