"""RD14: readings of one round lie far apart in time."""

from collections.abc import Iterator
from datetime import UTC, datetime

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase
from rules.record import Figure, Reading
from rules.rule import BoardCase, SiteCase, rule
from rules.taken import taken_on
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

    **Leaves alone**: 08:16 and 08:31; readings of different rounds; a dead test, and what was read with the loads off.
    """
    context = case.context
    some_timed = any(row.taken_at for row in context.site.readings)
    if isinstance(case, SiteCase):
        if context.site.readings and not some_timed:
            yield round_apart_in_time.gap(case, "readings", "none says when it was taken")
        return
    most = context.limits["closure.round_minutes"]
    rounds: dict[str, list[Reading]] = {}
    for row in taken_on(case):
        if row.quantity != "resistance" and not row.is_unloaded:
            rounds.setdefault(row.round, []).append(row)
    for name, rows in rounds.items():
        times = sorted(moment for row in rows if (moment := _moment(row.taken_at)) is not None)
        if len(times) < 2:
            if some_timed and len(rows) > 1:
                yield round_apart_in_time.gap(case, f"round {name}", "fewer than two readings say when they were taken")
            continue
        seconds = (times[-1] - times[0]).total_seconds()
        if seconds <= most * 60:
            continue
        lasted, limit = show_against(seconds / 60, most, "min")
        yield round_apart_in_time.finding(
            case,
            f"round {name}",
            f"{lasted} lie between its first and last reading, more than {limit}",
            numbers={"between": Figure(seconds, "s")},
            source=context.limits.citation("closure"),
        )


def _moment(taken_at: str) -> datetime | None:
    """A time, with an offset taken to UTC."""
    try:
        read = datetime.fromisoformat(taken_at)
    except ValueError:
        return None
    return read.astimezone(UTC).replace(tzinfo=None) if read.tzinfo else read
