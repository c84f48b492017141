"""How the fields of the record stand in the site folder: header, kind, unit and what is accepted."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any, Literal, TypeAlias

ColumnKind: TypeAlias = Literal[
    "text", "notes", "tag", "number", "whole", "size", "choice", "reference", "feeds", "point", "return", "time", "date"
]


METER_QUANTITY = {
    "voltage": "voltage",
    "drop": "voltage",
    "joint": "voltage",
    "current": "current",
    "residual": "current",
    "temperature": "temperature",
    "resistance": "resistance",
}
"""Which rows of an instrument a reading uses: drop and joint readings use the voltage rows."""


@dataclass(frozen=True, slots=True)
class Column:
    """How a field stands in the site folder."""

    name: str
    """The header without its unit."""
    kind: ColumnKind = "text"
    unit: str = ""
    """Unit of a number; ``*`` where it follows the row's quantity; empty for a pure number."""
    choices: tuple[str, ...] = ()
    header: bool = False
    """The column must be there (* in the format)."""
    filled: bool = False
    """Its cells must be filled."""
    tables: tuple[str, ...] = ()
    """What a reference may name."""
    least: float | None = None
    """Smallest accepted number."""
    above: float | None = None
    """Accepted numbers are greater than this."""
    most: float | None = None
    """Largest accepted number."""


def column(default: Any, name: str, kind: ColumnKind = "text", **more: Any) -> Any:
    return field(default=default, metadata={"column": Column(name, kind, **more)})


def number(name: str, unit: str = "", **more: Any) -> Any:
    return column(None, name, "number", unit=unit, **more)


def tag(name: str) -> Any:
    return column("", name, "tag", header=True, filled=True)


def notes() -> Any:
    return column("", "notes", "notes")


def order() -> Any:
    return number("order")


def circuit() -> Any:
    return column("", "circuit", "reference", header=True, filled=True, tables=("circuits",))
