"""One thing in a record that does not hold together."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Problem:
    """What is wrong with one cell of a record, and what is accepted in its place."""

    table: str
    """A table of the site, or ``site`` for its settings."""
    row: str
    """Id of the row; empty for the settings."""
    column: str
    """The column's name without its unit, as in the site folder."""
    what: str
    """What is wrong, the value named."""
    accepted: str
    """What is accepted instead."""
    seen_in: tuple[str, ...] = ()
    """
    Tables that were looked at to find it beyond the cell's own row. An intake that could not read one of them
    whole leaves the problem out: it may be none.
    """

    @property
    def text(self) -> str:
        """What is wrong and what is accepted, in one line."""
        return f"{self.what}; accepted: {self.accepted}"
