"""Readings that cannot be as they stand; the rules about drops leave them alone."""

from __future__ import annotations

from dataclasses import dataclass

from rules.calc.doubt import Weighted, probability_above, total
from rules.limits import Limits
from rules.record import Figure
from rules.rounds import Round, Tree


@dataclass(frozen=True, slots=True)
class Rise:
    """Voltage that is higher at the load's side of two points."""

    round: str
    start: str
    end: str
    rise: Figure


def reversed_points(this: Round, limits: Limits) -> list[tuple[str, Figure]]:
    """Points whose voltage between the legs was read below zero beyond doubt."""
    beyond_doubt = limits["decision.beyond_doubt"]
    found = []
    for point, terms in this.volts.items():
        value, u = total(terms)
        if probability_above(-value, 0.0, u) >= beyond_doubt:
            found.append((point, Figure(value, "V", u)))
    return found


def rises(this: Round, tree: Tree, limits: Limits) -> list[Rise]:
    """Neighbouring points in a round of which the later is higher beyond doubt, largest first."""
    limit = limits["decision.beyond_doubt"]
    reversed_ = {point for point, _ in reversed_points(this, limits)}
    read = [point for point in this.volts if point not in reversed_]
    found = []
    for end in read:
        start = _before(tree, end, read)
        if not start:
            continue
        value, u = total([*this.volts[end], *(Weighted(-t.weight, t.shown) for t in this.volts[start])])
        if probability_above(value, 0.0, u) >= limit:
            found.append(Rise(this.name, start, end, Figure(value, "V", u)))
    return sorted(found, key=lambda rise: -rise.rise.value)


def impossible(this: Round, tree: Tree, limits: Limits) -> str:
    """Why no drop can be taken from a round; empty where nothing stands against it."""
    if reversed_points(this, limits):
        return f"a voltage of round {this.name} reads below zero"
    if rises(this, tree, limits):
        return f"a voltage of round {this.name} rises towards the load"
    return ""


def _before(tree: Tree, point: str, read: list[str]) -> str:
    """The nearest read point towards the source."""
    here = point
    for _ in range(len(tree.runs) + 2):
        run = tree.ends.get(here)
        if run is not None:
            here = run.from_point
        elif here == "way":
            here = "bus"
        else:
            return ""
        if here in read:
            return here
    return ""
