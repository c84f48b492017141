"""RD05: a circuit draws more than its loads are recorded to draw."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above, total
from rules.case import CircuitCase
from rules.explained import most_explained_a
from rules.meters import less_zero_words
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show


@rule(
    id="RD05",
    title="Current above the recorded loads",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Find out what draws it: a load that is not recorded, a wrong figure, or a leak; then correct the record.",
    caution="Design drop, lowest voltage and device are judged with the recorded loads and come out too good. More current than the "
    "loads explain can be a fault current: mind what it flows through.",
    source=Citation("closure tests on readings", status="common practice, no source"),
    limits=("decision", "readings", *DOUBTS_OF_READINGS),
)
def current_above_recorded(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A clamp showed more than the loads behind it are recorded to draw, beyond doubt and the profile's margin.

    **Finds**: 2.38 A behind which 0.8 A of loads are recorded.

    **Leaves alone**: 8.3 A where 8 A are recorded, which the profile's margin covers; less than recorded, since loads may be off;
    what the record explains: all loads on where they are not taken as on together, a constant power at the low voltage that was
    read, a recorded peak.
    A current behind which a load has no figure is not judged.
    """
    margin = 1 + case.limits["readings.load_margin"]
    unknown: dict[str, None] = {}
    for this in case.rounds:
        for point, terms in this.amps.items():
            design, run = case.tree.design_current_a.get(point), case.tree.ends.get(point)
            where = run.name if run else point
            if design is None:
                unknown.setdefault(where)
            if not design or (run is not None and run.id in case.tree.meshed):
                continue  # in a mesh no loads are those behind a run
            value, u = total(terms)
            if probability_above(value, margin * design, u) < case.limits["decision.beyond_doubt"]:
                continue
            most = most_explained_a(case, point, this)
            if most is not None and probability_above(value, margin * most, u) < case.limits["decision.beyond_doubt"]:
                continue
            yield current_above_recorded.finding(
                case,
                f"{where}, round {this.name}",
                f"{show(value, 'A', u)} was read{less_zero_words(terms, 'A')} where the loads are recorded to draw {show(design, 'A')}"
                + (f", and {show(most, 'A', digits=3)} at most" if most is not None and most > 1.001 * design else ""),
                numbers={"current": Figure(value, "A", u), "recorded": Figure(design, "A")},
                source=case.limits.citation("readings"),
            )
            break
    for where in unknown:
        yield current_above_recorded.gap(case, where, f"what hangs on {where} draws is not known")
