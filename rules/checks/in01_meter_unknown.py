"""IN01: it is not known with what meter, or how good a one, something was read."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.meters import worth
from rules.rule import DOUBTS_OF_READINGS, BoardCase, rule
from rules.taken import some, taken_on


@rule(
    id="IN01",
    title="Meter not known",
    about="circuit",
    severity=Severity.NOTE,
    remedy="Record the meter with its accuracy, counts and resolution as its manual gives them, and name it in the reading.",
    caution="A reading of an unknown meter counts with wide doubt: what it does not show may still be there.",
    source=Citation("JCGM 100", "2008", "4.3: doubt of an input that was not observed again and again", "from-memory"),
    limits=DOUBTS_OF_READINGS,
    also_about=("board", "source"),
)
def meter_not_known(case: CircuitCase | BoardCase) -> Iterator[Finding]:
    """
    Readings that name no meter, or one whose accuracy, counts or resolution is not recorded. They count with the profile's
    poor meter.

    **Finds**: three voltages without an instrument: "voltage with a meter that is not recorded".

    **Leaves alone**: a meter whose category or calibration alone is not recorded (IN02, IN03).
    """
    context = case.context
    how: dict[str, list[str]] = {}
    for reading in taken_on(case):
        if not worth(reading, context.index, context.limits).known:
            meter = reading.instrument if context.index.ranges_of(reading.instrument) else ""
            how.setdefault(meter, []).append(reading.quantity)
    for meter, quantities in how.items():
        with_what = f"{meter}, whose figures for it are not recorded" if meter else "a meter that is not recorded"
        yield meter_not_known.finding(
            case,
            meter or "readings",
            f"{some(quantities)} read with {with_what}",
            numbers={},
            source=context.limits.citation("poor_meter"),
        )
