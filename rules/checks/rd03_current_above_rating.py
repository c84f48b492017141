"""RD03: a current reading lies above the rating of the circuit's device."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above, total
from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.errors import MissingData
from rules.meters import less_zero_words
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show, show_against


@rule(
    id="RD03",
    title="Current above the device rating",
    about="circuit",
    severity=Severity.SOON,
    remedy="Zero the clamp and read again; then compare the rating on the device with the record, and find out what draws it.",
    caution="An overloaded device and its terminals can be hot enough to burn. Do not reset or replace a device until the cause is "
    "known; rating and load are decided under local code by a licensed person.",
    source=Citation("IEC 60364-4-43", "2008", "433.1: design current not above rated current", "from-memory"),
    limits=("decision", *DOUBTS_OF_READINGS),
)
def current_above_rating(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A clamp showed more than the device is rated for.

    **Finds**: 12.4 A by a 1.5 % clamp behind a 10 A fuse.

    **Leaves alone**: 9.8 A by the same clamp. 10.1 A, whose doubt reaches over the rating, is not judged.
    """
    read = [
        (this, point, Figure(value, "A", u), less_zero_words(terms, "A"))
        for this in case.rounds
        for point, terms in this.amps.items()
        for value, u in [total(terms)]
    ]
    if not read:
        return
    if case.circuit.device == "none":
        return
    rating = case.circuit.rated_current_a
    if rating is None:
        raise MissingData("the rating of the device is not recorded")

    def past(amps: Figure) -> float:
        return probability_above(abs(amps.value), rating, amps.u or 0.0)

    # the reading that says most, not the largest: a poor meter's may be larger and say nothing
    this, point, amps, shown = max(read, key=lambda item: (past(item[2]), abs(item[2].value)))
    verdict = against_limit(abs(amps.value), rating, amps.u or 0.0, case.limits)
    if verdict is Verdict.CONFORMS:
        return
    _, limit = show_against(abs(amps.value), rating, "A")
    run = case.tree.ends.get(point)
    where = f"{run.name if run else point}, round {this.name}"
    if verdict is Verdict.OPEN:
        why = f"not settled: {show(abs(amps.value), 'A', amps.u)} was read{shown} against the device's {limit}"
        yield current_above_rating.gap(case, where, why)
        return
    yield current_above_rating.finding(
        case,
        where,
        f"{show(abs(amps.value), 'A', amps.u)} was read{shown}, above the device's {limit}",
        numbers={"current": amps, "rating": Figure(rating, "A")},
    )
