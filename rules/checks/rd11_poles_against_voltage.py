"""RD11: the two poles to earth do not make the voltage between them."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.closure import poles_of
from rules.meters import worth
from rules.ratings import sources_of
from rules.record import Reading
from rules.rule import DOUBTS_OF_READINGS, SiteCase, rule
from rules.taken import Taken, taken


@rule(
    id="RD11",
    title="Poles to earth against the voltage between them",
    about="site",
    severity=Severity.WATCH,
    remedy="Read both poles to earth and the voltage between them again, one after the other, with one meter; mind the signs.",
    caution="On a system that is thought to be earthed such readings may mean that its earth is open, so that either pole can be at the "
    "full voltage to earth. Do not take a pole for dead or for earth by the drawing.",
    source=Citation("Kirchhoff's second law; JCGM 100, 5.2 for the doubt of the sum", status="textbook, no edition"),
    limits=("decision", *DOUBTS_OF_READINGS),
)
def poles_against_voltage(case: SiteCase) -> Iterator[Finding | NotJudged]:
    """
    The positive pole to earth less the negative, each with its sign, is not the voltage between the legs at that place in
    that round, beyond doubt.

    **Finds**: 0.00 V and −53.5 V to earth where 48.2 V stand between the legs.

    **Leaves alone**: 12.71 V and −11.78 V to earth where 24.49 V stand between the legs.
    """
    context = case.context
    for place in taken(context):
        for name, rows in _rounds(place).items():
            if not any(
                {r.leg or "both" for r in rows if r.at == at} >= {"positive", "negative", "both"}
                for at in {r.at for r in rows}
            ):
                continue
            if any(source.earthing in ("", "floating") for source in sources_of(place.place, context.index)):
                why = "the source is not recorded as earthed: a meter's own resistance shifts the poles of a floating system"
                yield poles_against_voltage.gap(case, f"{place.place.tag}, round {name}", why)
                continue
            shown = {row.id: worth(row, context.index, context.limits).shown for row in rows}
            for unclosed in poles_of(rows, shown, context.limits):
                yield poles_against_voltage.finding(
                    case,
                    f"{unclosed.where}, round {name}",
                    unclosed.words,
                    numbers={"poles": unclosed.first_sum, "between": unclosed.second_sum, "gap": unclosed.gap},
                    as_circuit=place.circuit,
                    as_board=place.board,
                )


def _rounds(place: Taken) -> dict[str, list[Reading]]:
    rounds: dict[str, list[Reading]] = {}
    for row in place.readings:
        if row.quantity == "voltage" and not row.is_unloaded:
            rounds.setdefault(row.round, []).append(row)
    return rounds
