"""HB01: circuits that share a meter or a habit err alike."""

from collections import Counter
from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.diagnosis.common_error import TOLD, CommonError, Explanation
from rules.diagnosis.habits import CABLE, CURRENT, LENGTH, TEMPERATURE, ZERO
from rules.diagnosis.telling import most_telling
from rules.record import Figure
from rules.rule import SiteCase, rule
from rules.units import show
from rules.verdict import probability_words

WORDS = {
    CURRENT: ("reads {} low", "reads {} high"),
    ZERO: ("shows {} too little", "shows {} too much"),
    TEMPERATURE: ("are {} too low", "are {} too high"),
    LENGTH: ("are {} too short", "are {} too long"),
    CABLE: ("has {} more resistance than its table", "has {} less resistance than its table"),
}
"""What a habit does where its size is above zero, and below."""
METER = ("reads {} high", "reads {} low")


@rule(
    id="HB01",
    title="Circuits that share a meter or a habit err alike",
    about="site",
    severity=Severity.WATCH,
    remedy="Make the check that tells most before any of these circuits is opened, and correct the record by what it shows.",
    caution="The circuits are judged with this common error and its doubt. What all of them really have in common, the same cable too "
    "thin everywhere, looks the same from here: make the check. A second meter on a live circuit needs the same care as the first.",
    source=Citation("JCGM 100", "2008", "3.2.4: correction for recognised systematic effects", "from-memory"),
    limits=("habit",),
)
def common_error(case: SiteCase) -> Iterator[Finding | NotJudged]:
    """
    The drops of circuits that share something lie alike above or below the computed ones: a voltmeter, a clamp or its zero,
    how lengths or temperatures were obtained, a cable. Each is named with the probability that it is the one, and the check
    that tells most. The circuits are judged with the common error and its doubt; a fault of their own stays a finding.

    **Finds**: 41 circuits read by one voltmeter on one visit, all about 6 % high whatever their size and length, while
    those of another voltmeter agree with the record.

    **Leaves alone**: fewer than five circuits that share something; a meter within its specification; a common error below
    2 % of the drop. Readings whose instrument is not recorded share nothing that could be known.
    """
    context = case.context
    known = {row.tag for row in context.site.instruments}
    unknown = Counter(
        measured.tree.circuit.tag
        for measured in context.measured.values()
        if any(reading.instrument not in known for reading in measured.readings)
    )
    if len(unknown) >= context.limits["habit.least_circuits"]:
        yield common_error.gap(
            case,
            "instruments",
            f"readings of {len(unknown)} circuits name no instrument that is recorded: what they share is not known",
        )
    for error in context.taught.errors:
        first = error.explanations[0].habit
        check = most_telling(error, context.limits)
        yield common_error.finding(
            case,
            f"{first.words}, visit {first.visit}" if first.visit else first.words,
            _why(error),
            numbers={
                "common error": error.relative,
                "none": Figure(error.none, "1"),
                "more than one": Figure(error.several, "1"),
            }
            | {one.habit.words: Figure(one.probability, "1") for one in _told(error)},
            remedy=f"{check.words} That tells most; correct the record by what it shows, before any of these circuits is opened.",
            source=f"{common_error.source}; {context.limits.citation('habit')}",
        )


def _told(error: CommonError) -> list[Explanation]:
    return [one for one in error.explanations if one.probability >= TOLD]


def _why(error: CommonError) -> str:
    share = error.relative
    first = error.explanations[0].habit
    parts = [f"{_does(one)} ({probability_words(one.probability)})" for one in _told(error)]
    if error.several >= TOLD:
        parts.append(f"more than one of these ({probability_words(error.several)})")
    parts.append(f"none of these ({probability_words(error.none)})")
    return (
        f"{error.circuits} circuits share {first.words}; alike, they lose {show(abs(share.value), '1', share.u)} "
        f"{'more' if share.value > 0 else 'less'} than computed: {', '.join(parts)}"
    )


def _does(explanation: Explanation) -> str:
    """``voltmeter DV-1 reads 6.2 ± 0.5 % high``."""
    habit, size, u = explanation.habit, explanation.size.value, explanation.size.u or 0.0
    if habit.kind in (CURRENT, LENGTH):  # what is recorded falls short of the truth, of which it is said
        size, u = size / (1 + size), u / (1 + size) ** 2
    above, below = WORDS.get(habit.kind, METER)
    return f"{habit.words} {(above if size > 0 else below).format(show(abs(size), explanation.size.unit, u))}"
