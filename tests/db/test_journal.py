"""What is in force, as a function of the set of saves and changes alone."""

from __future__ import annotations

import random
import shutil
from contextlib import suppress
from pathlib import Path
from tempfile import TemporaryDirectory

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from db.errors import Damaged, RefusedSave
from db.journal import ChangeRow, current, next_stamp, replaced, state
from db.schema import SCHEMA
from db.store import SiteStore
from db.tables import insert_rows
from db.writes import Cell, Write
from rules.record import Board, Circuit, Feed, Reading, Run, Site, rows_of

pytestmark = pytest.mark.usefixtures("no_waiting_for_the_disk")


def write(save: str, stamp: int, values: dict[str, object] | None, **saw: tuple[str, ...]) -> Write:
    """One write; ``every`` stands for ``*``."""
    cells = None if values is None else {name: Cell(value) for name, value in values.items()}
    return Write(save, stamp, cells, {"*" if name == "every" else name: saves for name, saves in saw.items()})


FIRST = write("s1", 1, {"position": 1, "tag": "B1", "notes": "dry"})


def test_a_later_write_that_saw_the_first_is_in_force() -> None:
    row = state([write("s2", 2, {"notes": "wet"}, notes=("s1",)), FIRST])
    assert row.cells["notes"].value == "wet"
    assert row.cells["tag"].value == "B1"
    assert row.conflicts == ()


def test_two_writes_that_knew_nothing_of_each_other_are_a_conflict_and_the_later_one_counts() -> None:
    row = state(
        [FIRST, write("s3", 3, {"notes": "flooded"}, notes=("s1",)), write("s2", 2, {"notes": "wet"}, notes=("s1",))]
    )
    assert row.cells["notes"].value == "flooded"
    assert row.conflicts == ("notes",)
    assert [head.save for head in row.heads["notes"]] == ["s3", "s2"]


def test_at_the_same_stamp_the_greater_id_counts() -> None:
    row = state([FIRST, write("a", 2, {"notes": "a"}, notes=("s1",)), write("b", 2, {"notes": "b"}, notes=("s1",))])
    assert row.cells["notes"].value == "b"


def test_the_same_value_twice_is_no_conflict() -> None:
    row = state([FIRST, write("a", 2, {"notes": "wet"}, notes=("s1",)), write("b", 3, {"notes": "wet"}, notes=("s1",))])
    assert row.cells["notes"].value == "wet"
    assert row.conflicts == ()


def test_a_write_that_saw_all_heads_settles_a_conflict() -> None:
    heads = [FIRST, write("s2", 2, {"notes": "wet"}, notes=("s1",)), write("s3", 3, {"notes": "dry"}, notes=("s1",))]
    row = state([*heads, write("s4", 4, {"notes": "wet"}, notes=("s2", "s3"))])
    assert row.cells["notes"].value == "wet"
    assert row.conflicts == ()


def test_a_removal_that_saw_everything_removes() -> None:
    assert state([FIRST, write("s2", 2, None, every=("s1",))]).is_removed


def test_a_change_that_a_removal_did_not_see_keeps_the_row_whole() -> None:
    row = state([FIRST, write("s2", 2, {"notes": "wet"}, notes=("s1",)), write("s3", 3, None, every=("s1",))])
    assert not row.is_removed
    assert {name: cell.value for name, cell in row.cells.items()} == {"position": 1, "tag": "B1", "notes": "wet"}


def test_what_a_write_replaced_is_found_through_a_removal_that_names_all_heads() -> None:
    change = write("s2", 2, {"notes": "wet"}, notes=("s1",))
    removal = write("s3", 3, None, every=("s1", "s2"))
    by_save = {w.save: w for w in (FIRST, change, removal)}
    assert replaced("notes", removal, by_save) == (change,)
    assert replaced("tag", removal, by_save) == (FIRST,)
    assert replaced("tag", FIRST, by_save) == ()


def test_a_removed_row_stays_while_a_living_row_refers_to_it_even_through_another_removed_row() -> None:
    stamps = {"s1": 1, "s2": 2, "s3": 3}
    changes: list[ChangeRow] = [
        ("s1", "boards", "db1", '{"position":1,"tag":"DB1"}', "{}"),
        ("s1", "circuits", "c1", '{"position":1,"tag":"B1","fed_from":"boards/db1/"}', "{}"),
        ("s2", "boards", "db1", None, '{"*":["s1"]}'),
        ("s2", "circuits", "c1", None, '{"*":["s1"]}'),
    ]
    assert not any(current(stamps, changes).values())
    changes.append(("s3", "runs", "r1", '{"position":1,"circuit_id":"c1","number":1}', "{}"))
    assert {table: list(rows) for table, rows in current(stamps, changes).items() if rows} == {
        "boards": ["db1"],
        "circuits": ["c1"],
        "runs": ["r1"],
    }


