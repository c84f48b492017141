"""
The ids of rows that come in: those of the rows that are there already, or new ones.

A row is known by its tag (``KEY_FIELDS``), a row without a tag by all that it holds: the n-th row alike is the
n-th row. So the same folder taken in twice gives the same ids, on whatever laptop.
"""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import fields
from functools import cache
from itertools import repeat
from operator import attrgetter
from typing import Any

from rules.record import KEY_FIELDS, TABLES, Reading, Site, missing, row_id

_SEPARATOR = "\x1f"
"""What ``row_id`` puts between the parts of a key; no text of the record holds it."""


class Known:
    """The rows of the site that a table is taken into, by what they are known by; without a site there are none."""

    def __init__(self, site: Site | None = None) -> None:
        self._site = site
        self._by_key: dict[str, Mapping[str, Sequence[str]]] = {}
        self._used: dict[str, set[str]] = {}

    def tag_ids(self, table: str) -> dict[str, str]:
        """Id of each tag of sources, boards, circuits, or of readings that have one."""
        ids: dict[str, str] = {}
        for row in self._rows(table):
            tag: str = row.tag
            if tag:
                ids.setdefault(tag, row.id)
        return ids

    def ids(self, table: str, columns: Mapping[str, Sequence[Any]], count: int) -> list[str]:
        """
        Ids for rows that come in.

        Parameters
        ----------
        table : str
            Their table.
        columns : dict
            By field, its values down the rows; a field that is left out is empty in all of them.
        count : int
            How many rows.

        Returns
        -------
        list of str
            One for each row, all different: that of the row that is there already and is known by the same, else a
            new one.
        """
        keys = _keys(table, columns, count)
        there, used = self._rows_by_key(table), self._used_in(table)
        ids = [row_id(table, key) for key in keys]
        if not used and len(set(ids)) == count:
            return ids  # by far the most frequent
        alike = Counter[str]()
        given: set[str] = set()
        for n, key in enumerate(keys):
            nth, alike[key] = alike[key], alike[key] + 1
            same = there.get(key, ())
            if nth < len(same):
                ids[n] = same[nth]
            else:
                salt = nth
                while (new := row_id(table, key, salt=salt)) in used or new in given:
                    salt += 1
                ids[n] = new
            given.add(ids[n])
        if table == "readings":
            self._by_reading_tag(columns.get("tag", ()), ids)
        return ids

    def _by_reading_tag(self, tags: Sequence[str], ids: list[str]) -> None:
        """A reading with a tag that is not equal to one that is there is still known by its tag."""
        known, given = self.tag_ids("readings"), set(ids)
        for n, tag in enumerate(tags):
            if tag in known and known[tag] not in given:
                ids[n] = known[tag]
                given.add(ids[n])

    def _rows(self, table: str) -> Sequence[Any]:
        return () if self._site is None else self._site.table(table)

    def _used_in(self, table: str) -> set[str]:
        if table not in self._used:
            self._used[table] = {row.id for row in self._rows(table)}
        return self._used[table]

    def _rows_by_key(self, table: str) -> Mapping[str, Sequence[str]]:
        if table not in self._by_key:
            found: dict[str, list[str]] = defaultdict(list)
            rows = self._rows(table)
            if rows:
                columns = {name: list(map(attrgetter(name), rows)) for name, _ in _key_fields(table)}
                if table == "readings":
                    columns["replaces_id"] = self._replaced_tags(rows)
                for row, key in zip(rows, _keys(table, columns, len(rows)), strict=True):
                    found[key].append(row.id)
            self._by_key[table] = found
        return self._by_key[table]

    def _replaced_tags(self, rows: Sequence[Reading]) -> list[str]:
        """What each reading replaces, by its tag as in a file: ids do not stand there."""
        tags = {row.id: row.tag for row in rows}
        return [missing(tags.get(row.replaces_id, "")) if row.replaces_id else "" for row in rows]


def _keys(table: str, columns: Mapping[str, Sequence[Any]], count: int) -> list[str]:
    """What each row is known by, as one text; worked down the columns."""
    if not count:
        return []
    parts: list[Iterable[str]] = []
    for name, default in _key_fields(table):
        parts.append(map(str, columns[name]) if name in columns else repeat(str(default), count))
    return list(map(_SEPARATOR.join, zip(*parts, strict=False)))


@cache
def _key_fields(table: str) -> tuple[tuple[str, Any], ...]:
    """The fields that a row is known by, with what they are in an empty cell."""
    names = KEY_FIELDS.get(table)
    return tuple(
        (f.name, f.default) for f in fields(TABLES[table]) if f.name != "id" and (names is None or f.name in names)
    )
