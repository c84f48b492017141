"""RD13: a clamp around both conductors shows a current."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.agreement import probability_apart
from rules.calc.doubt import Weighted, total
from rules.case import CircuitCase
from rules.meters import worth
from rules.places import joined
from rules.record import Figure, Reading
from rules.rule import DOUBTS_OF_READINGS, BoardCase, rule
from rules.taken import taken_on
from rules.units import show


@rule(
    id="RD13",
    title="Residual current",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Zero the clamp away from any conductor and read again; then find the other path, one circuit off at a time: a return by "
    "another cable or the building's metal, or a leak to earth.",
    caution="What returns another way keeps that way live when this circuit is off, and may heat what was never meant to carry it. "
    "A leak on one pole of a floating system turns the next one on the other pole into a short circuit.",
    source=Citation("IEC 60364-6", "2016", "6.4.3: leakage of circuits in service", "from-memory"),
    also=(Citation("Kirchhoff's first law", status="textbook, no edition"),),
    limits=("decision", *DOUBTS_OF_READINGS),
    also_about=("board", "source"),
)
def residual_current(case: CircuitCase | BoardCase) -> Iterator[Finding | NotJudged]:
    """
    The clamp around both conductors of a run, or of a circuit at its way, shows a current beyond its doubt: the two do not
    carry the same.

    **Finds**: 0.42 A by a 1.5 % + 5 counts clamp of 0.01 A around both conductors.

    **Leaves alone**: 0.05 A by the same, within its counts. What is read where a return is shared, or the building's metal,
    belongs there and is not judged.
    """
    context = case.context
    alike: dict[tuple[str, str], list[Reading]] = {}
    for row in taken_on(case):
        if row.quantity == "residual" and not row.is_unloaded:
            alike.setdefault((row.round, row.at), []).append(row)
    for (name, at), rows in alike.items():
        others = _other_returns(case, at)
        if others:
            why = f"the return is {others[0]}: its current is in no pair"
            yield residual_current.gap(case, f"{case.tag}, {at}", why)
            continue
        value, u = total(Weighted(1 / len(rows), worth(row, context.index, context.limits).shown) for row in rows)
        if probability_apart(value, u) < context.limits["decision.beyond_doubt"]:
            continue
        yield residual_current.finding(
            case,
            joined(at, f"round {name}"),
            f"{show(value, 'A', u)} more flows in one conductor than in the other at {at}",
            numbers={"residual": Figure(value, "A", u)},
        )


def _other_returns(case: CircuitCase | BoardCase, at: str) -> list[str]:
    """The returns behind a place that are not the runs' own."""
    runs = case.runs if isinstance(case, CircuitCase) else ()
    return [run.return_or_default for run in runs if at in ("way", run.name) and run.return_or_default != "own"]
