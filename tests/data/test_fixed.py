"""Reading the fixed fields."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from tiny_analysis import tiny

from setdrift.data.configuration import Configuration
from setdrift.data.fixed import fixed_digest, load_fixed_fields
from setdrift.errors import SetdriftError


def test_fields_and_their_digests(analysed_sea: Path, configure: Callable[..., Configuration]) -> None:
    fields = load_fixed_fields(tiny(configure))
    assert set(fields.data_vars) == {"mean_dynamic_topography", "land_fraction"}
    np.testing.assert_allclose(fields["mean_dynamic_topography"].isel(longitude=0), 0.02 * fields["latitude"])
    digests = {name: fixed_digest(tiny(configure), str(name)) for name in fields.data_vars}
    assert len(set(digests.values())) == 2


def test_missing_fields_are_told(configure: Callable[..., Configuration]) -> None:
    with pytest.raises(SetdriftError, match=r"fixed/fields\.nc: is missing or damaged; delete it and run the workflow"):
        load_fixed_fields(configure())
    with pytest.raises(SetdriftError, match=r"fixed/fields\.json: is missing or damaged"):
        fixed_digest(configure(), "land_fraction")
