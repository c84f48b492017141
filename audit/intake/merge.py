"""
A site and the rows that come into it: what is new, what stays, what differs.

Rows come in the ids of the site (``audit.intake.incoming``), so that a row is new, or equal to the row of its id,
or differs from it. A column that a table does not have says nothing about the rows that are there; an empty cell
says "not known", which differs from a value. Nothing is ever removed.

Readings are never overwritten: one with a tag that differs becomes a further reading, which replaces it. So a
reading that comes in is also nothing new if it equals one that has replaced the reading of its tag.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, fields, replace
from itertools import count
from typing import Any

from rules.problems.settings import SETTINGS
from rules.record import TABLES, Reading, Row, Site, Typed, columns, row_id

SITE = "site"
"""Stands for the settings where a table is named."""
REASON = "taken in again with another value"
"""Reason of a reading that replaces another one, where the row that came in gives none."""

_NOT_OF_THE_READING = ("tag", "replaces_id", "reason")
"""Fields in which a reading that replaced another one differs from the row that it came from."""


@dataclass(frozen=True, slots=True)
class Difference:
    """A field of a row that is there and comes in with another value."""

    table: str
    row: str
    """Id of the row; empty for the settings."""
    field: str
    column: str
    before: Row | Site
    after: Row | Site
    can_be_taken: bool = True
    """Whether ``--replace`` takes the value that comes in."""


@dataclass(slots=True)
class Merge:
    """What becomes of a site."""

    site: Site
    """The site with all that comes in, differing values taken."""
    added: dict[str, list[Row]] = field(default_factory=lambda: {table: [] for table in TABLES})
    changed: dict[str, dict[str, tuple[Row, tuple[str, ...]]]] = field(
        default_factory=lambda: {table: {} for table in TABLES}
    )
    """By table and id, the row as it will be and the fields that change."""
    settings: tuple[str, ...] = ()
    """Fields of the settings that change."""
    left: Counter[str] = field(default_factory=Counter)
    """How many rows of each table are there already as they come in."""
    differences: list[Difference] = field(default_factory=list)
    came_from: dict[str, str] = field(default_factory=dict)
    """Id of the reading that came in, by that of the one which is made of it to replace another."""

    @property
    def is_change(self) -> bool:
        """Whether anything is to be written."""
        return bool(self.settings or any(self.added.values()) or any(self.changed.values()))


def merge(
    into: Site, incoming: Site, given: Mapping[str, Collection[str]], settings: Mapping[str, Any] | None
) -> Merge:
    """
    Take rows into a site.

    Parameters
    ----------
    into : Site
        What is there; it is left as it is.
    incoming : Site
        The rows that come in, in the ids of ``into``.
    given : dict
        By table, the fields that it has a column for.
    settings : dict, optional
        Fields of ``Site`` that come in.
    """
    merged = Merge(into)
    rows: dict[str, Any] = {}
    for table in TABLES:
        there: dict[str, Row] = {row.id: row for row in into.table(table)}
        differing: list[tuple[Row, Row]] = []
        for row in incoming.table(table):
            old = there.get(row.id)
            if old is None:
                merged.added[table].append(row)
            elif old == row:
                merged.left[table] += 1
            else:
                differing.append((old, row))
        if table == "readings":
            _Readings(into, incoming, given.get(table, ()), merged).take(differing)
        else:
            for old, row in differing:
                _take_row(table, old, row, given[table], merged)
        changed = merged.changed[table]
        kept = (changed[row.id][0] if row.id in changed else row for row in into.table(table))
        if changed or merged.added[table]:
            rows[table] = (*kept, *merged.added[table])
    merged.site = replace(_settings_taken(into, settings, merged), **rows)
    return merged


def _take_row(table: str, old: Row, row: Row, given: Collection[str], merged: Merge) -> None:
    """A row that is there and may come in differently."""
    found = tuple(_differing(table, old, row, given))
    if not found:
        merged.left[table] += 1
        return
    new = _with_values(old, row, [name for name, _ in found])
    merged.changed[table][old.id] = new, tuple(name for name, _ in found)
    named = dict(columns(table))
    merged.differences += [Difference(table, old.id, name, column, old, new) for name, column in found if name in named]


def _differing(table: str, old: Row, row: Row, given: Collection[str]) -> Iterator[tuple[str, str]]:
    """Field and column of what differs; the text as typed is part of a value."""
    for name, column in columns(table):
        ends_elsewhere = name == "to_point" and getattr(old, "to_board_id", "") != getattr(row, "to_board_id", "")
        is_other = getattr(old, name) != getattr(row, name) or old.as_typed(name) != row.as_typed(name)
        if name in given and (is_other or ends_elsewhere):
            yield name, column.name
            if ends_elsewhere:
                yield "to_board_id", column.name


def _with_values(old: Row, row: Row, names: Sequence[str]) -> Row:
    values: dict[str, Any] = {name: getattr(row, name) for name in names}
    return replace(old, typed=_typed(old.typed, row.typed, names), **values)


def _typed(old: Typed, new: Typed, names: Collection[str]) -> Typed:
    """The texts as typed of a row of which the named fields are set anew."""
    kept = [(name, text) for name, text in old if name not in names]
    return tuple(sorted([*kept, *((name, text) for name, text in new if name in names)]))


class _Readings:
    """Readings that come in under the tag of one that is there, with other values."""

    def __init__(self, into: Site, incoming: Site, given: Collection[str], merged: Merge) -> None:
        self._given = given
        self._merged = merged
        self._readings = into.readings
        self._incoming = incoming.readings

    def take(self, differing: Sequence[tuple[Row, Row]]) -> None:
        """Leave each one that has been taken in before, and let a further reading replace the others."""
        if not differing:
            return
        self._tags = {row.tag for row in (*self._readings, *self._incoming)}
        self._ids = {row.id for row in (*self._readings, *self._incoming)}
        self._superseded = {row.replaces_id for row in self._incoming if row.replaces_id}
        self._replacing: defaultdict[str, list[Reading]] = defaultdict(list)
        for reading in self._readings:
            if reading.replaces_id:
                self._replacing[reading.replaces_id].append(reading)
        for old, row in differing:
            assert isinstance(old, Reading)
            assert isinstance(row, Reading)
            self._take(old, row)

    def _take(self, old: Reading, row: Reading) -> None:
        merged = self._merged
        found = list(_differing("readings", old, row, self._given))
        chain = list(self._chain(old))
        of_the_reading = [name for name in self._given if name not in _NOT_OF_THE_READING]
        if not found or any(not list(_differing("readings", later, row, of_the_reading)) for later in chain[1:]):
            merged.left["readings"] += 1
            return
        new = _with_values(old, row, [name for name, _ in found])
        can_be_taken = row.id not in self._superseded
        merged.differences += [
            Difference("readings", row.id, name, column, old, new, can_be_taken) for name, column in found
        ]
        if can_be_taken:
            self._replace(old, chain[-1], new)

    def _replace(self, old: Reading, last: Reading, new: Row) -> None:
        assert isinstance(new, Reading)
        if not last.tag:  # the site folder could not name it in ``replaces``
            last = replace(last, tag=self._new_tag(old.tag))
            self._merged.changed["readings"][last.id] = last, ("tag",)
        reason = new.reason if new.reason != old.reason and new.reason else REASON
        new = replace(new, tag=self._new_tag(old.tag), replaces_id=last.id, reason=reason)
        key = [getattr(new, f.name) for f in fields(new) if f.name != "id"]
        id_ = next(i for salt in count() if (i := row_id("readings", *key, salt=salt)) not in self._ids)
        self._ids.add(id_)
        self._merged.came_from[id_] = new.id
        self._merged.added["readings"].append(replace(new, id=id_))

    def _chain(self, reading: Reading) -> Iterator[Reading]:
        """The reading and what has replaced it, one after the other."""
        seen: set[str] = set()
        while reading.id not in seen:
            yield reading
            seen.add(reading.id)
            reading = self._replacing.get(reading.id, [reading])[-1]

    def _new_tag(self, tag: str) -> str:
        new = next(new for n in count(2) if (new := f"{tag}.{n}") not in self._tags)
        self._tags.add(new)
        return new


def _settings_taken(into: Site, settings: Mapping[str, Any] | None, merged: Merge) -> Site:
    """The site with the settings that come in."""
    if settings is None:
        return into
    values = {name: value for name, value in settings.items() if name != "typed"}
    if "limits" in values:
        values.setdefault("own_limits", None)  # a profile of the site's own comes and goes with its name
    typed: Typed = settings.get("typed", ())
    texts, before = dict(typed), dict(into.typed)
    names = [
        name for name, value in values.items() if value != getattr(into, name) or texts.get(name) != before.get(name)
    ]
    if not names:
        return into
    taken = replace(into, typed=_typed(into.typed, typed, names), **{name: values[name] for name in names})
    merged.settings = tuple(names)
    if into != Site(name=into.name):  # a file in which nothing is yet but the name that it was made with
        keys = {name: key for key, (name, _) in SETTINGS.items()} | {"own_limits": "limits", "prior": "prior"}
        merged.differences += [Difference(SITE, "", name, keys[name], into, taken) for name in names]
    return taken
