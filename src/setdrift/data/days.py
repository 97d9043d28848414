"""Days and the blocks of days that one job handles."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from dataclasses import dataclass

EPOCH = dt.date(1970, 1, 1)
ONE_DAY = dt.timedelta(days=1)


def day_number(day: dt.date) -> int:
    """Return the days since 1970-01-01."""
    return (day - EPOCH).days


def from_day_number(number: int) -> dt.date:
    """Return the date so many days after 1970-01-01."""
    return EPOCH + dt.timedelta(days=int(number))


def days_between(first: dt.date, last: dt.date) -> list[dt.date]:
    """Return every day from first to last, both included."""
    return [from_day_number(n) for n in range(day_number(first), day_number(last) + 1)]


@dataclass(frozen=True, order=True)
class Block:
    """Consecutive days handled by one job, named after the first.

    Blocks are counted from 1970-01-01, not from the analysed period: extending the period leaves earlier
    blocks, and so the jobs behind them, as they are.
    """

    first: dt.date
    length: int

    @classmethod
    def holding(cls, day: dt.date, length: int) -> Block:
        """Return the block that holds a day."""
        return cls(from_day_number(day_number(day) // length * length), length)

    @classmethod
    def named(cls, label: str, length: int) -> Block:
        """Return the block with this label.

        Parameters
        ----------
        label : str
            Its first day, YYYY-MM-DD.
        length : int
            Days a block has.

        Returns
        -------
        Block
            The block.

        Raises
        ------
        ValueError
            The label is no day, or no block begins on that day.
        """
        block = cls.holding(dt.date.fromisoformat(label), length)
        if block.label != label:
            raise ValueError(f"label: no block of {length} days begins on {label}, but one on {block.label}")
        return block

    @property
    def label(self) -> str:
        """The block's first day, as its name in paths and logs."""
        return self.first.isoformat()

    @property
    def last(self) -> dt.date:
        """The block's last day."""
        return self.first + dt.timedelta(days=self.length - 1)

    def days_within(self, first: dt.date, last: dt.date) -> list[dt.date]:
        """Return the block's days that lie from first to last."""
        return days_between(max(first, self.first), min(last, self.last))


def blocks_between(first: dt.date, last: dt.date, length: int) -> Iterator[Block]:
    """Yield the blocks that hold the days from first to last."""
    block = Block.holding(first, length)
    while block.first <= last:
        yield block
        block = Block(block.first + dt.timedelta(days=length), length)
