"""RD08: voltages around a circuit do not add up."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.closure import BY_WAY, TWO, Unclosed, voltages_around
from rules.diagnosis.problem import Observation
from rules.rounds import Round
from rules.rule import DOUBTS_OF_READINGS, named, rule


@rule(
    id="RD08",
    title="Voltages around a circuit do not add up",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Read each of them again in one round, within minutes and at one current; look for a slip of sign, unit or point.",
    caution="One of these readings is wrong, or the load changed between them: nothing that rests on one of them alone is settled. "
    "A long lead along a live leg carries its voltage to wherever its free end is.",
    source=Citation("Kirchhoff's second law; JCGM 100, 5.2 for the doubt of the sum", status="textbook, no edition"),
    limits=("decision", "source", *DOUBTS_OF_READINGS),
    under=("RD07",),
)
def voltages_do_not_close(case: CircuitCase) -> Iterator[Finding]:
    """
    What is lost between two points of a round differs, beyond doubt, by the way in which it was read: by two voltages, along
    both legs at once, along one leg and then the other, or over a point between.

    **Finds**: 0.46 V along the positive leg and 0.31 V along the negative against voltages that differ by 0.71 V.

    **Leaves alone**: the same against 0.77 V, within the meters' counts; readings of different rounds. Where RD07
    finds one of these readings mistyped it is a consequence of that.
    """
    for this in case.rounds:
        for unclosed in voltages_around(this, case.limits):
            yield voltages_do_not_close.finding(
                case,
                f"{unclosed.where}, round {this.name}",
                unclosed.words,
                numbers={"first": unclosed.first_sum, "second": unclosed.second_sum, "gap": unclosed.gap},
                under=tuple(named("RD07", case, words) for words in _readings(unclosed, this)),
            )


def _readings(unclosed: Unclosed, this: Round) -> Iterator[str]:
    """The readings of both sums, each as RD07 names it."""
    start, _, end = unclosed.where.partition(" to ")
    sums = (unclosed.first, unclosed.second)
    over = {start, end, *(words.removeprefix(BY_WAY) for words in sums if words.startswith(BY_WAY))}
    for row in this.readings:
        if row.at in over and (row.to in over if row.quantity == "drop" else row.quantity == "voltage" and TWO in sums):
            yield Observation(row.quantity, row.at, row.to, row.leg, this.name, ()).words
