"""IN04: two meters showed values for one thing that their doubts do not reconcile."""

from collections.abc import Iterator, Sequence
from itertools import combinations

from rules.assessment import Citation, Finding, Severity
from rules.calc.agreement import en_ratio
from rules.calc.doubt import Weighted, total
from rules.case import CircuitCase
from rules.context import Context
from rules.meters import worth
from rules.record import Figure, Reading
from rules.rule import DOUBTS_OF_READINGS, BoardCase, rule
from rules.taken import taken_on
from rules.units import show


@rule(
    id="IN04",
    title="Two meters disagree",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Prove both on a known source; set the one that fails aside, and read again what it read. Keep both readings.",
    caution="Neither is right because it suits: until both were proved, nothing that rests on one of them alone is settled. "
    "Two meters on one pair of clips are two pairs of leads on live parts.",
    source=Citation("ISO 13528", "2022", "9.7: E_n score", "from-memory"),
    limits=DOUBTS_OF_READINGS,
    also_about=("board", "source"),
)
def meters_disagree(case: CircuitCase | BoardCase) -> Iterator[Finding]:
    """
    Two meters read one quantity at one place and leg in one round, and the E_n ratio of their means is above 1: they are
    further apart than twice the standard uncertainty of the distance, by both meters' own figures.

    **Finds**: 24.12 V by one 0.5 % + 2 counts meter and 23.85 V by another: E_n 1.36.

    **Leaves alone**: 24.12 V and 24.00 V by the same: E_n 0.60. They agree, which makes neither right. Two thermometers,
    whose contact differs more than they do.
    """
    by_thing: dict[tuple[str, ...], dict[str, list[Reading]]] = {}
    for row in taken_on(case):
        if row.instrument and row.quantity != "temperature":
            leg = "" if row.leg == "both" else row.leg
            thing = (row.round, row.quantity, row.at, row.to, leg, row.loads_off)
            by_thing.setdefault(thing, {}).setdefault(row.instrument, []).append(row)
    for meters in by_thing.values():
        for one, other in combinations(meters.items(), 2):
            yield from _compared(case, one, other)


def _compared(
    case: CircuitCase | BoardCase, one: tuple[str, list[Reading]], other: tuple[str, list[Reading]]
) -> Iterator[Finding]:
    (first, first_rows), (second, second_rows) = one, other
    (a, a_u), (b, b_u) = (_mean(rows, case.context) for rows in (first_rows, second_rows))
    ratio = en_ratio(a, a_u, b, b_u)
    if ratio <= 1:
        return
    row = first_rows[0]
    unit, leg = row.unit, f" {row.leg}" if row.leg and row.leg != "both" else ""
    yield meters_disagree.finding(
        case,
        f"{row.quantity} at {row.at}{f' to {row.to}' if row.to else ''}{leg}, round {row.round}, {first} and {second}",
        f"{first} showed {show(a, unit, a_u)} and {second} {show(b, unit, b_u)}: E_n {ratio:.2f} is above 1",
        numbers={
            "first": Figure(a, unit, a_u),
            "second": Figure(b, unit, b_u),
        },
    )


def _mean(rows: Sequence[Reading], context: Context) -> tuple[float, float]:
    """Mean of what one meter showed, and its standard uncertainty."""
    return total(Weighted(1 / len(rows), worth(row, context.index, context.limits).shown) for row in rows)
