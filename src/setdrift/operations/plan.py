"""Which jobs an analysis has, and which receipts each of them waits for."""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass

from setdrift.data.configuration import Configuration
from setdrift.data.days import Block, blocks_between
from setdrift.data.receipts import receipt_path


@dataclass(frozen=True)
class Plan:
    """The jobs of an analysis.

    Attributes
    ----------
    configuration : Configuration
        The analysis.
    first, last : date
        First and last analysed day.
    """

    configuration: Configuration
    first: dt.date
    last: dt.date

    def receipts(self, stage: str) -> list[str]:
        """Return the receipts of a stage for all blocks that hold analysed days."""
        return self._receipts(stage, self.first, self.last)

    def observation_receipts(self, label: str) -> list[str]:
        """Return the observation receipts that the maps of a block depend on.

        Parameters
        ----------
        label : str
            The block's first day.

        Returns
        -------
        list of str
            Paths, relative to the current folder.
        """
        days = self._days(label)
        window = dt.timedelta(days=self.configuration.mapping.window_days)
        return self._receipts("observations", days[0] - window, days[-1] + window)

    def span(self, label: str, margin: int = 0) -> str:
        """Return the days a block's job handles, as text that changes when they do.

        Parameters
        ----------
        label : str
            The block's first day.
        margin : int
            Days before and after the analysed period that count too.

        Returns
        -------
        str
            First and last day.
        """
        days = self._days(label, margin)
        return f"{days[0]} to {days[-1]}"

    def _days(self, label: str, margin: int = 0) -> list[dt.date]:
        more = dt.timedelta(days=margin)
        return Block.named(label, self.configuration.block_days).days_within(self.first - more, self.last + more)

    def _receipts(self, stage: str, first: dt.date, last: dt.date) -> list[str]:
        blocks = blocks_between(first, last, self.configuration.block_days)
        return [str(receipt_path(self.configuration, stage, block)) for block in blocks]
