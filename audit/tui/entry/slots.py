"""The cells of a round: where she reads what, in walking order, and what stands there already."""

from __future__ import annotations

import re
from dataclasses import dataclass, replace
from datetime import datetime

from rules.index import Index
from rules.record import UNIT_OF_QUANTITY, Feed, Reading


@dataclass(frozen=True, slots=True)
class Place:
    """What a round is read on: a circuit, or the busbar of a board or source."""

    circuit_id: str = ""
    board: Feed | None = None

    @property
    def id(self) -> str:
        return self.circuit_id or (self.board.id if self.board is not None else "")


@dataclass(frozen=True, slots=True)
class Slot:
    """One cell of a round."""

    label: str
    quantity: str
    at: str
    leg: str = ""
    saved: Reading | None = None
    """What stands there already; of several readings of one place, the last."""

    @property
    def unit(self) -> str:
        return UNIT_OF_QUANTITY[self.quantity]

    def holds(self, reading: Reading) -> bool:
        """Whether a reading was taken here."""
        both = ("", "both")
        is_leg = reading.leg in both if self.quantity == "voltage" and not self.leg else self.leg in ("", reading.leg)
        return reading.quantity == self.quantity and reading.at == self.at and is_leg


def slots_of(index: Index, place: Place, visit: str, round_name: str) -> tuple[Slot, ...]:
    """The cells of a round: the current, then the voltage at each point as one walks away from the board."""
    slots = _on_circuit(index, place.circuit_id) if place.circuit_id else _on_busbar()
    there = readings_of_round(index, place, visit, round_name)
    return tuple(
        replace(slot, saved=next((reading for reading in reversed(there) if slot.holds(reading)), None))
        for slot in slots
    )


def readings_of_round(index: Index, place: Place, visit: str, round_name: str) -> list[Reading]:
    """The readings of a round that are not replaced, but for those with the loads off."""
    there = readings_of_visit(index, place, visit)
    return [reading for reading in there if reading.round == round_name and not reading.is_unloaded]


def readings_of_visit(index: Index, place: Place, visit: str) -> list[Reading]:
    """The readings on a place in a visit that are not replaced."""
    return [
        reading
        for reading in index.readings_of(place.id)
        if reading.visit_or_default == (visit or "1") and reading.id not in index.replaced
    ]


def round_at_hand(index: Index, place: Place, visit: str) -> str:
    """The last round of the visit while a cell of it is empty, else the next one."""
    names = list(dict.fromkeys(reading.round for reading in readings_of_visit(index, place, visit)))
    if not names:
        return "1"
    if any(slot.saved is None and slot.at != "bus" for slot in slots_of(index, place, visit, names[-1])):
        return names[-1]
    return next_round(names)


def resumed_words(index: Index, place: Place, visit: str, round_name: str, now: datetime) -> str:
    """Where a round that is begun and not finished goes on, and since when it is; empty for a new or a whole one."""
    slots = slots_of(index, place, visit, round_name)
    there = readings_of_round(index, place, visit, round_name)
    following = next((slot.label for slot in slots if slot.saved is None), "")
    if not there or not following:
        return ""
    since = min((reading.taken_at for reading in there if reading.taken_at), default="")
    try:
        begun = datetime.fromisoformat(since)
    except ValueError:  # not recorded, or typed by hand in another way
        return f"round {round_name} goes on at {following}"
    is_today = begun.date() == now.date()
    when = f"{begun:%H:%M} today" if is_today else f"{begun:%Y-%m-%d %H:%M}"
    return f"round {round_name} goes on at {following}, begun {when}"


def next_round(names: list[str]) -> str:
    """
    A name that no round has yet.

    >>> next_round(["1", "2"]), next_round(["as it is"]), next_round([])
    ('3', '2', '1')
    """
    numbers = [int(name) for name in names if re.fullmatch("[0-9]{1,6}", name)]
    return str(max([*numbers, len(names)], default=0) + 1)


def _on_circuit(index: Index, circuit_id: str) -> list[Slot]:
    circuit = index.circuits[circuit_id]
    points = index.points_of(circuit_id)
    clamp = _clamped(index, circuit_id)
    bus = [Slot("bus", "voltage", "bus")] if circuit.device != "none" else []
    voltages = [Slot(point, "voltage", point) for point in points if not point.startswith("board:")]
    return [Slot(f"A {clamp}", "current", clamp), *bus, *voltages]


def _on_busbar() -> list[Slot]:
    return [
        Slot("bus", "voltage", "bus"),
        Slot("positive to earth", "voltage", "bus", "positive"),
        Slot("negative to earth", "voltage", "bus", "negative"),
        Slot("A bus", "current", "bus"),
    ]


def _clamped(index: Index, circuit_id: str) -> str:
    """Where the clamp goes: where it was last, else at the first run, or before a fork at ``way``."""
    earlier = [r.at for r in index.readings_of(circuit_id) if r.quantity == "current" and r.id not in index.replaced]
    if earlier:
        return earlier[0]
    starts = [run for run in index.runs_of(circuit_id) if run.from_point == "way"]
    return starts[0].name if len(starts) == 1 else "way"
