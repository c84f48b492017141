"""IN02: a meter's calibration had run out when it was read."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.meters import instrument_row
from rules.rule import SiteCase, rule
from rules.taken import day_of, some, taken


@rule(
    id="IN02",
    title="Meter out of calibration when it was read",
    about="site",
    severity=Severity.WATCH,
    remedy="Have the meter calibrated, with the readings in mind: if it is then found out of its accuracy, read these places again.",
    caution="Its readings are judged with the accuracy that it had when it was calibrated. Nothing says that it still has it.",
    source=Citation("ISO/IEC 17025", "2017", "6.4: equipment and its calibration status", "from-memory"),
)
def out_of_calibration(case: SiteCase) -> Iterator[Finding | NotJudged]:
    """
    A reading was taken after the day until which its meter was calibrated. The day is the reading's, else its visit's;
    what day it is now plays no part.

    **Finds**: calibrated until 2026-02-28, read on 2026-03-11.

    **Leaves alone**: read on the last day of its calibration; a meter whose calibration ran out since.
    """
    late: dict[tuple[str, str], list[tuple[str, str]]] = {}
    unknown: list[str] = []
    undated: list[str] = []
    for place in taken(case.context):
        for reading in place.readings:
            row = instrument_row(reading, case.context.index)
            if row is None:
                continue
            day = day_of(reading, case.context)
            if not row.calibrated_until:
                unknown.append(row.tag)
            elif not day:
                undated.append(row.tag)
            elif day > row.calibrated_until:
                late.setdefault((row.tag, row.calibrated_until), []).append((day, place.place.tag))
    for (meter, until), read in late.items():
        days = sorted({day for day, _ in read})
        when = f"on {days[0]}" if len(days) == 1 else f"from {days[0]} to {days[-1]}"
        yield out_of_calibration.finding(
            case,
            meter if sum(other == meter for other, _ in late) == 1 else f"{meter}, until {until}",
            f"{meter} was calibrated until {until} and read {when}: {some(tag for _, tag in read)}",
            numbers={},
        )
    if unknown:
        yield out_of_calibration.gap(case, "meters", f"until when they are calibrated is not recorded: {some(unknown)}")
    if undated:
        yield out_of_calibration.gap(case, "readings", f"neither they nor their visit have a date: {some(undated)}")
