"""What is saved comes back equal, whatever the texts and numbers are."""

from __future__ import annotations

from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from db.schema import KEYS, SCHEMA, SITE, Field
from db.store import SiteStore
from rules.record import TABLES, Feed, Row, Site, rows_of

pytestmark = pytest.mark.usefixtures("no_waiting_for_the_disk")

NASTY = st.one_of(
    st.sampled_from(
        [
            "[bold]x[/]",
            "=1+1",
            "'; DROP TABLE runs; --",
            "a/b/c",
            "\x00",
            "\x1b]0;x\x07",
            "\u202eabc",
            "😀",
            "null",
            "1e999",
            '"',
            "\\",
        ]
    ),
    st.text(st.characters(exclude_categories=["Cs"]), max_size=12),
)
"""Text as it may come from outside; half of a surrogate pair is no text."""

NUMBERS = st.floats(allow_nan=False, allow_infinity=False)
WHOLE = st.integers(-(2**63) + 1, 2**63 - 1)
SHARES = st.lists(st.tuples(NASTY, NUMBERS), max_size=3).map(tuple)


@st.composite
def values(draw: st.DrawFn, field: Field, ids: dict[str, list[str]]) -> Any:
    """A value that a field can hold, a reference to one of the rows made so far or that will be made."""
    if field.kind in ("feed", "feeds", "reference"):
        known = [(table, id_) for table in field.targets for id_ in ids[table]]
        if field.kind == "reference":
            return draw(st.sampled_from([id_ for _, id_ in known] + ([""] if field.nullable else [])))
        if not known:
            return () if field.kind == "feeds" else None
        feed = st.builds(lambda place, point: Feed(place[0], place[1], point), st.sampled_from(known), NASTY)
        return draw(st.lists(feed, max_size=3).map(tuple) if field.kind == "feeds" else st.none() | feed)
    strategy: st.SearchStrategy[Any] = {"text": NASTY, "number": NUMBERS, "whole": WHOLE, "shares": SHARES}[field.kind]
    return draw(strategy | st.none() if field.nullable else strategy)


@st.composite
def fields_of(draw: st.DrawFn, table: str, ids: dict[str, list[str]]) -> dict[str, Any]:
    """The fields of one row, a few of them as typed."""
    fields: dict[str, Any] = {}
    # Most fields of a real row are empty: these keep their default.
    for field in SCHEMA[table].fields:
        is_needed = field.kind == "reference" and not field.nullable
        if is_needed or draw(st.integers(0, 2)) == 0:
            fields[field.name] = draw(values(field, ids))
    typed = draw(st.dictionaries(st.sampled_from([f.name for f in SCHEMA[table].fields]), NASTY, max_size=2))
    return {**fields, "typed": tuple(sorted(typed.items()))}


@st.composite
def sites(draw: st.DrawFn) -> Site:
    """A site with up to three rows in each table, tags all different, references that hold."""
    ids = {table: [f"{table}{n}" for n in range(draw(st.integers(0, 3)))] for table in TABLES}
    if not ids["circuits"]:
        ids["runs"] = ids["loads"] = []
    tables: dict[str, list[Row]] = {}
    for table, row_type in TABLES.items():
        tables[table] = []
        for n, id_ in enumerate(ids[table]):
            fields = draw(fields_of(table, ids))
            if "tag" in KEYS.get(table, ()):
                fields["tag"] = f"{fields.get('tag', '')}{n}"
            if table == "runs":
                fields["number"] = n
            tables[table].append(row_type(id=id_, **fields))
    return Site(**{"name": "", **draw(fields_of(SITE, ids))}, **{table: tuple(rows) for table, rows in tables.items()})  # type: ignore[arg-type]


@settings(max_examples=60, deadline=None)
@given(site=sites())
def test_a_site_comes_back_equal_with_its_ids_and_the_order_of_its_rows(site: Site) -> None:
    with (
        TemporaryDirectory() as folder,
        SiteStore.create(Path(folder) / "a.ohmwalk", site, "ann", "lap", "all") as store,
    ):
        assert store.site() == site
        assert list(rows_of(store.site())) == list(rows_of(site))
        assert store.verify() == ()


@settings(max_examples=20, deadline=None)
@given(site=sites())
def test_a_site_put_into_a_file_that_has_used_its_ids_is_equal_too(site: Site) -> None:
    with (
        TemporaryDirectory() as folder,
        SiteStore.create(Path(folder) / "a.ohmwalk", site, "ann", "lap", "all") as store,
    ):
        with store.save("ann", "away with it") as save:
            for table, row in rows_of(site):
                save.remove(table, row.id)
        assert list(rows_of(store.site())) == []
        with store.save("ann", "again") as save:
            save.put(site)
        again = store.site()
        assert again == site
        assert not {(table, row.id) for table, row in rows_of(again)} & {
            (table, row.id) for table, row in rows_of(site)
        }
        assert store.verify() == ()


def test_every_field_of_the_record_has_a_column_of_its_type(store: SiteStore) -> None:
    for table, schema in SCHEMA.items():
        columns = store._db.conn.execute(f'PRAGMA table_info("{table}")').fetchall()
        expected = [("id", "TEXT"), ("position", "INTEGER")]
        expected += [(field.name, field.sql_type) for field in schema.fields]
        # in any order: a column of a later migration stands last, and rows are read by name
        assert sorted((name, kind) for _, name, kind, *_ in columns) == sorted([*expected, ("typed", "TEXT")])
        must = {name for _, name, _, not_null, *_ in columns if not_null}
        assert must == {"id", "position", "typed", *(field.name for field in schema.fields if not field.nullable)}
        strict = store._db.conn.execute("SELECT strict FROM pragma_table_list WHERE name = ?", (table,)).fetchone()
        assert strict == (1,)
