"""
Rows of the record into columns and back.

Everything works down the columns of many rows at once rather than along one row after the other: a
column has one type and mostly few distinct values, so that ``map``, ``zip`` and ``set`` do the work.
"""

from __future__ import annotations

import json
import math
from collections import deque
from collections.abc import Iterable, Sequence
from itertools import repeat
from operator import attrgetter, itemgetter
from typing import Any

from db.errors import Damaged, InvalidValue
from db.schema import NOUNS, SCHEMA, SITE, Field, TableSchema, Values, feed_text, read_feed
from rules.record import TABLES, Feed, Row, Site, Typed

_NONE = type(None)
_WHOLE_MOST = 2**63 - 1
"""The largest integer of SQLite."""

_COLUMN_TYPES: dict[str, type] = {"number": float, "whole": int}
"""The type in which a column's values come back, by the field's kind; ``str`` for the others."""


def to_json(value: object) -> str:
    """Compact JSON, always the same text for the same value."""
    return json.dumps(value, ensure_ascii=False, allow_nan=False, separators=(",", ":"))


# --- from the record into columns


def to_columns(table: str, rows: Sequence[Row | Site], positions: Iterable[int]) -> list[Values]:
    """
    Rows of the record as they stand in their table.

    Raises
    ------
    InvalidValue
        If a field cannot hold its value: a number that is not finite, another type, a text that is none.
    """
    schema = SCHEMA[table]
    ids: list[Any] = [SITE] if table == SITE else list(map(attrgetter("id"), rows))
    columns = [ids, list(positions)]
    for field in schema.fields:
        columns.append(_to_column(field, rows, list(map(attrgetter(field.name), rows))))
    columns.append([typed_text(schema, row.typed) if row.typed else "[]" for row in rows])
    return list(zip(*columns, strict=True))


def _to_column(field: Field, rows: Sequence[Row | Site], values: list[Any]) -> list[Any]:
    types = set(map(type, values))
    if types == {_NONE} and field.nullable and field.kind != "reference":
        return values
    # Zero and None are finite: without them, every number can be asked by one C loop.
    allowed = {float, _NONE} if field.nullable else {float}
    if field.kind == "number" and types <= allowed and all(map(math.isfinite, filter(None, values))):
        return values
    try:
        known = {value: to_cell(field, value) for value in set(values)}
    except (InvalidValue, TypeError):
        for row, value in zip(rows, values, strict=True):
            try:
                to_cell(field, value)
            except InvalidValue as error:
                raise InvalidValue(f"{called(row)}: {error}") from None
        raise
    return list(map(known.__getitem__, values))


def to_cell(field: Field, value: Any) -> Any:
    """
    One value of the record as its column holds it.

    >>> to_cell(SCHEMA["circuits"].field("fed_from"), Feed("boards", "9f"))
    'boards/9f/'

    Raises
    ------
    InvalidValue
        If the field cannot hold it.
    """
    accepted = _to_cell(field, value)
    if accepted is _REFUSED:
        raise InvalidValue(f"{field.name} takes {_ACCEPTED[field.kind]}, not {value!r:.80}")
    return accepted


_REFUSED = object()
_ACCEPTED = {
    "text": "text that can be written as UTF-8",
    "number": "a finite number",
    "whole": "a whole number",
    "reference": "the id of a row",
    "feed": "a Feed that names a row",
    "feeds": "a tuple of Feeds that name rows",
    "shares": "pairs of a cause and a finite number",
}


def _to_cell(field: Field, value: Any) -> Any:
    if value is None:
        return None if field.nullable and field.kind != "reference" else _REFUSED
    if field.kind == "text":
        return value if is_text(value) else _REFUSED
    if field.kind == "number":
        return _finite(value)
    if field.kind == "whole":
        is_whole = isinstance(value, int) and not isinstance(value, bool) and abs(value) <= _WHOLE_MOST
        return int(value) if is_whole else _REFUSED
    if field.kind == "reference":
        return (value or None) if is_text(value) and (value or field.nullable) else _REFUSED
    if field.kind == "feed":
        return feed_text(value) if _is_feed(value) else _REFUSED
    if not isinstance(value, tuple):
        return _REFUSED
    if field.kind == "feeds":
        return to_json(list(map(feed_text, value))) if all(map(_is_feed, value)) else _REFUSED
    shares = [(name, _finite(share)) for name, share in value]
    return to_json(shares) if all(is_text(name) and share is not _REFUSED for name, share in shares) else _REFUSED


def _finite(value: Any) -> Any:
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return _REFUSED
    try:
        return float(value) if math.isfinite(value) else _REFUSED
    except OverflowError:  # a whole number beyond every float
        return _REFUSED


