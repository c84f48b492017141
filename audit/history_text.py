"""The text of ``ohmwalk history``."""

from __future__ import annotations

import json
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

import click

from audit.errors import WrongUse
from db.history import Entry, FieldChange, RowChange
from db.schema import NOUNS, SCHEMA, SITE, read_feed
from db.store import SiteStore
from rules.columns import Column
from rules.problems.settings import SETTINGS
from rules.record import UNIT_OF_QUANTITY, Site, columns, rows_of
from rules.text import clean, nearest
from rules.units import plain

_LISTED = 10
"""How many rows of one save are listed where no circuit is named; an intake may have a million."""
_LISTED_OF_CIRCUIT = 1_000
_NOTHING = "nothing"
"""How an empty cell is called."""
_LONGEST = 60
"""How much of a text is shown. [characters]"""

_IN_NAMES = ("tag", "number", "circuit_id")
"""Fields that the name of a row shows."""

_Key = tuple[str, str]
"""Table and id of a row."""


def print_history(store: SiteStore, circuit: str | None) -> None:
    """
    Print every save, the earliest first.

    Raises
    ------
    WrongUse
        If no circuit has or had the tag.
    """
    site = store.site()
    entries = store.history(circuit, _LISTED if circuit is None else _LISTED_OF_CIRCUIT)
    if circuit is not None and not entries:
        near = nearest(circuit, [row.tag for row in site.circuits])
        hint = "" if near is None else f"; did you mean {near!r}?"
        raise WrongUse(f"--circuit: no circuit has or had the tag {clean(circuit)!r}{hint}")
    for line in history_lines(entries, site):
        click.echo(line)


def history_lines(entries: Iterable[Entry], site: Site) -> Iterator[str]:
    """Each save as a line, and below it each row that it changed."""
    entries = list(entries)
    names = _Names(site, entries)
    undone = {entry.id: entry for entry in entries}
    for entry in entries:
        why = clean(entry.why)
        if entry.undoes is not None:
            earlier = undone.get(entry.undoes)
            why += f" (undoes the save of {_time(earlier)})" if earlier is not None else " (undoes an earlier save)"
        yield f"{_time(entry)}  {clean(entry.who)}  {why}"
        yield from (f"    {_change_line(change, names)}" for change in entry.changes)
        if entry.count > len(entry.changes):
            yield f"    and {entry.count - len(entry.changes):,} more rows"


def _time(entry: Entry) -> str:
    return entry.at.astimezone().strftime("%Y-%m-%d %H:%M:%S")


def _change_line(change: RowChange, names: _Names) -> str:
    row = f"{change.what} {names.of_row(change.table, change.row)}"
    if change.what == "removed":
        return row
    known = _columns(change.table)
    named = () if change.what == "changed" else _IN_NAMES
    fields = [field for field in change.fields if field.field in known and field.field not in named]
    texts = [_field_text(field, known, change, names) for field in fields]
    return f"{row}: {', '.join(texts)}" if texts else row


def _columns(table: str) -> Mapping[str, Column]:
    if table != SITE:
        return dict(columns(table))
    return dict(SETTINGS.values()) | {"prior": Column("prior")}


def _field_text(field: FieldChange, known: Mapping[str, Column], change: RowChange, names: _Names) -> str:
    column = known[field.field]
    unit = names.unit(change) if column.unit == "*" else column.unit
    after = names.value(change.table, field.field, field.after, field.typed_after, unit)
    if change.what != "changed":
        return f"{column.name} {after}"
    before = names.value(change.table, field.field, field.before, field.typed_before, unit)
    if before == _NOTHING:
        return f"added {column.name} {after}"
    return f"{column.name} {before} → {after}"


class _Names:
    """What rows are called: as they stand now, else as they last stood in the history."""

    def __init__(self, site: Site, entries: Iterable[Entry]) -> None:
        self._rows: dict[_Key, dict[str, Any]] = {}
        for entry in entries:
            for change in entry.changes:
                fields = self._rows.setdefault((change.table, change.row), {})
                fields.update((f.field, f.before if change.what == "removed" else f.after) for f in change.fields)
        needed = self._rows.keys() | set(self._referred())
        for table, row in rows_of(site):
            if (table, row.id) in needed:
                self._rows[table, row.id] = {f.name: getattr(row, f.name) for f in SCHEMA[table].fields}

    def _referred(self) -> Iterator[_Key]:
        """Rows that the changed ones refer to."""
        for (table, _), fields in self._rows.items():
            for known in SCHEMA[table].fields:
                yield from _references(table, known.name, fields.get(known.name))

    def of_row(self, table: str, id_: str) -> str:
        """``circuit B1-07``, ``B1-07 run 2``, ``B1-07 reading``."""
        if table == SITE:
            return NOUNS[SITE]
        fields = self._rows.get((table, id_), {})
        circuit = fields.get("circuit_id")
        owner = f"{self._tag('circuits', circuit)} " if circuit else ""
        own = fields.get("tag") or fields.get("number") or ""
        return f"{owner}{NOUNS[table]} {clean(str(own))}".rstrip()

    def unit(self, change: RowChange) -> str:
        """The unit of what follows the row's quantity."""
        quantity = self._rows.get((change.table, change.row), {}).get("quantity", "")
        return UNIT_OF_QUANTITY.get(quantity, "")

    def value(self, table: str, field: str, value: Any, typed: str | None, unit: str) -> str:
        """One value as people write it."""
        if typed is not None:
            return clean(typed)
        if value is None or value in ("", "[]"):
            return _NOTHING
        references = list(_references(table, field, value))
        if references:
            points = _points(table, field, value)
            tags = (self._tag(*key) + point for key, point in zip(references, points, strict=True))
            return " + ".join(tags)
        if isinstance(value, float):
            return f"{plain(value)} {unit}".rstrip()
        text = clean(str(value))
        return text if len(text) <= _LONGEST else text[: _LONGEST - 1] + "…"

    def _tag(self, table: str, id_: str) -> str:
        fields = self._rows.get((table, id_), {})
        return clean(str(fields.get("tag") or f"{NOUNS.get(table, 'row')} {id_[:8]}"))


def _references(table: str, field: str, value: Any) -> Iterator[_Key]:
    """Table and id of the rows that a value names, as it stands in its column."""
    known = SCHEMA[table].field(field)
    if known is None or not known.targets or not isinstance(value, str) or not value:
        return
    if known.kind == "reference":
        yield known.targets[0], value
        return
    for text in json.loads(value) if known.kind == "feeds" else [value]:
        feed = read_feed(text)
        yield feed.table, feed.id


def _points(table: str, field: str, value: str) -> list[str]:
    """``:POINT`` behind each of those rows, empty where none is named."""
    known = SCHEMA[table].field(field)
    if known is None or known.kind == "reference":
        return [""]
    feeds = map(read_feed, json.loads(value) if known.kind == "feeds" else [value])
    return [f":{feed.point}" if feed.point else "" for feed in feeds]
