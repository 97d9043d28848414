"""The one exception that users see: where, what was wrong, what to do about it."""

from __future__ import annotations


class SetdriftError(Exception):
    """A problem the user can act on.

    Parameters
    ----------
    where : str
        File, key, day or stage the problem belongs to.
    what : str
        What was wrong and what was found.
    remedy : str
        What to do about it.
    """

    def __init__(self, where: str, what: str, remedy: str) -> None:
        super().__init__(where, what, remedy)
        self.where = where
        self.what = what
        self.remedy = remedy

    def __str__(self) -> str:
        """Return the problem as one line."""
        return " ".join(f"{self.where}: {self.what}; {self.remedy}".split())