@pytest.mark.parametrize(
    "change",
    [
        ("s9", "boards", "db1", '{"position":1}', "{}"),
        ("s1", "boards", "db1", None, '{"*":["s1"]}'),
        ("s1", "cupboards", "db1", '{"position":1}', "{}"),
        ("s1", "boards", "db1", '{"position":1,"colour":"red"}', "{}"),
        ("s1", "boards", "db1", "[]", "{}"),
    ],
)
def test_a_journal_that_cannot_be_is_damage(change: ChangeRow) -> None:
    with pytest.raises(Damaged):
        current({"s1": 1}, [change])


def test_a_stamp_is_the_time_or_one_more_than_any_known() -> None:
    assert next_stamp(None) > 1_700_000_000_000
    assert next_stamp(5) > 1_700_000_000_000
    assert next_stamp(10**15) == 10**15 + 1


# --- two laptops


def combine(store: SiteStore, other: SiteStore) -> None:
    """The union of two journals, and tables that are what it comes to, without any of the care of a real file."""
    connection = store._db.conn
    connection.execute("BEGIN IMMEDIATE")
    connection.execute("PRAGMA defer_foreign_keys = ON")
    for table, width in (("saves", 7), ("changes", 5)):
        rows = other._db.conn.execute(f"SELECT * FROM {table}").fetchall()
        connection.executemany(f"INSERT OR IGNORE INTO {table} VALUES ({', '.join('?' * width)})", rows)
    wanted = current(*journal(store))
    for table in SCHEMA:
        connection.execute(f'DELETE FROM "{table}"')
        insert_rows(connection, table, list(wanted[table].values()))
    connection.execute("COMMIT")


def journal(store: SiteStore) -> tuple[dict[str, int], list[ChangeRow]]:
    """Stamps and changes of a file."""
    stamps = dict(store._db.conn.execute("SELECT id, stamp FROM saves").fetchall())
    return stamps, store._db.conn.execute("SELECT * FROM changes").fetchall()


START = Site(
    name="start",
    boards=(Board(id="db1", tag="DB1"), Board(id="db2", tag="DB2")),
    circuits=(Circuit(id="c1", tag="C1", fed_from=Feed("boards", "db1")), Circuit(id="c2", tag="C2")),
)


def edit(store: SiteStore, kind: str, place: int, value: int) -> None:
    """One of the things that a surveyor does; what is refused is left undone."""
    site = store.site()
    circuit = site.circuits[place % len(site.circuits)].id if site.circuits else "none"
    board = site.boards[value % len(site.boards)].id if site.boards else "none"
    with suppress(RefusedSave), store.save("ann", kind) as save:
        if kind == "add":
            save.add("circuits", Circuit(id="", tag=f"N{value}"))
        elif kind == "measure":
            new = Reading(id="", circuit_id=circuit, round="1", quantity="voltage", at="way", value=float(value))
            save.add("readings", new)
        elif kind == "note":
            save.change("circuits", circuit, walk_order=float(value), typed=(("walk_order", f"no. {value}"),))
        elif kind == "locate":
            save.change("circuits", circuit, location=f"room {value}")
        elif kind == "feed":
            save.change("circuits", circuit, fed_from=Feed("boards", board))
        elif kind == "remove board":
            save.remove("boards", board)
        elif kind == "remove circuit":
            save.remove("circuits", circuit)
        elif kind == "remove reading" and site.readings:
            save.remove("readings", site.readings[place % len(site.readings)].id)
        elif kind == "rename site":
            save.settings(name=f"name {value}")
    if kind == "undo":
        with suppress(RefusedSave):
            store.undo("ann")


KINDS = (
    "add",
    "measure",
    "note",
    "locate",
    "feed",
    "remove board",
    "remove circuit",
    "remove reading",
    "rename site",
    "undo",
)
EDITS = st.lists(
    st.tuples(st.integers(0, 1), st.sampled_from(KINDS), st.integers(0, 3), st.integers(0, 3)), max_size=10
)


