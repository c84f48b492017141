"""IN01: it is not known with what meter, or how good a one, something was read."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.meters import worth
from rules.rule import DOUBTS_OF_READINGS, SiteCase, rule
from rules.taken import some, taken


@rule(
    id="IN01",
    title="Meter not known",
    about="site",
    severity=Severity.NOTE,
    remedy="Record the meter with its accuracy, counts and resolution as its manual gives them, and name it in the reading.",
    caution="A reading of an unknown meter counts with wide doubt: what it does not show may still be there.",
    source=Citation("JCGM 100", "2008", "4.3: doubt of an input that was not observed again and again", "from-memory"),
    limits=DOUBTS_OF_READINGS,
)
def meter_not_known(case: SiteCase) -> Iterator[Finding]:
    """
    Readings that name no meter, or one whose accuracy, counts or resolution is not recorded. They count with the profile's
    poor meter.

    **Finds**: three voltages without an instrument: "voltage with a meter that is not recorded".

    **Leaves alone**: a meter whose category or calibration alone is not recorded (IN02, IN03).
    """
    context = case.context
    for place in taken(context):
        how: dict[str, list[str]] = {}
        for reading in place.readings:
            if worth(reading, context.index, context.limits).known:
                continue
            there = context.index.ranges_of(reading.instrument)
            words = f"with {reading.instrument}, whose figures for it are not" if there else "with a meter that is not"
            how.setdefault(f"{words} recorded", []).append(reading.quantity)
        for words, quantities in how.items():
            yield meter_not_known.finding(
                case,
                "readings" if "a meter that" in words else words.removeprefix("with ").partition(",")[0],
                f"{some(quantities)} read {words}",
                numbers={},
                source=context.limits.citation("poor_meter"),
                as_circuit=place.circuit,
                as_board=place.board,
            )
