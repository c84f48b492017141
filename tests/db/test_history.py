"""Who changed what and when, with what was there before."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

from db.history import FieldChange
from db.store import SiteStore
from rules.record import Circuit, Reading, Site


def test_a_change_shows_what_was_there_before_with_its_text(store: SiteStore) -> None:
    with store.save("bob", "measured again") as save:
        save.change("runs", "r1", one_way_length_m=14.0, notes="wet")
    entry = store.history()[-1]
    assert (entry.who, entry.laptop, entry.why, entry.count) == ("bob", "lap", "measured again", 1)
    assert abs(entry.at - datetime.now(UTC)) < timedelta(minutes=1)
    (change,) = entry.changes
    assert (change.table, change.row, change.what) == ("runs", "r1", "changed")
    assert change.fields == (
        FieldChange("one_way_length_m", 13.716, 14.0, typed_before="45 ft"),
        FieldChange("notes", "", "wet"),
    )


def test_a_field_that_was_empty_when_its_row_was_made_was_empty_before(store: SiteStore) -> None:
    with store.save("bob", "a size at last") as save:
        save.change("runs", "r2", size="2.5 mm2", parallel=2)
    assert store.history()[-1].changes[0].fields == (
        FieldChange("size", "", "2.5 mm2"),
        FieldChange("parallel", None, 2),
    )


def test_added_removed_and_restored_rows_show_their_values(store: SiteStore) -> None:
    with store.save("ann", "add") as save:
        id_ = save.add("readings", Reading(id="", circuit_id="c2", round="1", quantity="voltage", at="way", value=0.0))
    with store.save("ann", "a slip") as save:
        save.remove("readings", id_)
    store.undo("ann")
    changes = [entry.changes[0] for entry in store.history()[-3:]]
    assert [change.what for change in changes] == ["added", "removed", "restored"]
    values = {field.field: (field.before, field.after) for field in changes[1].fields}
    assert values == {
        "circuit_id": ("c2", None),
        "round": ("1", ""),
        "quantity": ("voltage", ""),
        "at": ("way", ""),
        "value": (0.0, None),
    }
    assert {field.field: (field.after, field.before) for field in changes[2].fields} == values


def test_the_history_of_a_circuit_is_found_by_every_tag_it_had_and_leaves_others_out(store: SiteStore) -> None:
    with store.save("ann", "rename") as save:
        save.change("circuits", "c1", tag="NEW")
    with store.save("ann", "another") as save:
        save.change("circuits", "c2", notes="wet")
        save.change("runs", "r1", notes="dry")
    with store.save("ann", "settings") as save:
        save.settings(notes="c1")
    for tag in ("NEW", "DB1-01"):
        entries = store.history(tag)
        assert [entry.why for entry in entries] == ["first", "rename", "another"]
        assert [(change.table, change.row) for change in entries[2].changes] == [("runs", "r1")]
        assert {change.row for change in entries[0].changes} == {"c1", "r1", "l1", "x1", "x2"}
    assert store.history("no such tag") == ()


def test_the_history_of_a_removed_circuit_is_still_there(store: SiteStore) -> None:
    with store.save("ann", "remove") as save:
        save.remove("circuits", "c2")
        save.remove("runs", "r2")
    assert [entry.why for entry in store.history("DB1-02")] == ["first", "remove"]


def test_a_large_save_lists_its_first_changes_and_counts_all(store: SiteStore) -> None:
    with store.save("ann", "intake") as save:
        save.add_all("circuits", [Circuit(id="", tag=f"C{n}") for n in range(50)])
    entry = store.history(most=5)[-1]
    assert (entry.count, len(entry.changes)) == (50, 5)


def test_stamps_grow_even_if_the_clock_goes_back(store: SiteStore, site: Site) -> None:
    connection = store._db.conn
    far = connection.execute("SELECT max(stamp) FROM saves").fetchone()[0] + 10**9
    with store.save("ann", "a laptop whose clock is days ahead") as save:
        save.settings(name="ahead")
    connection.execute("UPDATE saves SET stamp = ? WHERE id = ?", (far, save.id))
    for n in range(3):
        with store.save("ann", str(n)) as save:
            save.settings(name=str(n))
    stamps = [row[0] for row in connection.execute("SELECT stamp FROM saves ORDER BY rowid")]
    assert stamps[1:] == [far, far + 1, far + 2, far + 3]
    assert store.site().name == "2"
