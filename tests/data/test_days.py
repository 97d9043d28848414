"""Days and blocks."""

from __future__ import annotations

import datetime as dt

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from setdrift.data.days import Block, blocks_between, day_number, days_between, from_day_number

DAYS = st.dates(dt.date(1970, 1, 1), dt.date(2199, 12, 31))
LENGTHS = st.integers(1, 366)


def test_numbers_count_from_1970() -> None:
    assert day_number(dt.date(1970, 1, 1)) == 0
    assert day_number(dt.date(2031, 3, 1)) * 86400 == 1930089600
    assert from_day_number(22339) == dt.date(2031, 3, 1)


def test_both_ends_count() -> None:
    leap = days_between(dt.date(2032, 2, 28), dt.date(2032, 3, 1))
    assert [day.day for day in leap] == [28, 29, 1]
    assert days_between(dt.date(2031, 3, 2), dt.date(2031, 3, 1)) == []


@settings(deadline=None, derandomize=True)
@given(DAYS, LENGTHS)
def test_a_day_lies_in_its_block(day: dt.date, length: int) -> None:
    block = Block.holding(day, length)
    assert block.first <= day <= block.last
    assert (block.last - block.first).days == length - 1
    assert Block.named(block.label, length) == block


@settings(deadline=None, derandomize=True)
@given(DAYS, st.integers(0, 800), LENGTHS)
def test_blocks_part_the_days(first: dt.date, count: int, length: int) -> None:
    last = min(first + dt.timedelta(days=count), dt.date(2199, 12, 31))
    parts = [block.days_within(first, last) for block in blocks_between(first, last, length)]
    assert [day for part in parts for day in part] == days_between(first, last)
    assert all(parts)


@pytest.mark.parametrize("label", ["2031-03-01", "march", "2031-02-30", "20310228", ""])
def test_what_names_no_block(label: str) -> None:
    with pytest.raises(ValueError, match=r"no block of 2 days begins on|Invalid isoformat|day is out of range"):
        Block.named(label, 2)


def test_blocks_do_not_depend_on_where_counting_begins() -> None:
    late = list(blocks_between(dt.date(2031, 3, 5), dt.date(2031, 3, 20), 10))
    early = list(blocks_between(dt.date(2031, 1, 1), dt.date(2031, 3, 20), 10))
    assert early[-len(late) :] == late
    assert sorted(late) == late
