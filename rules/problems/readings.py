"""
Readings at places that are not there, along legs that the quantity does not have, or of no meter's.

What ``at`` may be follows from the quantity. On a busbar (no circuit, but a board or source) the one place
is ``bus``, for ``voltage``, ``current`` and ``residual``; ``temperature`` may be of ``ambient`` too.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from functools import partial
from itertools import chain
from typing import TypeAlias

from rules.index import Index
from rules.problems.problem import Problem
from rules.problems.runs import circuit_problems
from rules.record import Reading
from rules.references import feed_text
from rules.text import Suggestions, either, quoted

Places: TypeAlias = dict[str, tuple[str, ...]]
"""Names of the places of one circuit, by kind of place."""

PLACES_OF_QUANTITY = {
    "voltage": ("point",),
    "drop": ("point",),
    "joint": ("end", "device"),
    "current": ("run", "way"),
    "residual": ("run", "way"),
    "temperature": ("run", "end", "device", "ambient"),
    "resistance": ("point", "end", "device"),
}
BUSBAR_PLACES = {
    "voltage": ("bus",),
    "current": ("bus",),
    "residual": ("bus",),
    "temperature": ("bus", "ambient"),
}
_NAMED_LEG = "positive or negative"


def reading_problems(index: Index, suggestions: Suggestions) -> Iterator[Problem]:
    """Everything that is wrong with where readings were taken, and with what they replace."""
    yield from circuit_problems("readings", index.site.readings, index, suggestions)
    # Circuits have few shapes, and readings of them are taken at the same few places: each is asked once.
    right: defaultdict[tuple[object, ...], set[tuple[str, ...]]] = defaultdict(set)
    for circuit_id in index.circuits:
        readings = index.readings_of(circuit_id)
        if not readings:
            continue
        places = places_of(index, circuit_id)
        of_shape = right[tuple(places.values())]
        for reading in readings:
            taken = (reading.quantity, reading.at, reading.to, reading.leg)
            if taken not in of_shape:
                wrong = list(_on_circuit(reading, places, index, suggestions))
                yield from wrong
                if not wrong:
                    of_shape.add(taken)
    for reading in index.site.readings:
        if not reading.circuit_id or reading.board is not None:
            yield from _on_busbar(reading, index, suggestions)
    yield from _replacements(index, suggestions)


def places_of(index: Index, circuit_id: str) -> Places:
    """Where a meter can be put on a circuit, by kind of place; ``pole`` has the legs in which the device has one."""
    names = [run.name for run in index.runs_of(circuit_id)]
    circuit = index.circuits[circuit_id]
    has_device = circuit.device != "none"
    one_pole = circuit.device_leg in ("positive", "negative") and (circuit.device_poles or 1) < 2
    return {
        "point": ("bus", *index.points_of(circuit_id)),
        "run": tuple(names),
        "end": tuple(f"{name} {end}" for name in names for end in ("start", "end")),
        "device": ("device",) if has_device else (),
        "pole": (circuit.device_leg,) if one_pole else ("positive", "negative"),
        "way": ("way",),
        "ambient": ("ambient",),
    }


def _on_circuit(reading: Reading, places: Places, index: Index, suggestions: Suggestions) -> Iterator[Problem]:
    kinds = PLACES_OF_QUANTITY.get(reading.quantity)
    if kinds is None or not reading.at:
        return  # reported as a cell
    problem = partial(Problem, "readings", reading.id, seen_in=("circuits", "runs"))
    if not any(reading.at in places[kind] for kind in kinds):
        known = [name for kind in kinds for name in places[kind]]
        hint = suggestions.ask(reading.at, known)
        tag = quoted(index.circuits[reading.circuit_id].tag)
        what = f"{quoted(reading.at)} is no place of circuit {tag} for a {reading.quantity} reading"
        yield problem("at", what, either(known) + hint)
        return
    is_joint = reading.at in places["end"] or reading.at == "device"
    needs_to = reading.quantity == "drop" or (reading.quantity == "resistance" and not is_joint)
    yield from _to(reading, needs_to, places, suggestions)
    yield from _leg(reading, is_joint, places["pole"])


def _to(reading: Reading, needed: bool, places: Places, suggestions: Suggestions) -> Iterator[Problem]:
    """Where the stretch that was measured ends."""
    problem = partial(Problem, "readings", reading.id, "to", seen_in=("circuits", "runs"))
    points = places["point"]
    if not needed:
        if reading.to:
            yield problem(f"{reading.quantity} at {quoted(reading.at)} goes to no other place", "an empty cell")
    elif not reading.to:
        yield problem(f"is empty; {reading.quantity} goes from one point to another", either(points))
    elif reading.to not in points:
        hint = suggestions.ask(reading.to, points)
        yield problem(f"the circuit has no point {quoted(reading.to)}", either(points) + hint)
    elif reading.to == reading.at or (not places["device"] and {reading.at, reading.to} == {"bus", "way"}):
        yield problem(f"{quoted(reading.at)} and {quoted(reading.to)} are one point", "another point")


def _leg(reading: Reading, is_joint: bool, poles: tuple[str, ...]) -> Iterator[Problem]:
    problem = partial(Problem, "readings", reading.id, "leg")
    quantity, leg = reading.quantity, reading.leg
    one_leg = quantity == "resistance" or (quantity == "joint" and is_joint)
    if one_leg and reading.at != "device" and leg in ("", "both"):
        yield problem(f"{quantity} at {quoted(reading.at)} is on one leg, which must be named", _NAMED_LEG)
    elif one_leg and leg in ("positive", "negative") and leg not in poles and reading.at == "device":
        yield problem(f"the device has no pole in the {leg} leg", either(poles))
    elif quantity == "current" and leg == "both":
        yield problem("the clamp is around one conductor for a current", f"{_NAMED_LEG}, or an empty cell")
    elif quantity == "residual" and leg in ("positive", "negative"):
        yield problem("the clamp is around both conductors for a residual current", "both, or an empty cell")


def _on_busbar(reading: Reading, index: Index, suggestions: Suggestions) -> Iterator[Problem]:
    problem = partial(Problem, "readings", reading.id)
    if reading.board is None:
        what = "is empty, and so is board"
        yield problem("circuit", what, "the tag of a circuit, or in board that of a board or source")
        return
    if reading.circuit_id:
        yield problem("board", "names a busbar beside a circuit", "a board or source only where circuit is empty")
        return
    if reading.board.table == "circuits" or index.named(reading.board) is None:
        tag = feed_text(reading.board, index)
        boards, sources = index.site.boards, index.site.sources
        hint = suggestions.ask(tag, chain((row.tag for row in boards), (row.tag for row in sources)))
        accepted = f"the tag of a board or source that is there{hint}"
        yield problem("board", f"{quoted(tag)} names no board or source", accepted, seen_in=("boards", "sources"))
    places = BUSBAR_PLACES.get(reading.quantity)
    if places is None:
        if reading.quantity in PLACES_OF_QUANTITY:
            what = f"{reading.quantity} is not read on a busbar"
            yield problem("quantity", what, f"{either(tuple(BUSBAR_PLACES))}, or a circuit")
        return
    if reading.at and reading.at not in places:
        yield problem(
            "at", f"{quoted(reading.at)} is no place on a busbar for a {reading.quantity} reading", either(places)
        )
    if reading.to:
        yield problem("to", f"{reading.quantity} on a busbar goes to no other place", "an empty cell")
    yield from _leg(reading, is_joint=False, poles=())


def _replacements(index: Index, suggestions: Suggestions) -> Iterator[Problem]:
    """A reading replaces one that is there, and no chain of replacements leads back to where it began."""
    problem = partial(Problem, "readings", column="replaces")
    known = [reading.tag for reading in index.site.readings if reading.tag]
    done: set[str] = set()
    for reading in index.site.readings:
        if not reading.replaces_id:
            continue
        replaced = index.readings.get(reading.replaces_id)
        if replaced is None:
            tag = reading.replaces_id.removeprefix("?")
            hint = suggestions.ask(tag, known)
            accepted = f"the tag of a reading that is there{hint}"
            yield problem(row=reading.id, what=f"{quoted(tag)} names no reading", accepted=accepted)
        elif not replaced.tag:
            what = "the reading that it replaces has no tag, by which the site folder could name it"
            yield problem(row=reading.id, what=what, accepted="a reading with a tag")
        way: dict[str, None] = {}
        here: Reading | None = reading
        while here is not None and here.id not in done and here.id not in way:
            way[here.id] = None
            here = index.readings.get(here.replaces_id)
        if here is not None and here.id in way:
            what = "replaces itself" if here.replaces_id == here.id else "is replaced by what it replaces"
            yield problem(row=here.id, what=what, accepted="an earlier reading")
        done.update(way)
