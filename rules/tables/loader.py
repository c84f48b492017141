"""Published data: TOML files beside this module, each group with its source, edition and status."""

from __future__ import annotations

import math
import tomllib
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any, TypeAlias

from rules.tables import awg

Cell: TypeAlias = str | float | None
"""``None`` where the source has no value."""

STATUSES = ("verified", "computed", "from-memory", "common practice, no source")
"""The value was read; derived by the formula stated; not found in a document that was read; a trade's or our choice."""

_COMPUTED = {"awg": awg.rows}


@dataclass(frozen=True, slots=True)
class Group:
    """One table of published or chosen data."""

    name: str
    title: str
    source: str
    edition: str
    status: str
    """One of ``STATUSES``."""
    unit: str
    """Units of the columns, in their order where they differ."""
    columns: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]
    note: str = ""

    def numbers(self, key: str, value: str) -> dict[float, float]:
        """The rows as a mapping between two columns of numbers, gaps left out."""
        pairs = zip(self.column(key), self.column(value), strict=True)
        return {k: v for k, v in pairs if isinstance(k, float) and isinstance(v, float)}

    def value(self, name: str) -> float:
        """The number in a column of a group with a single row."""
        (number,) = self.numbers(name, name)
        return number

    def column(self, name: str) -> tuple[Cell, ...]:
        """One column, top to bottom."""
        place = self.columns.index(name)
        return tuple(row[place] for row in self.rows)


@cache
def groups() -> tuple[Group, ...]:
    """Every group of data in use, by file and place in it; the same objects at each call."""
    return tuple(_read())


def group(name: str) -> Group:
    """
    One group by its name.

    >>> group("metal_copper").edition
    'IEC 60028:1925'
    """
    return _by_name()[name]


@cache
def _by_name() -> dict[str, Group]:
    return {each.name: each for each in groups()}


def _read() -> Iterator[Group]:
    folder = files("rules.tables")
    for file in sorted(folder.iterdir(), key=lambda file: file.name):
        if file.name.endswith(".toml"):
            for name, entry in tomllib.loads(file.read_text(encoding="utf-8")).items():
                yield _group(name, entry)


def _group(name: str, entry: dict[str, Any]) -> Group:
    computed_by = entry.pop("computed_by", None)
    rows = _COMPUTED[computed_by]() if computed_by else entry.pop("rows")
    return Group(
        name=name,
        columns=tuple(entry.pop("columns")),
        rows=tuple(tuple(_cell(value) for value in row) for row in rows),
        note=" ".join(entry.pop("note", "").split()),
        **entry,
    )


def _cell(value: str | float) -> Cell:
    """Numbers as floats; TOML has no null, so a gap is written ``nan``."""
    if isinstance(value, str):
        return value
    return None if math.isnan(value) else float(value)
