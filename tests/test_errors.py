"""The one exception that users see."""

from __future__ import annotations

import pickle

from setdrift.errors import SetdriftError


def test_it_is_one_line_with_where_what_and_remedy() -> None:
    error = SetdriftError("file.nc", "holds\n  no time", "replace\tthe file")
    assert str(error) == "file.nc: holds no time; replace the file"
    assert (error.where, error.what, error.remedy) == ("file.nc", "holds\n  no time", "replace\tthe file")


def test_it_survives_the_way_from_another_process() -> None:
    error = pickle.loads(pickle.dumps(SetdriftError("a", "b", "c")))
    assert str(error) == "a: b; c"
