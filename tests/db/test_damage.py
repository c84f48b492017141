"""A damaged file never gives a wrong record unnoticed, and never a traceback."""

from __future__ import annotations

import random
import re
from pathlib import Path

import pytest

from db.errors import FileFault, NotASiteFile
from db.store import SiteStore
from rules.record import Site, rows_of

pytestmark = pytest.mark.usefixtures("no_waiting_for_the_disk")

FLIPS = 250
FLIPS_LONG = 20_000


def read(path: Path) -> tuple[Site | None, tuple[str, ...]]:
    """The record, or ``None`` where the file was refused; and what ``verify`` says."""
    try:
        with SiteStore(path, read_only=True) as store:
            found = store.verify()
            return store.site(), found
    except NotASiteFile as error:
        return None, (str(error),)
    except FileFault as error:  # a flip in the header can make it newer, locked or read-only
        return None, (str(error),)


def flipped_bytes(path: Path, site: Site, count: int) -> int:
    """Flip one bit at a time in bytes that hold something; how many flips were noticed."""
    whole = path.read_bytes()
    places = [place for place, byte in enumerate(whole) if byte]
    chance = random.Random(1)
    noticed = 0
    for place in chance.choices(places, k=count):
        damaged = bytearray(whole)
        damaged[place] ^= 1 << chance.randrange(8)
        path.write_bytes(damaged)
        record, problems = read(path)
        assert all(problem.isprintable() for problem in problems), f"byte {place}: {problems}"
        if problems:
            noticed += 1
        else:
            assert record == site, f"byte {place}: a wrong record without a word"
            assert record is not None
            assert list(rows_of(record)) == list(rows_of(site)), f"byte {place}: other ids or another order"
    return noticed


def test_a_flipped_bit_is_noticed_or_does_not_matter(store: SiteStore, path: Path, site: Site) -> None:
    store.close()
    # What is not noticed lies in pages that SQLite rebuilds or ignores; most of what holds data must be.
    assert flipped_bytes(path, site, FLIPS) > FLIPS / 2


@pytest.mark.long
def test_very_many_flipped_bits_are_noticed_or_do_not_matter(store: SiteStore, path: Path, site: Site) -> None:
    store.close()
    assert flipped_bytes(path, site, FLIPS_LONG) > FLIPS_LONG / 2


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.999])
def test_a_file_that_was_cut_short_is_refused(store: SiteStore, path: Path, share: float) -> None:
    store.close()
    whole = path.read_bytes()
    path.write_bytes(whole[: int(len(whole) * share)])
    with pytest.raises(NotASiteFile, match="damaged") as caught:
        SiteStore(path)
    assert caught.value.exit_status == 3


@pytest.mark.parametrize(
    ("statement", "what"),
    [
        ("UPDATE readings SET value = 54.06 WHERE id = 'x1'", "readings: the row x1 is not what the journal comes to"),
        ("DELETE FROM readings WHERE id = 'x2'", "readings: the row x2 is not what the journal comes to"),
        ("INSERT INTO visits VALUES ('v9', 1, 'x', '', '', '', NULL, '', '[]')", "visits: the row v9 is not"),
        ("UPDATE changes SET \"values\" = replace(\"values\", '54.05', '54.06')", "is not as it was written"),
        ("UPDATE saves SET who = 'someone else'", "is not as it was written"),
        ("DELETE FROM changes WHERE row = 'x1'", "is not as it was written"),
        (
            "UPDATE runs SET circuit_id = 'c9' WHERE id = 'r1'",
            "runs: a row refers to a row of circuits that is not there",
        ),
        ("UPDATE changes SET \"values\" = '{' WHERE row = 'x1'", "the journal .* cannot be read"),
        ("UPDATE boards SET fed_by = '[\"sources/s9/\"]'", "boards: the row db1 is not what the journal comes to"),
    ],
)
def test_verify_names_what_is_not_as_it_was_saved(store: SiteStore, statement: str, what: str) -> None:
    store._db.conn.execute("PRAGMA foreign_keys = OFF")
    store._db.conn.execute(statement)
    problems = store.verify()
    assert any(re.search(what, problem) for problem in problems), problems


def test_opening_looks_at_the_last_save(store: SiteStore, path: Path) -> None:
    with store.save("ann", "last") as save:
        save.change("readings", "x1", value=50.0)
    store._db.conn.execute("UPDATE readings SET value = 51.0 WHERE id = 'x1'")
    store.close()
    with pytest.raises(NotASiteFile, match="a reading is not as the last save wrote it"):
        SiteStore(path)


def test_opening_finds_a_last_save_that_lost_a_change(store: SiteStore, path: Path) -> None:
    with store.save("ann", "last") as save:
        save.change("readings", "x1", value=50.0)
    store._db.conn.execute("DELETE FROM changes WHERE save = ?", (save.id,))
    store.close()
    with pytest.raises(NotASiteFile, match="its last save is not as it was written"):
        SiteStore(path)


def test_a_feed_that_refers_to_nothing_is_found_by_verify_though_no_foreign_key_does(store: SiteStore) -> None:
    connection = store._db.conn
    connection.execute("PRAGMA foreign_keys = OFF")
    connection.execute("DELETE FROM sources WHERE id = 'rect'")
    connection.execute("DELETE FROM changes WHERE row = 'rect'")
    assert "boards: the row db1 refers to a row of sources that is not there" in store.verify()
