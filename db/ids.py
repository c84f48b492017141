"""Ids of rows: what can be one, and how one is exchanged for another throughout a site."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from db.errors import InvalidValue
from db.schema import SCHEMA
from rules.record import TABLES, Feed, Row, Site, is_missing


def refuse_unfit(table: str, id_: str) -> None:
    """Refuse an id that would be read as something else: a slash parts a feed, ``?`` marks what is missing."""
    if not id_ or "/" in id_ or is_missing(id_) or not id_.isprintable():
        raise InvalidValue(f"{table}: {id_!r} cannot be the id of a row")


def with_ids_exchanged(site: Site, new: Mapping[tuple[str, str], str]) -> Site:
    """
    A site with ids exchanged, in rows and in references to them.

    Parameters
    ----------
    site
        Is left as it is.
    new
        The new id by table and old id.
    """
    if not new:
        return site
    for table in TABLES:
        referring = {field.name: field.targets[0] for field in SCHEMA[table].fields if field.targets}
        rows: list[Row] = []
        for row in site.table(table):
            fields: dict[str, Any] = {name: _exchanged(new, to, getattr(row, name)) for name, to in referring.items()}
            rows.append(replace(row, id=new.get((table, row.id), row.id), **fields))
        site = site.with_rows(table, tuple(rows))
    return site


def _exchanged(new: Mapping[tuple[str, str], str], table: str, old: Any) -> Any:
    if isinstance(old, Feed):
        return replace(old, id=new.get((old.table, old.id), old.id))
    if isinstance(old, tuple):
        return tuple(_exchanged(new, table, feed) for feed in old)
    return new.get((table, old), old)
