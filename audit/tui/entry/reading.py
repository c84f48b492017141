"""A typed value to a reading, and to the edit that saves it: a correction replaces, and both stay."""

from __future__ import annotations

import secrets
from dataclasses import dataclass, replace
from datetime import datetime

from audit.intake.cell import read_cell, trimmed
from audit.tui.edits import Add, Change, Edit, Step
from audit.tui.entry.meters import NO_METER, Meter
from audit.tui.entry.slots import Place
from rules.columns import within
from rules.errors import InvalidQuantity, UnreadableText
from rules.problems.cells import number_complaint
from rules.record import UNIT_OF_QUANTITY, Reading, columns
from rules.units import show

_VALUE = dict(columns("readings"))["value"]


@dataclass(frozen=True, slots=True)
class Where:
    """Everything about a reading but its value."""

    place: Place
    visit: str
    round: str
    quantity: str
    at: str
    to: str = ""
    leg: str = ""
    meter: Meter = NO_METER
    by: str = ""
    loads_off: str = ""


def reading_from(text: str, where: Where, now: datetime) -> Reading:
    """
    The reading that a typed value makes; it has no id yet.

    Raises
    ------
    UnreadableText, InvalidQuantity
        If the text is no value, with one line that says what is accepted.
    """
    text = without_bare_point(trimmed(text, _VALUE))
    if not text:
        raise UnreadableText("nothing is typed; accepted: what the meter shows")
    unit = UNIT_OF_QUANTITY[where.quantity]
    cell = read_cell(text, _VALUE, unit)
    if (complaint := number_complaint(float(cell.value), within(_VALUE, unit))) is not None:
        what, accepted = complaint
        raise InvalidQuantity(f"{what}; accepted: {accepted}")
    return Reading(
        id="",
        circuit_id=where.place.circuit_id,
        board=where.place.board,
        visit=where.visit,
        round=where.round,
        taken_at=now.isoformat(timespec="seconds"),
        quantity=where.quantity,
        at=where.at,
        to=where.to,
        leg=where.leg,
        value=float(cell.value),
        instrument=where.meter.tag,
        full_scale=where.meter.full_scale,
        by=where.by,
        loads_off=where.loads_off,
        typed=(("value", cell.typed),) if cell.typed is not None else (),
    )


def without_bare_point(text: str) -> str:
    """
    A number without a decimal point that nothing follows yet.

    >>> without_bare_point("52."), without_bare_point("52.4"), without_bare_point(".")
    ('52', '52.4', '.')
    """
    number = text.removesuffix(".")
    return number if number[-1:].isdecimal() and "." not in number else text


def value_words(reading: Reading) -> str:
    """A reading's value as it was understood."""
    return show(reading.value, reading.unit, digits=9)


def edit_for(reading: Reading, on: str, replaced: Reading | None = None, reason: str = "") -> Edit:
    """
    The save of one reading.

    Parameters
    ----------
    reading : Reading
        What was read.
    on : str
        Tag of the circuit or board.
    replaced : Reading
        The reading that it corrects; it stays, and gets a tag by which it can be named.
    reason : str
        Why it is corrected.
    """
    what = f"{on} round {reading.round}: {reading.quantity} at {reading.at} {value_words(reading)}"
    what += ", loads off" if reading.is_unloaded else ""
    if replaced is None:
        return Edit(what, (Add("readings", reading),))
    steps: list[Step] = []
    if not replaced.tag:
        steps.append(Change("readings", replaced.id, {"tag": f"r-{secrets.token_hex(4)}"}))
    steps.append(Add("readings", replace(reading, replaces_id=replaced.id, reason=reason)))
    return Edit(f"{what} in place of {value_words(replaced)}", tuple(steps))
