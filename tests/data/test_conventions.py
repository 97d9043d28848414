"""The one table of names is sound."""

from __future__ import annotations

import dataclasses

import cf_units
import pytest

from setdrift.data.conventions import ANOMALY, DAILY_VARIABLES, EDDY_COLUMNS, Column, MapQuality, Variable
from setdrift.numerics.eddy_table import Eddies
from setdrift.numerics.geostrophy import VelocityMethod

NAMES = {variable.name: variable for variable in DAILY_VARIABLES}


@pytest.mark.parametrize("variable", [*DAILY_VARIABLES, *EDDY_COLUMNS], ids=lambda variable: variable.name)
def test_every_variable_is_described(variable: Variable | Column) -> None:
    assert variable.name.replace("_", "").isalpha()
    assert not cf_units.Unit(variable.units).is_unknown()
    assert variable.attributes["long_name"] == variable.long_name
    assert ("standard_name" in variable.attributes) == bool(variable.standard_name)


def test_names_are_unique() -> None:
    assert len(NAMES) == len(DAILY_VARIABLES)
    assert len({column.name for column in EDDY_COLUMNS}) == len(EDDY_COLUMNS)


@pytest.mark.parametrize("variable", DAILY_VARIABLES, ids=lambda variable: variable.name)
def test_ancillary_variables_exist(variable: Variable) -> None:
    assert set(variable.ancillary.split()) <= set(NAMES)
    assert variable.attributes["grid_mapping"] == "earth"
    assert ("cell_methods" in variable.attributes) == (variable.stage != "fixed")
    # a step that is a power of two is exact in 32 bits
    assert variable.step == 0 or (variable.step.as_integer_ratio()[0] == 1 and variable.step < 1e-3)


def test_flags_have_one_meaning_each() -> None:
    methods = NAMES["velocity_method"].attributes
    meant = dict(zip(methods["flag_meanings"].split(), methods["flag_values"], strict=True))  # type: ignore[attr-defined, call-overload]
    assert meant == {method.name.lower(): int(method) for method in VelocityMethod}
    quality = NAMES["map_quality"].attributes
    bits = dict(zip(quality["flag_meanings"].split(), quality["flag_masks"], strict=True))  # type: ignore[attr-defined, call-overload]
    assert bits == {bit.name.lower(): int(bit) for bit in MapQuality if bit.name}


def test_anomalies_are_named_after_the_whole() -> None:
    for component in ("eastward", "northward"):
        whole, part = NAMES[f"{component}_velocity"], NAMES[f"{component}_velocity_anomaly"]
        assert part.standard_name == whole.standard_name + ANOMALY
    error = NAMES["sea_level_anomaly_error"].standard_name
    assert error == f"{NAMES['sea_level_anomaly'].standard_name} standard_error"


def test_columns_are_measured_properties() -> None:
    assert {column.name for column in EDDY_COLUMNS} <= {field.name for field in dataclasses.fields(Eddies)}
