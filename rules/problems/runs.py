"""Runs that do not make a tree from ``way``, shared returns that do not, and loads at no point."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator

from rules.index import Index
from rules.problems.problem import Problem
from rules.record import RESERVED_POINTS, Load, Reading, Run
from rules.references import TO_BOARD
from rules.text import Suggestions, either, quoted

_RUN_PLACE = re.compile(r"run \d+( (start|end))?")
_SHARED = "shared:"


def run_problems(index: Index, suggestions: Suggestions) -> Iterator[Problem]:
    """Everything that is wrong with runs and loads beside their cells."""
    yield from circuit_problems("runs", index.site.runs, index, suggestions)
    yield from circuit_problems("loads", index.site.loads, index, suggestions)
    yield from _boards_at_the_end(index, suggestions)
    for circuit_id in index.circuits:
        yield from _tree(index, circuit_id)
        yield from _loads(index, circuit_id, suggestions)
    yield from _returns(index)


def circuit_problems(
    table: str, rows: Iterable[Run | Load | Reading], index: Index, suggestions: Suggestions
) -> Iterator[Problem]:
    """Rows of circuits that are not there."""
    known = [row.tag for row in index.circuits.values()]
    for row in rows:
        if row.circuit_id and row.circuit_id not in index.circuits:
            tag = row.circuit_id.removeprefix("?")
            hint = suggestions.ask(tag, known)
            what, accepted = f"{quoted(tag)} names no circuit", f"the tag of a circuit that is there{hint}"
            yield Problem(table, row.id, "circuit", what, accepted, ("circuits",))


def is_reserved(point: str) -> bool:
    """
    Whether a point's name has a meaning of its own, so that a surveyor cannot give it to a point.

    Examples
    --------
    >>> is_reserved("run 2"), is_reserved("run to the pump")
    (True, False)
    """
    return point in RESERVED_POINTS or point.startswith(TO_BOARD) or _RUN_PLACE.fullmatch(point) is not None


def _boards_at_the_end(index: Index, suggestions: Suggestions) -> Iterator[Problem]:
    known = [row.tag for row in index.boards.values()]
    for run in index.site.runs:
        if run.to_board_id and run.to_board_id not in index.boards:
            tag = run.to_board_id.removeprefix("?")
            hint = suggestions.ask(tag, known)
            what, accepted = f"{quoted(tag)} names no board", f"{TO_BOARD} and the tag of a board that is there{hint}"
            yield Problem("runs", run.id, "to", what, accepted, ("boards",))


def _tree(index: Index, circuit_id: str) -> Iterator[Problem]:
    """Every run starts where an earlier one has ended; one that ends at an earlier point closes a mesh."""
    reached: dict[str, None] = {"way": None}
    for run in index.runs_of(circuit_id):
        start, end = run.from_point, index.end_of(run)
        if not start or not end:
            continue  # reported as an empty cell
        first = len(reached) == 1
        if start != "way" and is_reserved(start):
            yield _reserved(run, "from", start, tuple(reached))
        elif start not in reached:
            reach = "the first run starts at way" if first else f"no earlier run ends at {quoted(start)}"
            what = f"{run.name} starts nowhere: {reach}"
            yield Problem("runs", run.id, "from", what, either(tuple(reached)), ("runs",))
        if start == end:
            what = f"{run.name} goes nowhere: it ends where it starts, at {quoted(start)}"
            yield Problem("runs", run.id, "to", what, "another point")
        elif not run.to_board_id and is_reserved(end) and not (end == "way" and not first):
            yield _reserved(run, "to", end, ())
        reached[end] = None


def _reserved(run: Run, column: str, point: str, reached: tuple[str, ...]) -> Problem:
    what = f"{quoted(point)} is a name that a surveyor's point may not have"
    return Problem("runs", run.id, column, what, either(reached) if reached else "any other name")


def _loads(index: Index, circuit_id: str, suggestions: Suggestions) -> Iterator[Problem]:
    points = index.points_of(circuit_id)
    tag = index.circuits[circuit_id].tag
    for load in index.loads_of(circuit_id):
        if load.point and load.point not in points:
            hint = suggestions.ask(load.point, points)
            what = f"circuit {quoted(tag)} has no point {quoted(load.point)}"
            yield Problem("loads", load.id, "point", what, either(points) + hint, ("runs",))
    for load in index.loads_of(circuit_id):
        low, high = load.lowest_voltage_v, load.highest_voltage_v
        if low is not None and high is not None and low > high:
            yield Problem(
                "loads",
                load.id,
                "lowest",
                f"{low:.12g} V is above the highest, {high:.12g} V",
                "a voltage not above the highest",
            )


def _returns(index: Index) -> Iterator[Problem]:
    """Runs of one ``shared:NAME`` go between the same two places and state one conductor."""
    leaders: dict[str, Run] = {}
    sizes: dict[str, str] = {}
    metals: dict[str, str] = {}
    for run in index.site.runs:
        text = run.return_conductor
        if text in ("", "own", "structure"):
            continue
        name = text.removeprefix(_SHARED)
        if name == text or not name.strip():
            what = f"{quoted(text)} is no return"
            yield Problem("runs", run.id, "return", what, "own, structure or shared:NAME")
            continue
        leader = leaders.setdefault(name, run)
        if _ends(run, index) != _ends(leader, index):
            what = f"{run.name} does not go between the same two places as the other runs of {quoted(text)}"
            accepted = f"{_ends_text(leader, index)}, points named alike in each circuit"
            yield Problem("runs", run.id, "return", what, accepted, ("circuits", "boards", "sources"))
        for column, stated, own in (
            ("return_size", sizes, run.return_size),
            ("return_material", metals, run.return_material),
        ):
            if own and stated.setdefault(name, own) != own:
                what = f"{quoted(own)} differs from the other runs of {quoted(text)}"
                yield Problem("runs", run.id, column, what, f"{stated[name]}, or an empty cell")


def _ends(run: Run, index: Index) -> tuple[str, str]:
    """Where a run begins and ends; ``way`` is a place on the board or source that feeds the circuit."""
    circuit = index.circuits.get(run.circuit_id)
    if run.from_point != "way" or circuit is None or circuit.fed_from is None:
        return run.from_point, index.end_of(run)
    return f"way on {circuit.fed_from.id}", index.end_of(run)


def _ends_text(run: Run, index: Index) -> str:
    circuit = index.circuits.get(run.circuit_id)
    feed = None if circuit is None else circuit.fed_from
    row = None if feed is None else index.boards.get(feed.id) or index.sources.get(feed.id)
    start = f"way on {row.tag}" if row is not None and run.from_point == "way" else run.from_point
    return f"from {quoted(start)} to {quoted(index.end_of(run))}"
