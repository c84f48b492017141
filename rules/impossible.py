"""Readings that cannot be as they stand; the rules about drops leave their rounds alone."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from rules.calc.doubt import Weighted, probability_above, total
from rules.limits import Limits
from rules.record import Figure
from rules.rounds import Round, Tree


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


def dead_points(this: Round, nominal_v: float, limits: Limits) -> list[tuple[str, Figure]]:
    """
    Points whose voltage is a small part of nominal and not below zero, in a round in which no current was read to flow:
    where current flows, such a voltage is a slip.
    """
    if any(_flows(terms, limits) for terms in this.amps.values()):
        return []
    reversed_ = {point for point, _ in reversed_points(this, limits)}
    found = []
    for point, terms in this.volts.items():
        value, u = total(terms)
        share = value / nominal_v if nominal_v else 1.0
        limit = limits["readings.no_voltage_share"]
        if point not in reversed_ and share < limit and not math.isclose(share, limit):
            found.append((point, Figure(value, "V", u)))
    return found


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
    if nominal_v is not None and dead_points(this, nominal_v, limits):
        return f"a point of round {this.name} has no voltage"
    if rises(this, tree, limits):
        return f"a voltage of round {this.name} rises towards the load"
    if against_the_drop(this, tree, limits):
        return f"the current of round {this.name} flows against the drop"
    return ""


def _flows(terms: Sequence[Weighted], limits: Limits) -> bool:
    value, u = total(terms)
    return probability_above(abs(value), 0.0, u) >= limits["decision.beyond_doubt"]


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
        start = _before(tree, end, read)
        if start:
            terms = [*this.volts[start], *(Weighted(-t.weight, t.shown) for t in this.volts[end])]
            value, u = total(terms)
            yield start, end, Figure(value, "V", u)


def _before(tree: Tree, point: str, read: list[str]) -> str:
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
