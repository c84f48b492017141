"""Readings that cannot be as they stand; the rules about drops leave their rounds alone."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from rules.calc.doubt import Weighted, probability_above, total
from rules.limits import Limits
from rules.record import Figure
from rules.rounds import Round, Tree

REVERSED_SHARE = 0.25
"""Of nominal, by which a pole is past earth on the wrong side: more than a drop in an earthed return. Our own default."""


@dataclass(frozen=True, slots=True)
class Rise:
    """Voltage that is higher at the load's side of two points."""

    start: str
    end: str
    rise: Figure


@dataclass(frozen=True, slots=True)
class Against:
    """A current towards the source while the voltage falls towards the load."""

    point: str
    """Where the clamped branch arrives."""
    current: Figure
    start: str
    end: str
    fall: Figure


def reversed_points(this: Round, limits: Limits) -> list[tuple[str, Figure]]:
    """Points whose voltage between the legs was read below zero beyond doubt."""
    found = []
    for point, terms in this.volts.items():
        value, u = total(terms)
        if probability_above(-value, 0.0, u) >= limits["decision.beyond_doubt"]:
            found.append((point, Figure(value, "V", u)))
    return found


def reversed_poles(this: Round, earthing: str, nominal_v: float, limits: Limits) -> list[tuple[str, str, Figure]]:
    """
    Single poles to earth of an earthed system that have the other pole's sign: point, leg and voltage.

    Points that were read between the legs, or at both poles, are left to ``reversed_points``.
    """
    if earthing not in ("negative earthed", "positive earthed", "mid earthed"):
        return []
    found = []
    for row in this.readings:
        if row.quantity == "voltage" and row.leg in ("positive", "negative") and row.at not in this.volts:
            value, u = total([Weighted(1.0, this.shown[row.id])])
            wrong = -value if row.leg == "positive" else value
            if probability_above(wrong, REVERSED_SHARE * nominal_v, u) >= limits["decision.beyond_doubt"]:
                found.append((row.at, row.leg, Figure(value, "V", u)))
    return found


def dead_points(this: Round, tree: Tree, nominal_v: float, limits: Limits) -> list[tuple[str, Figure]]:
    """
    Points whose voltage is a small part of nominal and not below zero, and which no current was read to pass.

    Where current passes, or a point behind has its voltage, such a voltage is a slip, unless every point of the round
    has none: then the source is short-circuited or folds back.
    """
    reversed_ = {point for point, _ in reversed_points(this, limits)}
    read = {point: total(terms) for point, terms in this.volts.items() if point not in reversed_}
    limit = limits["readings.no_voltage_share"] * nominal_v
    low = {point for point, (value, _) in read.items() if value < limit and not math.isclose(value, limit)}
    none_lives = len(low) == len(this.volts) and len(low) > 1
    living = set(read) - low
    return [
        (point, Figure(read[point][0], "V", read[point][1]))
        for point in read
        if point in low and (none_lives or not (_passed(this, tree, point, limits) or _feeds(tree, point, living)))
    ]


def flowing(this: Round, limits: Limits) -> bool:
    """Whether any current of a round was read to flow."""
    return any(_flows(terms, limits) for terms in this.amps.values())


def rises(this: Round, tree: Tree, limits: Limits) -> list[Rise]:
    """
    Neighbouring points in a round of which the later is higher beyond doubt, largest first.

    None while the current flows towards the source, as when a battery charges.
    """
    limit = limits["decision.beyond_doubt"]
    if _backward(this, tree, limit) is not None:
        return []
    found = [
        Rise(start, end, Figure(-fall.value, "V", fall.u))
        for start, end, fall in _falls(this, tree, limits)
        if probability_above(-fall.value, 0.0, fall.u or 0.0) >= limit
    ]
    return sorted(found, key=lambda rise: -rise.rise.value)


def against_the_drop(this: Round, tree: Tree, limits: Limits) -> Against | None:
    """A current that is negative beyond doubt in a round whose voltage falls beyond doubt."""
    limit = limits["decision.beyond_doubt"]
    backward = _backward(this, tree, limit)
    if backward is None:
        return None
    for start, end, fall in _falls(this, tree, limits):
        if probability_above(fall.value, 0.0, fall.u or 0.0) >= limit:
            return Against(*backward, start, end, fall)
    return None


def impossible(this: Round, tree: Tree, nominal_v: float | None, limits: Limits) -> str:
    """Why no drop can be taken from a round; empty where nothing stands against it."""
    if reversed_points(this, limits):
        return f"a voltage of round {this.name} reads below zero"
    if nominal_v is not None and not flowing(this, limits) and dead_points(this, tree, nominal_v, limits):
        return f"a point of round {this.name} has no voltage"
    if rises(this, tree, limits):
        return f"a voltage of round {this.name} rises towards the load"
    if against_the_drop(this, tree, limits):
        return f"the current of round {this.name} flows against the drop"
    return ""


def _flows(terms: Sequence[Weighted], limits: Limits) -> bool:
    value, u = total(terms)
    return probability_above(abs(value), 0.0, u) >= limits["decision.beyond_doubt"]


def _passed(this: Round, tree: Tree, point: str, limits: Limits) -> bool:
    """Whether current was read to pass a point: in the branch that feeds it, or in one behind it."""
    if any(_flows(terms, limits) and _feeds(tree, point, {end}) for end, terms in this.amps.items() if end != point):
        return True
    here = point
    for _ in range(len(tree.ends) + 2):
        if here in this.amps:
            return _flows(this.amps[here], limits)
        run = tree.ends.get(here)
        if run is None or run.from_point in tree.taps:
            return False  # what flows further up may leave before it
        here = run.from_point
    return False


def _feeds(tree: Tree, point: str, ends: set[str]) -> bool:
    """Whether one of some points lies behind a point."""
    for end in ends:
        here = end
        for _ in range(len(tree.ends) + 2):
            run = tree.ends.get(here)
            before = run.from_point if run is not None else "bus" if here == "way" else ""
            if not before:
                break
            if before == point:
                return True
            here = before
    return False


def _backward(this: Round, tree: Tree, limit: float) -> tuple[str, Figure] | None:
    """A branch whose current is negative beyond doubt."""
    for point, terms in this.amps.items():
        run = tree.ends.get(point)
        value, u = total(terms)
        # in a mesh a run may carry current either way
        if (run is None or run.id not in tree.meshed) and probability_above(-value, 0.0, u) >= limit:
            return point, Figure(value, "A", u)
    return None


def _falls(this: Round, tree: Tree, limits: Limits) -> Iterator[tuple[str, str, Figure]]:
    """Neighbouring read points and by how much the voltage falls from the first to the second."""
    reversed_ = {point for point, _ in reversed_points(this, limits)}
    read = [point for point in this.volts if point not in reversed_]
    for end in read:
        start = read_before(tree, end, read)
        if start:
            terms = [*this.volts[start], *(Weighted(-t.weight, t.shown) for t in this.volts[end])]
            value, u = total(terms)
            yield start, end, Figure(value, "V", u)


def read_before(tree: Tree, point: str, read: list[str]) -> str:
    """The nearest read point towards the source."""
    here = point
    for _ in range(len(tree.runs) + 2):
        run = tree.ends.get(here)
        if run is not None and run.id in tree.meshed:
            return ""  # in a mesh voltage may rise along a run
        if run is not None:
            here = run.from_point
        elif here == "way":
            here = "bus"
        else:
            return ""
        if here in read:
            return here
    return ""
