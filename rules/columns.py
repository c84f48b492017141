"""How the fields of the record stand in the site folder: header, kind, unit and what is accepted."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cache
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

OUTER: dict[str, tuple[float, float]] = {
    "V": (-10_000, 10_000),
    "A": (-100_000, 100_000),
    "W": (-10_000_000, 10_000_000),
    "ohm": (-1e12, 1e12),
    "degC": (-273.15, 2_000),
}
"""
Smallest and largest number of a unit. They are our own, as are those of each column: far beyond any d.c. distribution
in a building, so that a slip of many digits is refused, and near enough that no calculation overflows.
"""
NEAREST_ZERO = 1e-12
"""Smallest size of any number but 0, in any unit: nothing that is read or recorded is as small."""


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


@cache
def within(column: Column, unit: str) -> Column:
    """
    A column as it stands in a row whose quantity has the unit: a number that follows the quantity has its outer bounds.

    >>> within(Column("value", "number", unit="*"), "V").most, within(Column("length", "number", unit="m"), "V").most
    (10000, None)
    """
    if column.unit != "*":
        return column
    least, most = OUTER[unit]
    return replace(column, unit=unit, least=least if column.above is None else NEAREST_ZERO, above=None, most=most)


def column(default: Any, name: str, kind: ColumnKind = "text", **more: Any) -> Any:
    return field(default=default, metadata={"column": Column(name, kind, **more)})


def number(name: str, unit: str = "", **more: Any) -> Any:
    return column(None, name, "number", unit=unit, **more)


def tag(name: str) -> Any:
    return column("", name, "tag", header=True, filled=True)


def notes() -> Any:
    return column("", "notes", "notes")


def order() -> Any:
    return number("order", least=-1e9, most=1e9)


def circuit() -> Any:
    return column("", "circuit", "reference", header=True, filled=True, tables=("circuits",))
