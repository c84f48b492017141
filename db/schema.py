"""
How the record's fields stand in columns: one column a field, for the ten tables and the site's settings.

Every table has ``id`` (primary key), ``position`` (what keeps the order of the rows), the record's
fields under their own names, and ``typed`` as one JSON column. In columns,

- a reference (``circuit_id``) is the id, NULL where it is empty, with a foreign key;
- a ``Feed`` is ``table/id/point``; SQLite takes the id out of it into a generated column for each table
  that it may refer to, and the foreign key stands on that. So one field stays one column (which two
  laptops that change it at once cannot mix), and the foreign key holds;
- several feeds (``boards.fed_by``) are a JSON list of such texts. A list can have no foreign key: the
  store checks it at every save, and ``verify`` later;
- shares (``site.prior``) are a JSON list of pairs.

What is not known is NULL in a number and ``''`` in a text, as in the record.
"""

from __future__ import annotations

import json
from dataclasses import dataclass, fields
from functools import cache
from typing import Any, Literal, TypeAlias, get_type_hints

from db.errors import Damaged
from rules.record import KEY_FIELDS, TABLES, Feed, Row, Site

SITE = "site"
"""The table of the settings: one row, whose id is its table's name."""

FieldKind: TypeAlias = Literal["text", "number", "whole", "reference", "feed", "feeds", "shares"]
Values: TypeAlias = tuple[Any, ...]
"""One row as it stands in its table: its values in the order of ``TableSchema.columns``."""

_KINDS: dict[object, tuple[FieldKind, bool]] = {
    str: ("text", False),
    str | None: ("text", True),
    float: ("number", False),
    float | None: ("number", True),
    int: ("whole", False),
    int | None: ("whole", True),
    Feed | None: ("feed", True),
    tuple[Feed, ...]: ("feeds", False),
    tuple[tuple[str, float], ...]: ("shares", False),
}
"""Kind, and whether NULL is "not known", by the type that the record gives a field."""

_REFERENCES = {"circuit_id": "circuits", "to_board_id": "boards", "replaces_id": "readings"}
"""The table that a field holding a bare id refers to."""


@dataclass(frozen=True, slots=True)
class Field:
    """One field of the record as a column."""

    name: str
    kind: FieldKind
    nullable: bool
    targets: tuple[str, ...] = ()
    """The tables that it may refer to."""

    @property
    def sql_type(self) -> str:
        """Type of its column in a strict table."""
        return {"number": "REAL", "whole": "INTEGER"}.get(self.kind, "TEXT")

    @property
    def empty(self) -> object:
        """What stands in the column where nothing is known; ``None`` for a field that is never empty too."""
        if self.kind in ("feeds", "shares"):
            return "[]"
        return "" if self.kind == "text" and not self.nullable else None

    @property
    def is_json(self) -> bool:
        """Whether its column holds JSON."""
        return self.kind in ("feeds", "shares")


@dataclass(frozen=True, slots=True)
class TableSchema:
    """One table: its fields in the record's order."""

    name: str
    row_type: type[Row] | type[Site]
    fields: tuple[Field, ...]
    columns: tuple[str, ...]
    """``id``, ``position``, the fields, ``typed``."""
    empty: Values
    """A row of which nothing is known."""

    def place(self, column: str) -> int:
        """Where a column stands in ``Values``."""
        return _places(self.name)[column]

    def field(self, name: str) -> Field | None:
        """The field of that name, or ``None``."""
        place = _places(self.name).get(name)
        return self.fields[place - 2] if place is not None and 2 <= place < 2 + len(self.fields) else None


def _table(name: str, row_type: type[Row] | type[Site]) -> TableSchema:
    of_table = _fields(row_type)
    columns = ("id", "position", *(field.name for field in of_table), "typed")
    return TableSchema(name, row_type, of_table, columns, (None, 0, *(field.empty for field in of_table), "[]"))


def _fields(row_type: type[Row] | type[Site]) -> tuple[Field, ...]:
    hints = get_type_hints(row_type)
    out = []
    for f in fields(row_type):
        if f.name in ("id", "typed") or f.name in TABLES:
            continue
        kind, nullable = _KINDS[hints[f.name]]
        if f.name in _REFERENCES:
            required = f.metadata["column"].filled if f.metadata else False
            out.append(Field(f.name, "reference", not required, (_REFERENCES[f.name],)))
        else:
            out.append(Field(f.name, kind, nullable, f.metadata["column"].tables if kind in ("feed", "feeds") else ()))
    return tuple(out)


SCHEMA: dict[str, TableSchema] = {name: _table(name, row_type) for name, row_type in ((SITE, Site), *TABLES.items())}
"""Every table of the record in a site file; what is referred to comes first, as in ``TABLES``."""

KEYS: dict[str, tuple[str, ...]] = {**KEY_FIELDS, "readings": ("tag",)}
"""Fields that no two rows of a table may share; readings without a tag are excepted."""

NOUNS = {
    SITE: "settings",
    "sources": "source",
    "boards": "board",
    "circuits": "circuit",
    "runs": "run",
    "loads": "load",
    "instruments": "instrument",
    "visits": "visit",
    "readings": "reading",
    "decisions": "decision",
    "acknowledged": "acknowledgement",
}
"""What a person calls one row of a table."""


@cache
def _places(table: str) -> dict[str, int]:
    return {name: n for n, name in enumerate(SCHEMA[table].columns)}


def key(table: str, values: Values) -> tuple[object, ...] | None:
    """What no other row of the table may share; ``None`` for a row that has no tag."""
    found = tuple(values[SCHEMA[table].place(name)] for name in KEYS.get(table, ()))
    return None if not found or (table == "readings" and found == ("",)) else found


@cache
def referring(table: str) -> tuple[tuple[str, Field], ...]:
    """Tables and fields that may refer to a row of ``table``."""
    return tuple((name, field) for name, schema in SCHEMA.items() for field in schema.fields if table in field.targets)


def references(table: str, values: Values) -> list[tuple[str, str]]:
    """Table and id of every row that a row refers to."""
    return [target for place, field in referring_places(table) for target in targets(field, values[place])]


def targets(field: Field, value: Any) -> list[tuple[str, str]]:
    """Table and id of every row that one field's value refers to."""
    if value is None or value == "[]":
        return []
    if field.kind == "reference":
        return [(field.targets[0], value)]
    feeds = [value] if field.kind == "feed" else json.loads(value)
    return [(feed.table, feed.id) for feed in map(read_feed, feeds)]


@cache
def referring_places(table: str) -> tuple[tuple[int, Field], ...]:
    """The fields of a table that refer to rows, each with its place in ``Values``."""
    return tuple((n, field) for n, field in enumerate(SCHEMA[table].fields, start=2) if field.targets)


def feed_text(feed: Feed) -> str:
    """
    A feed as it stands in a column.

    >>> feed_text(Feed("circuits", "9f", "p1"))
    'circuits/9f/p1'
    """
    return f"{feed.table}/{feed.id}/{feed.point}"


def read_feed(text: str) -> Feed:
    """The feed that ``feed_text`` wrote; ``Damaged`` where it cannot have."""
    parts = text.split("/", 2)
    if len(parts) != 3:
        raise Damaged(f"{text!r:.80} is no feed")
    return Feed(*parts)
