"""Digests tell values apart, and nothing else."""

from __future__ import annotations

import datetime as dt
import os
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.data.configuration import Configuration
from setdrift.data.digests import digest, file_digest, file_mark

VALUES = st.recursive(
    st.none() | st.integers() | st.floats(allow_nan=False) | st.text(),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(), inner, max_size=4),
    max_leaves=12,
)


@settings(deadline=None, derandomize=True)
@given(VALUES)
def test_equal_values_have_equal_digests(value: Any) -> None:
    assert digest(value) == digest(value)
    assert len(digest(value)) == 32
    assert digest(value) != digest([value])


@settings(deadline=None, derandomize=True)
@given(st.dictionaries(st.text(), st.integers(), min_size=2))
def test_order_of_keys_does_not_count(value: dict[str, int]) -> None:
    assert digest(value) == digest(dict(reversed(value.items())))


@pytest.mark.parametrize(
    ("first", "second"),
    [
        ((1, 2), (2, 1)),
        (("ab", "c"), ("a", "bc")),
        (([1], []), ([], [1])),
        ((1,), ("1",)),
        ((None,), ("None",)),
        ((np.zeros(4),), (np.zeros((2, 2)),)),
        ((np.zeros(2, np.int32),), (np.zeros(1, np.int64),)),
        ((np.array([0.0]),), (np.array([-0.0]),)),
        ((dt.date(2031, 3, 1),), (dt.date(2031, 3, 2),)),
    ],
)
def test_different_values_differ(first: Any, second: Any) -> None:
    assert digest(*first) != digest(*second)


def test_memory_layout_does_not_count() -> None:
    values = np.arange(12.0).reshape(3, 4)
    assert digest(values) == digest(np.asfortranarray(values)) == digest(values[:, ::-1][:, ::-1])


def test_numbers_of_any_kind_count_as_what_they_are() -> None:
    assert digest(np.float64(1.5), np.int32(3)) == digest(1.5, 3)


def test_settings_count_by_value(configure: Callable[..., Configuration]) -> None:
    assert digest(configure().mapping) == digest(configure().mapping)
    assert digest(configure().mapping) == digest(configure().mapping.model_dump())
    assert digest(configure().mapping) != digest(configure(mapping__signal_m=0.2).mapping)


def test_file_digest_is_of_the_bytes_alone(tmp_path: Path) -> None:
    content = bytes(range(256)) * 5000
    for name in ("a", "b"):
        (tmp_path / name).write_bytes(content)
    assert file_digest(tmp_path / "a") == file_digest(tmp_path / "b")
    (tmp_path / "b").write_bytes(content[:-1] + b"x")
    assert file_digest(tmp_path / "a") != file_digest(tmp_path / "b")


def test_folders_count_with_names_sizes_bytes_and_marks_with_times(tmp_path: Path) -> None:
    def folder(name: str, **contents: str) -> Path:
        for part, content in contents.items():
            path = tmp_path / name / "c" / part
            path.parent.mkdir(parents=True, exist_ok=True)
            path.write_text(content)
        return tmp_path / name

    one = folder("a", x="1", y="23")
    assert file_digest(one) == file_digest(folder("b", y="23", x="1"))
    others = [folder("c", x="12", y="3"), folder("d", x="1", z="23"), folder("e", x="1", y="24"), folder("f", x="1")]
    assert len({file_digest(path) for path in (one, *others)}) == 5
    before, content = file_mark(one), file_digest(one)
    assert file_mark(one) == before
    os.utime(one / "c" / "x", (2e9, 2e9))
    assert file_mark(one) != before
    assert file_digest(one) == content
