"""RD11: the two poles to earth do not make the voltage between them."""

from collections.abc import Iterator, Sequence

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase
from rules.closure import poles_of
from rules.meters import worth
from rules.places import joined
from rules.ratings import sources_of
from rules.record import Reading
from rules.rule import DOUBTS_OF_READINGS, BoardCase, rule
from rules.taken import taken_on


@rule(
    id="RD11",
    title="Poles to earth against the voltage between them",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Read both poles to earth and the voltage between them again, one after the other, with one meter; mind the signs.",
    caution="On a system that is thought to be earthed such readings may mean that its earth is open, so that either pole can be at the "
    "full voltage to earth. Do not take a pole for dead or for earth by the drawing.",
    source=Citation("Kirchhoff's second law; JCGM 100, 5.2 for the doubt of the sum", status="textbook, no edition"),
    limits=("decision", *DOUBTS_OF_READINGS),
    also_about=("board", "source"),
)
def poles_against_voltage(case: CircuitCase | BoardCase) -> Iterator[Finding | NotJudged]:
    """
    The positive pole to earth less the negative, each with its sign, is not the voltage between the legs at that place in
    that round, beyond doubt.

    **Finds**: 0.00 V and −53.5 V to earth where 48.2 V stand between the legs.

    **Leaves alone**: 12.71 V and −11.78 V to earth where 24.49 V stand between the legs.
    """
    context = case.context
    rounds: dict[str, list[Reading]] = {}
    for row in taken_on(case):
        if row.quantity == "voltage" and not row.is_unloaded:
            rounds.setdefault(row.round, []).append(row)
    place = case.circuit if isinstance(case, CircuitCase) else case.row
    for name, rows in rounds.items():
        if not _has_all_three(rows):
            continue
        if any(source.earthing in ("", "floating") for source in sources_of(place, context.index)):
            why = (
                "the source is not recorded as earthed: a meter's own resistance shifts the poles of a floating system"
            )
            yield poles_against_voltage.gap(case, f"{case.tag}, round {name}", why)
            continue
        shown = {row.id: worth(row, context.index, context.limits).shown for row in rows}
        for unclosed in poles_of(rows, shown, context.limits):
            yield poles_against_voltage.finding(
                case,
                joined(unclosed.where, f"round {name}"),
                unclosed.words,
                numbers={"poles": unclosed.first_sum, "between": unclosed.second_sum, "gap": unclosed.gap},
            )


def _has_all_three(rows: Sequence[Reading]) -> bool:
    """Whether both poles to earth and the voltage between them were read at one place."""
    legs: dict[str, set[str]] = {}
    for row in rows:
        legs.setdefault(row.at, set()).add(row.leg or "both")
    return any(len(of_place) == 3 for of_place in legs.values())
