"""RD09: currents at a point of a circuit do not add up."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.closure import currents_at_points
from rules.rule import DOUBTS_OF_READINGS, rule


@rule(
    id="RD09",
    title="Currents at a point do not add up",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Zero the clamp, read all of them again within minutes; then look for a load, a tap or a second supply that is not recorded.",
    caution="Current that goes where nothing is recorded may be a fault, or feed something that stays live when this device is open.",
    source=Citation("Kirchhoff's first law; JCGM 100, 5.2 for the doubt of the sum", status="textbook, no edition"),
    limits=("decision", "closure", *DOUBTS_OF_READINGS),
)
def currents_do_not_add_up(case: CircuitCase) -> Iterator[Finding]:
    """
    In one round, what arrives at a point differs from what leaves it by its runs, beyond doubt and the share that a load may
    move meanwhile. Where a load, board or converter draws at the point, no more may leave it than arrives.

    **Finds**: 4.00 A into p1, where nothing draws, and 3.00 A on from it.

    **Leaves alone**: 4.00 A into p1 and 3.00 A on, where a load at p1 draws; a point of a mesh or of a shared return.
    """
    for this in case.rounds:
        for unclosed in currents_at_points(this, case.tree, case.drawn, case.limits):
            yield currents_do_not_add_up.finding(
                case,
                f"{unclosed.where}, round {this.name}",
                unclosed.words,
                numbers={"arriving": unclosed.first_sum, "leaving": unclosed.second_sum, "gap": unclosed.gap},
                source=f"{currents_do_not_add_up.source}; {case.limits.citation('closure')}",
            )
