"""Random edits, undone and redone: the tables are what the journal comes to, at all times."""

from __future__ import annotations

import tempfile
from contextlib import suppress
from pathlib import Path

import pytest
from hypothesis import settings
from hypothesis import strategies as st
from hypothesis.stateful import Bundle, RuleBasedStateMachine, consumes, initialize, invariant, multiple, rule

from db.errors import DuplicateTag, StillReferred, UnknownRow
from db.store import SiteStore
from rules.record import Board, Circuit, Feed, Reading, Row, Run, rows_of

pytestmark = pytest.mark.usefixtures("no_waiting_for_the_disk")

TAGS = st.sampled_from(["B1", "B2", "[b]3", "B4 + B5"])
LENGTHS = st.sampled_from([None, 0.0, 12.5, 13.716])
TYPED = st.sampled_from([None, "45 ft", "12 m"])


class Edits(RuleBasedStateMachine):
    """One person edits a site through one store; a list of what the record was says what undoing must give."""

    circuits = Bundle("circuits")
    runs = Bundle("runs")

    @initialize()
    def open(self) -> None:
        self.folder = tempfile.TemporaryDirectory()
        self.store = SiteStore.create(Path(self.folder.name) / "a.ohmwalk", None, "ann", "lap", "new")
        with self.store.save("bob", "a board by someone else") as save:
            save.add("boards", Board(id="db1", tag="DB1"))
        self.before: list[dict[tuple[str, str], Row]] = []
        self.after: list[dict[tuple[str, str], Row]] = []
        self.rows = self.read()
        self.settings = self.store.site().notes

    def read(self) -> dict[tuple[str, str], Row]:
        return {(table, row.id): row for table, row in rows_of(self.store.site())}

    def saved(self) -> None:
        """A save was made: remember what was before, if it changed anything."""
        rows = self.read()
        if rows != self.rows:
            self.before.append(self.rows)
            self.after.clear()
        self.rows = rows

    @rule(target=circuits, tag=TAGS, is_fed=st.booleans())
    def add_circuit(self, tag: str, is_fed: bool) -> object:
        try:
            with self.store.save("ann", f"add {tag}") as save:
                id_ = save.add("circuits", Circuit(id="", tag=tag, fed_from=Feed("boards", "db1") if is_fed else None))
        except DuplicateTag:
            assert tag in {row.tag for row in self.rows.values() if isinstance(row, Circuit)}
            return multiple()
        assert self.store.site().circuits[-1].id == id_
        self.saved()
        return id_

    @rule(target=runs, circuit=circuits, number=st.integers(1, 3), length=LENGTHS)
    def add_run(self, circuit: str, number: int, length: float | None) -> object:
        if ("circuits", circuit) not in self.rows:
            return multiple()
        try:
            with self.store.save("ann", "add a run") as save:
                id_ = save.add("runs", Run(id="", circuit_id=circuit, number=number, one_way_length_m=length))
        except DuplicateTag:
            return multiple()
        self.saved()
        return id_

    @rule(run=runs, length=LENGTHS, typed=TYPED, notes=st.sampled_from(["", "wet"]))
    def change_run(self, run: str, length: float | None, typed: str | None, notes: str) -> None:
        texts = () if typed is None else (("one_way_length_m", typed),)
        with suppress(UnknownRow), self.store.save("ann", "change a run") as save:
            save.change("runs", run, typed=texts, one_way_length_m=length)
            save.change("runs", run, notes=notes)
        if ("runs", run) in self.rows:
            row = self.read()["runs", run]
            assert isinstance(row, Run)
            assert (row.one_way_length_m, row.notes, row.typed) == (length, notes, texts)
        self.saved()

    @rule(circuit=circuits, tag=TAGS)
    def rename(self, circuit: str, tag: str) -> None:
        with suppress(UnknownRow, DuplicateTag), self.store.save("ann", f"rename to {tag}") as save:
            save.change("circuits", circuit, tag=tag)
        self.saved()

    @rule(circuit=circuits, values=st.lists(st.floats(-60, 60), min_size=1, max_size=3))
    def add_readings(self, circuit: str, values: list[float]) -> None:
        if ("circuits", circuit) in self.rows:
            rows = [
                Reading(id="", circuit_id=circuit, round="1", quantity="voltage", at="way", value=v) for v in values
            ]
            with self.store.save("ann", "a round") as save:
                save.add_all("readings", rows)
            assert [row.value for row in self.store.site().readings][-len(values) :] == values
            self.saved()

    @rule(circuit=circuits)
    def remove_circuit(self, circuit: str) -> None:
        """Alone: refused where anything refers to it."""
        referred = any(getattr(row, "circuit_id", "") == circuit for row in self.rows.values())
        try:
            with self.store.save("ann", "remove a circuit") as save:
                save.remove("circuits", circuit)
        except StillReferred:
            assert referred
        except UnknownRow:
            assert ("circuits", circuit) not in self.rows
        else:
            assert not referred
        self.saved()

    @rule(circuit=consumes(circuits))
    def remove_with_all_it_has(self, circuit: str) -> None:
        with suppress(UnknownRow), self.store.save("ann", "remove a circuit and what it has") as save:
            save.remove("circuits", circuit)
            for (table, id_), row in self.rows.items():
                if getattr(row, "circuit_id", "") == circuit:
                    save.remove(table, id_)
        assert ("circuits", circuit) not in self.read()
        self.saved()

    @rule(notes=st.sampled_from(["", "north wing first"]))
    def note_by_someone_else(self, notes: str) -> None:
        """What one person undoes leaves alone what another wrote."""
        with self.store.save("bob", "notes") as save:
            save.settings(notes=notes)
        self.settings = notes

    @rule()
    def undo(self) -> None:
        offered = self.store.undoable("ann")
        undone = self.store.undo("ann")
        assert undone == offered
        assert (undone is not None) == bool(self.before)
        if self.before:
            self.after.append(self.rows)
            self.rows = self.before.pop()

    @rule()
    def redo(self) -> None:
        offered = self.store.redoable("ann")
        redone = self.store.redo("ann")
        assert redone == offered
        assert (redone is not None) == bool(self.after)
        if self.after:
            self.before.append(self.rows)
            self.rows = self.after.pop()

    @invariant()
    def the_record_is_what_it_should_be(self) -> None:
        assert self.read() == self.rows
        assert self.store.site().notes == self.settings

    @invariant()
    def the_tables_are_what_the_journal_comes_to(self) -> None:
        assert self.store.verify() == ()

    def teardown(self) -> None:
        self.store.close()
        self.folder.cleanup()


TestEdits = Edits.TestCase
TestEdits.settings = settings(max_examples=25, stateful_step_count=25, deadline=None)
