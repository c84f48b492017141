"""Readings beside the round: which places and legs a quantity can be read at."""

from __future__ import annotations

from audit.tui.entry.slots import Place
from rules.index import Index
from rules.problems.readings import BUSBAR_PLACES, PLACES_OF_QUANTITY, places_of
from rules.record import LEGS, Reading

QUANTITY_WORDS = {
    "voltage": "between the legs, or of one pole to earth",
    "drop": "along a path with a long lead",
    "joint": "millivolts across one termination, or the device",
    "current": "the load current, the clamp around one conductor",
    "residual": "the clamp around both conductors",
    "temperature": "of a conductor, a termination or the room",
    "resistance": "a dead test: isolated and proved dead first",
}
"""What each quantity is, in a few words."""


def quantities_at(place: Place) -> tuple[str, ...]:
    """What can be read on a circuit or on a busbar."""
    return tuple(PLACES_OF_QUANTITY if place.circuit_id else BUSBAR_PLACES)


def places_for(index: Index, place: Place, quantity: str) -> tuple[str, ...]:
    """Where a quantity can be read."""
    if not place.circuit_id:
        return BUSBAR_PLACES[quantity]
    places = places_of(index, place.circuit_id)
    return tuple(dict.fromkeys(name for kind in PLACES_OF_QUANTITY[quantity] for name in places[kind]))


def goes_to(index: Index, place: Place, quantity: str, at: str) -> tuple[str, ...]:
    """The points where a stretch that begins at ``at`` may end; empty for what is read at one place."""
    if not place.circuit_id or quantity not in ("drop", "resistance"):
        return ()
    points = places_of(index, place.circuit_id)["point"]
    if at not in points:
        return ()
    one = ("bus", "way") if index.circuits[place.circuit_id].device == "none" else ()
    others = [point for point in points if point != at and not (at in one and point in one)]
    behind = points.index(at)
    return tuple(sorted(others, key=lambda point: (points.index(point) < behind, points.index(point))))


def legs_for(index: Index, place: Place, quantity: str, at: str) -> tuple[str, ...]:
    """The legs that a reading may be of, the usual one first; empty where a leg says nothing."""
    if quantity == "temperature":
        return ()
    if quantity == "current":
        return (*LEGS[:2], "not recorded")
    if quantity == "residual":
        return ("both",)
    if quantity == "voltage":
        return ("both", *LEGS[:2])
    if at == "device":
        poles = places_of(index, place.circuit_id)["pole"]
        return poles if len(poles) < 2 else LEGS
    return ("both", *LEGS[:2]) if quantity == "drop" else LEGS[:2]


def correctable(index: Index, place: Place) -> list[Reading]:
    """The readings on a place that can be corrected, the latest first; one that was replaced cannot."""
    return [reading for reading in reversed(index.readings_of(place.id)) if reading.id not in index.replaced]
