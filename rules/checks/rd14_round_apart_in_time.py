"""RD14: readings of one round lie far apart in time."""

from collections.abc import Iterable, Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase
from rules.moments import seconds_between
from rules.record import Figure, Reading
from rules.rule import BoardCase, SiteCase, rule
from rules.taken import some, taken, taken_on
from rules.units import show_against


@rule(
    id="RD14",
    title="Readings of a round far apart in time",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Read the round again without a break, the source's voltage before and after; or part it into two rounds.",
    caution="Load, charger and temperature move meanwhile: a difference between such readings may be of time, not of place.",
    source=Citation("readings of one load state belong together in time", status="common practice, no source"),
    limits=("closure",),
    also_about=("board", "source", "site"),
)
def round_apart_in_time(case: CircuitCase | BoardCase | SiteCase) -> Iterator[Finding | NotJudged]:
    """
    Between the first and the last reading of a round lies more than the profile's time.

    **Finds**: a voltage at 08:16 and one at 09:30 in one round: 74 minutes.

    **Leaves alone**: 08:16 and 08:31; readings of different rounds; a date without a time; a time with a zone beside one
    without; a dead test, and what was read with the loads off.
    """
    context = case.context
    if isinstance(case, SiteCase):
        untimed = [
            place.place.tag
            for place in taken(context)
            if any(len(rows) > 1 and seconds_between(rows) is None for rows in _rounds(place.readings).values())
        ]
        if untimed:
            why = f"fewer than two readings of a round say when they were taken: {some(untimed)}"
            yield round_apart_in_time.gap(case, "readings", why)
        return
    most = context.limits["closure.round_minutes"]
    for name, rows in _rounds(taken_on(case)).items():
        seconds = seconds_between(rows)
        if seconds is None or seconds <= most * 60:
            continue
        lasted, limit = show_against(seconds / 60, most, "min")
        yield round_apart_in_time.finding(
            case,
            f"round {name}",
            f"{lasted} lie between its first and last reading, more than {limit}",
            numbers={"between": Figure(seconds, "s")},
            source=context.limits.citation("closure"),
        )


def _rounds(readings: Iterable[Reading]) -> dict[str, list[Reading]]:
    """Readings under load by round; dead tests and what was read with the loads off left out."""
    rounds: dict[str, list[Reading]] = {}
    for row in readings:
        if row.quantity != "resistance" and not row.is_unloaded:
            rounds.setdefault(row.round, []).append(row)
    return rounds