@settings(max_examples=50, deadline=None)
@given(apart=EDITS, together=EDITS, seed=st.integers(0, 9))
def test_two_laptops_come_to_the_same_record_whoever_combines(
    apart: list[tuple[int, str, int, int]], together: list[tuple[int, str, int, int]], seed: int
) -> None:
    with TemporaryDirectory() as folder:
        paths = [Path(folder) / f"{name}.ohmwalk" for name in "ab"]
        SiteStore.create(paths[0], START, "ann", "start", "start").close()
        shutil.copy(paths[0], paths[1])
        with SiteStore(paths[0], laptop="a") as a, SiteStore(paths[1], laptop="b") as b:
            for which, kind, place, value in apart:
                edit((a, b)[which], kind, place, value)
            combine(a, b)
            combine(b, a)
            assert a.verify() == b.verify() == ()
            assert list(rows_of(a.site())) == list(rows_of(b.site()))
            # Once more changes nothing, and the order in which changes are read does not matter.
            before = current(*journal(a))
            combine(a, b)
            stamps, changes = journal(a)
            random.Random(seed).shuffle(changes)
            assert current(stamps, changes) == before
            # And one goes on from there, conflicts and rows kept by a reference included.
            for _, kind, place, value in together:
                edit(a, kind, place, value)
                assert a.verify() == ()


@pytest.fixture
def laptops(tmp_path: Path) -> tuple[SiteStore, SiteStore]:
    """Two copies of one file, each on a laptop of its own."""
    path = tmp_path / "a.ohmwalk"
    SiteStore.create(path, START, "ann", "start", "start").close()
    shutil.copy(path, tmp_path / "b.ohmwalk")
    return SiteStore(path, laptop="a"), SiteStore(tmp_path / "b.ohmwalk", laptop="b")


def test_a_conflict_is_settled_by_saving_the_value_that_is_in_force(laptops: tuple[SiteStore, SiteStore]) -> None:
    a, b = laptops
    for store, location in ((a, "cellar"), (b, "attic")):
        with store.save("ann", "where") as save:
            save.change("circuits", "c1", location=location)
    combine(a, b)
    in_force = a.site().circuits[0].location  # within one millisecond the saves' ids decide
    assert in_force in ("cellar", "attic")
    with a.save("ann", "nothing new elsewhere") as save:
        save.change("circuits", "c2", location="")
    assert not save.is_written
    with a.save("ann", "it is there") as save:
        save.change("circuits", "c1", location=in_force)
    assert save.is_written
    writes = [change for change in journal(a)[1] if change[2] == "c1" and change[0] == save.id]
    assert [len(saw.split(",")) for *_, saw in writes] == [2]
    assert a.verify() == ()
    a.close()
    b.close()


def test_the_text_of_each_field_stays_with_its_value_when_two_change_one_row(
    laptops: tuple[SiteStore, SiteStore],
) -> None:
    a, b = laptops
    with a.save("ann", "order") as save:
        save.change("circuits", "c1", walk_order=3.0, typed=(("walk_order", "third"),))
    with b.save("bob", "rating") as save:
        save.change("circuits", "c1", rated_current_a=16.0, typed=(("rated_current_a", "16 amps"),))
    combine(a, b)
    circuit = a.site().circuits[0]
    assert (circuit.walk_order, circuit.rated_current_a) == (3.0, 16.0)
    assert circuit.typed == (("rated_current_a", "16 amps"), ("walk_order", "third"))
    a.close()
    b.close()


def test_a_row_kept_by_a_reference_alone_goes_with_the_reference(laptops: tuple[SiteStore, SiteStore]) -> None:
    a, b = laptops
    with a.save("ann", "no such circuit") as save:
        save.remove("circuits", "c1")
    with a.save("ann", "nor its board") as save:
        save.remove("boards", "db1")
    with b.save("bob", "its run") as save:
        save.add("runs", Run(id="r1", circuit_id="c1", number=1))
    combine(a, b)
    assert [row.id for row in a.site().circuits] == ["c1", "c2"]
    assert [row.id for row in a.site().boards] == ["db1", "db2"]
    with a.save("ann", "nor its run") as save:
        save.remove("runs", "r1")
    assert [row.id for row in a.site().circuits] == ["c2"]
    assert [row.id for row in a.site().boards] == ["db2"]
    assert a.verify() == ()
    a.close()
    b.close()


def test_two_laptops_that_add_one_tag_share_its_row(laptops: tuple[SiteStore, SiteStore]) -> None:
    a, b = laptops
    ids = []
    for store, location in ((a, ""), (b, "attic")):
        with store.save("ann", "add") as save:
            ids.append(save.add("circuits", Circuit(id="", tag="B1-07", location=location)))
    assert ids[0] == ids[1]
    combine(a, b)
    assert [(row.tag, row.location) for row in a.site().circuits[2:]] == [("B1-07", "attic")]
    a.close()
    b.close()
