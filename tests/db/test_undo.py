"""Undoing one's own last save, as long as nobody has written over it. ``test_machine.py`` has the long stories."""

from __future__ import annotations

from pathlib import Path

import pytest

from db.errors import StillReferred
from db.store import SiteStore
from rules.record import Circuit, Feed, Reading, Site


def test_undoing_says_what_it_undid_and_the_history_says_so_too(store: SiteStore, site: Site) -> None:
    with store.save("ann", "longer run 1") as save:
        save.change("runs", "r1", one_way_length_m=20.0)
    assert store.undoable("ann") == "longer run 1"
    assert store.redoable("ann") is None
    assert store.undo("ann") == "longer run 1"
    assert store.site() == site
    assert store.redoable("ann") == "longer run 1"
    assert store.redo("ann") == "longer run 1"
    assert store.site().runs[0].one_way_length_m == 20.0
    assert [entry.why for entry in store.history()[1:]] == ["longer run 1", "undo: longer run 1", "redo: longer run 1"]
    assert [entry.undoes for entry in store.history()[2:]] == [entry.id for entry in store.history()[1:3]]


def test_what_another_person_or_laptop_saved_is_not_mine_to_undo(store: SiteStore, path: Path) -> None:
    with store.save("bob", "by bob") as save:
        save.change("circuits", "c2", notes="by bob")
    assert store.undoable("ann") is None
    assert store.undo("ann") is None
    with SiteStore(path, laptop="other") as other:
        assert other.undoable("bob") is None
    assert store.undoable("bob") == "by bob"


def test_a_save_that_was_written_over_cannot_be_undone(store: SiteStore) -> None:
    with store.save("ann", "by ann") as save:
        save.change("circuits", "c2", notes="by ann", location="cellar")
    with store.save("bob", "by bob") as save:
        save.change("circuits", "c2", notes="by bob")
    assert store.undoable("ann") is None
    assert store.undo("ann") is None
    assert store.undo("bob") == "by bob"
    # What bob undid is as if it had never been.
    assert store.undo("ann") == "by ann"
    assert store.site().circuits[1].notes == ""


def test_other_fields_that_another_wrote_stay(store: SiteStore) -> None:
    with store.save("ann", "by ann") as save:
        save.change("circuits", "c2", notes="by ann")
    with store.save("bob", "by bob") as save:
        save.change("circuits", "c2", location="cellar")
    assert store.undo("ann") == "by ann"
    assert (store.site().circuits[1].notes, store.site().circuits[1].location) == ("", "cellar")


def test_a_row_that_another_has_changed_is_not_removed_by_undoing_its_addition(store: SiteStore) -> None:
    with store.save("ann", "add") as save:
        save.add("circuits", Circuit(id="n", tag="N"))
    with store.save("bob", "where") as save:
        save.change("circuits", "n", location="cellar")
    assert store.undo("ann") is None
    assert store.site().circuits[-1].id == "n"


def test_undoing_the_addition_of_what_others_refer_to_is_refused(store: SiteStore) -> None:
    with store.save("ann", "add") as save:
        save.add("circuits", Circuit(id="n", tag="N"))
    with store.save("bob", "measure") as save:
        save.add("readings", Reading(id="", circuit_id="n", round="1", quantity="voltage", at="way", value=54.0))
    with pytest.raises(StillReferred, match="circuit 'N' cannot be removed: a voltage reading"):
        store.undo("ann")
    assert store.verify() == ()


def test_the_save_that_made_the_file_cannot_be_undone(store: SiteStore, site: Site) -> None:
    assert store.undoable("ann") is None
    assert store.undo("ann") is None
    assert store.site() == site


def test_a_large_addition_is_undone_whole(store: SiteStore, site: Site) -> None:
    with store.save("ann", "intake") as save:
        save.add_all("circuits", [Circuit(id="", tag=f"C{n}", fed_from=Feed("boards", "db1")) for n in range(2000)])
    assert store.undo("ann") == "intake"
    assert store.site() == site
    assert store.redo("ann") == "intake"
    assert [row.tag for row in store.site().circuits[2:]] == [f"C{n}" for n in range(2000)]
    assert store.verify() == ()
