"""Drops along one leg: what one leg of a path loses more than the other, against what the record has for both."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass

from rules.calc.doubt import Weighted, total
from rules.case import CircuitCase
from rules.errors import MissingData
from rules.record import Figure, Reading, Run
from rules.rounds import Round, current_at
from rules.routes import tree_path
from rules.runs import TERMINATIONS_A_LEG, LegFigures

LEGS = ("positive", "negative")


@dataclass(frozen=True, slots=True)
class Unequal:
    """Both legs of one path in one round."""

    start: str
    end: str
    round: str
    runs: tuple[Run, ...]
    legs: dict[str, Figure]
    """Drop along each leg. [V]"""
    higher: str
    """The leg that loses more than the record has it lose beside the other."""
    excess: Figure
    """By how much. [V]"""
    current: Figure
    """In the path's first run. [A]"""
    point: str
    """At which the path's first run arrives."""


def pairs_of_legs(case: CircuitCase) -> Iterator[Unequal | tuple[str, str]]:
    """Every path that was read along both legs in one round; a place with the reason where nothing can be said of it."""
    for this in case.rounds:
        read: dict[tuple[str, str], dict[str, list[Reading]]] = defaultdict(lambda: defaultdict(list))
        for row in this.readings:
            if row.quantity == "drop" and row.leg in LEGS:
                read[row.at, row.to][row.leg].append(row)
        for (start, end), by_leg in read.items():
            if len(by_leg) < len(LEGS):
                continue
            try:
                yield _pair(case, this, start, end, by_leg)
            except MissingData as error:
                yield f"{start} to {end}", str(error)


def own_legs(case: CircuitCase, run: Run) -> dict[str, LegFigures]:
    """
    The legs of a run by pole.

    Raises
    ------
    MissingData
        If it cannot be computed or has no return of its own.
    """
    known = case.tree.figures[run.id]
    if known.gap:
        raise MissingData(known.gap)
    if len(known.legs) < len(LEGS):
        raise MissingData(f"{run.name} has no return of its own, so that its legs carry different currents")
    out, back = known.legs
    return {"positive": back, "negative": out} if case.return_leg == "positive" else {"positive": out, "negative": back}


def _pair(case: CircuitCase, this: Round, start: str, end: str, by_leg: dict[str, list[Reading]]) -> Unequal:
    hops = tree_path(start, end, case.tree.ends)
    if any(hop.branch == "way" for hop in hops):
        raise MissingData("the device lies in one leg of the path: read from way instead")
    computed = variance = 0.0
    runs: list[Run] = []
    for hop in hops:
        run = case.tree.ends[hop.branch]
        amps = current_at(hop.branch, this, case.tree, case.limits).value_a
        legs = own_legs(case, run)
        ohm = {leg: legs[leg].conductor_ohm + TERMINATIONS_A_LEG * legs[leg].joint_ohm for leg in LEGS}
        computed += amps * (ohm["positive"] - ohm["negative"])
        own = sum(TERMINATIONS_A_LEG * legs[leg].joint_variance for leg in LEGS)
        unlike = legs["positive"].conductor_ohm - legs["negative"].conductor_ohm
        known = case.tree.figures[run.id]
        relative = math.hypot(known.length_u, case.limits["resistance_doubt.relative"])
        variance += amps**2 * (own + (relative * unlike) ** 2)
        runs.append(run)
    terms = {
        leg: [Weighted(1 / len(rows), this.shown[row.id]) for row in rows] for leg, rows in by_leg.items()
    }  # one meter's gain acts on the difference alone
    less = [Weighted(-term.weight, term.shown) for term in terms["negative"]]
    value, u = total([*terms["positive"], *less])
    first = current_at(hops[0].branch, this, case.tree, case.limits)
    first_a, first_u = total(first.terms)
    beyond = value - computed
    sense = math.copysign(1.0, beyond * first_a) if beyond and first_a else 1.0
    return Unequal(
        start=start,
        end=end,
        round=this.name,
        runs=tuple(runs),
        legs={leg: Figure(*_volts(terms[leg])) for leg in LEGS},
        higher="positive" if sense > 0 else "negative",
        excess=Figure(abs(beyond), "V", math.hypot(u, math.sqrt(variance))),
        current=Figure(abs(first_a), "A", first_u),
        point=hops[0].branch,
    )


def _volts(terms: list[Weighted]) -> tuple[float, str, float]:
    value, u = total(terms)
    return value, "V", u
