"""The problems of one intake, gathered so that all are told in one go."""

from __future__ import annotations

from dataclasses import dataclass, field

from rules.text import clean


@dataclass(frozen=True, slots=True, order=True)
class Fault:
    """One line of a refusal."""

    order: tuple[int, int, int]
    """Place of the file, line and place of the column: what the lines are sorted by."""
    line: str


@dataclass(slots=True)
class Faults:
    """What is wrong with the input so far."""

    found: list[Fault] = field(default_factory=list)

    def add(self, file: str, what: str, *, row: int = 0, column: str = "", order: tuple[int, int] = (0, 0)) -> None:
        """
        One more problem.

        Parameters
        ----------
        file : str
            Its name within the folder.
        what : str
            What is wrong and what is accepted.
        row : int
            Line of the file, the header being 1; 0 where it is about the file.
        column : str
            The header's name without its unit; empty where it is about the row.
        order : (int, int)
            Place of the file among the files and of the column among the columns.
        """
        place = ":".join(part for part in (file, str(row) if row else "", column) if part)
        self.found.append(Fault((order[0], row, order[1]), f"{clean(place)}: {clean(what)}"))

    def lines(self) -> tuple[str, ...]:
        """Every problem once, in the order of files, lines and columns."""
        return tuple(dict.fromkeys(fault.line for fault in sorted(self.found)))
