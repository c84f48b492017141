"""The visit at hand, a new one, and the cautions to be read before its first live reading."""

from __future__ import annotations

from datetime import date, datetime

from audit.tui.edits import Add, Edit, Step
from rules.cautions import Caution, cautions_of
from rules.record import Acknowledgement, Site, Visit, columns

KINDS = dict(columns("visits"))["kind"].choices
"""What a visit can be for."""

OLD_AFTER_DAYS = 14
"""After so long, who takes a reading is asked whether it belongs to the last visit. [days], our own default"""


def visit_row(site: Site, tag: str) -> Visit | None:
    """The description of a visit; ``None`` for one that readings alone name."""
    return next((row for row in site.visits if row.tag == tag), None)


def is_old(site: Site, tag: str, today: date) -> bool:
    """Whether a visit lies so far from today that a reading of today may not belong to it."""
    row = visit_row(site, tag)
    if row is None or not row.date:
        return False
    try:
        of_visit = date.fromisoformat(row.date)
    except ValueError:
        return False
    return abs((today - of_visit).days) > OLD_AFTER_DAYS


def goes_on(site: Site, tag: str, today: date) -> bool:
    """Whether a reading of today belongs to a visit already: then it was asked about, also in an earlier sitting."""
    day = today.isoformat()
    return any(reading.taken_at.startswith(day) and reading.visit_or_default == tag for reading in site.readings)


def new_visit(site: Site, kind: str, today: date, by: str) -> Visit:
    """A visit that begins today, with a tag that no other has and a place after all others."""
    taken = {row.tag for row in site.visits} | {reading.visit_or_default for reading in site.readings}
    month, day = f"{today:%Y-%m} {kind}", f"{today.isoformat()} {kind}"
    tag = next(tag for tag in (month, day, *(f"{day} {n}" for n in range(2, 1_000))) if tag not in taken)
    orders = [row.walk_order for row in site.visits if row.walk_order is not None]
    # where the others have an order, one without would come after them anyway; the next number says so
    order = max(orders) + 1 if orders else None
    return Visit(id="", tag=tag, kind=kind, date=today.isoformat(), by=by, walk_order=order)


def unread_cautions(site: Site, visit: str, who: str) -> tuple[Caution, ...]:
    """The cautions of the site's voltages that a person has not acknowledged on a visit."""
    known = {row.caution for row in site.acknowledged if row.visit == visit and row.by == who and who}
    return tuple(caution for caution in cautions_of(site) if caution.id not in known)


def acknowledgement(cautions: tuple[Caution, ...], visit: str, who: str, now: datetime, *more: Step) -> Edit:
    """The save of having read cautions on a visit."""
    at = now.isoformat(timespec="seconds")
    rows = (Acknowledgement(id="", caution=caution.id, visit=visit, by=who, at=at) for caution in cautions)
    return Edit(f"cautions read before the first reading of {visit}", (*more, *(Add("acknowledged", r) for r in rows)))