def is_text(value: object) -> bool:
    """Whether it is text that can be stored: half of a surrogate pair cannot."""
    try:
        return isinstance(value, str) and value.encode() is not None
    except UnicodeEncodeError:
        return False


def _is_feed(value: object) -> bool:
    return isinstance(value, Feed) and "/" not in value.table + value.id and all(map(is_text, (value.id, value.point)))


def typed_text(schema: TableSchema, typed: Typed) -> str:
    """
    The texts as typed, sorted by field as intake sorts them, as their column holds them.

    Raises
    ------
    InvalidValue
        If one of them names no field of the table.
    """
    texts = dict(typed)
    for name, text in texts.items():
        if schema.field(name) is None:
            raise InvalidValue(f"{schema.name}: typed names {name!r}, which is no field")
        if not is_text(text):
            raise InvalidValue(f"{schema.name}: typed takes text that can be written as UTF-8, not {text!r:.80}")
    return to_json(sorted(texts.items()))


def called(row: Row | Site) -> str:
    """A row as an error names it: ``circuit 'B1-07'``."""
    if isinstance(row, Site):
        return NOUNS[SITE]
    table = next(name for name, row_type in TABLES.items() if type(row) is row_type)
    name = getattr(row, "tag", "") or getattr(row, "number", "")
    return f"{NOUNS[table]} {name!r}" if name else f"a {NOUNS[table]}"


# --- from columns into the record


def from_columns(table: str, found: Sequence[Values]) -> list[Row]:
    """
    Rows of a table as rows of the record, in the order of their positions.

    Raises
    ------
    Damaged
        If a column holds what its field cannot have written.
    """
    schema = SCHEMA[table]
    rows: list[Any] = list(map(object.__new__, repeat(schema.row_type, len(found))))
    if not rows:
        return rows
    try:
        found = sorted(found, key=itemgetter(1, 0))  # almost always in order already: one pass
    except TypeError as error:
        raise Damaged(f"a position in {table} is no number") from error
    columns = dict(zip(schema.columns, zip(*found, strict=True), strict=True))
    if set(map(type, columns["id"])) | set(map(type, columns["typed"])) != {str}:
        raise Damaged(f"{table} holds an id or a typed text that is no text")
    _fill(rows, schema.row_type, "id", columns["id"])
    _fill(rows, schema.row_type, "typed", _read_distinct(columns["typed"], _read_typed))
    for field in schema.fields:
        _fill(rows, schema.row_type, field.name, _from_column(schema, field, columns[field.name]))
    return rows


def settings_from_columns(found: Values) -> dict[str, Any]:
    """The settings of a site as arguments of ``Site``."""
    schema = SCHEMA[SITE]
    columns = dict(zip(schema.columns, ((value,) for value in found), strict=True))
    settings = {f.name: next(iter(_from_column(schema, f, columns[f.name]))) for f in schema.fields}
    return {**settings, "typed": _read_distinct(columns["typed"], _read_typed)[0]}


def _fill(rows: list[Any], row_type: type, name: str, values: Iterable[Any]) -> None:
    """
    Set one field of all rows.

    The slot's own descriptor sets it: a frozen row's ``__init__`` goes through ``object.__setattr__`` for
    each of twenty fields, three times as slow.
    """
    deque(map(getattr(row_type, name).__set__, rows, values), maxlen=0)


def _from_column(schema: TableSchema, field: Field, values: tuple[Any, ...]) -> Iterable[Any]:
    types = set(map(type, values))
    allowed = {_COLUMN_TYPES.get(field.kind, str)} | ({_NONE} if field.nullable else set())
    if not types <= allowed:
        raise Damaged(f"{schema.name}.{field.name} holds {', '.join(sorted(t.__name__ for t in types - allowed))}")
    if field.kind == "reference":
        return repeat("", len(values)) if types == {_NONE} else [value or "" for value in values]
    if field.kind == "feed":
        return _read_distinct(values, lambda text: None if text is None else read_feed(text))
    if field.kind == "feeds":
        return _read_distinct(values, lambda text: tuple(map(read_feed, json.loads(text))))
    if field.kind == "shares":
        return _read_distinct(values, lambda text: tuple((name, float(share)) for name, share in json.loads(text)))
    return values


def _read_distinct(values: tuple[Any, ...], read: Any) -> list[Any]:
    """Read each distinct value once."""
    try:
        known = {value: read(value) for value in set(values)}
    except (ValueError, TypeError, AttributeError) as error:
        raise Damaged(f"unreadable: {error}") from error
    return list(map(known.__getitem__, values))


def _read_typed(text: str) -> Typed:
    return tuple((name, typed) for name, typed in json.loads(text)) if text != "[]" else ()
