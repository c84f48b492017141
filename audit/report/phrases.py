"""Words and figures of a report in one place, so that the terminal and every form use the same ones."""

from __future__ import annotations

import math
from dataclasses import dataclass

from audit.report.bar import Bar, drop_bar
from rules.assessment import STATUS_SIGNS, CircuitResult, Finding, NextReading, Severity, Status
from rules.record import Figure, Reading, Visit
from rules.units import show, show_against

SEVERITY_MEANING = {
    Severity.IMMEDIATE: "make safe before anything else",
    Severity.SOON: "plan the repair",
    Severity.WATCH: "look again at the next visit",
    Severity.NOTE: "for the record",
}
"""What each severity asks for; it says nothing of how sure the finding is."""

STATUS_MEANING = {
    Status.ACT: "a finding asks for a repair, at once or soon",
    Status.WATCH: "a finding asks for another look",
    Status.MEASURE: "not read, or the readings do not settle it",
    Status.INCOMPLETE: "length, size, load or source voltage is missing: the drop cannot be computed",
    Status.SOUND: "the readings agree with the record",
}
"""What each status means, the most pressing first."""

SAYS_AND_DOES_NOT_SAY = (
    "This report says what was measured and what follows from it by computation. "
    "It does not say that anything is safe to touch, in good order, or complies with any rule.",
    "Readings hold for the load and the temperature stated beside them; "
    "at another load or temperature the drop is another.",
    "A figure after ± is its standard uncertainty u. A drop counts as different from the computed one only beyond "
    "the doubt of both; what lies within it is not settled, and not settled is not passed.",
)
NOT_DESIGN_SPARE = "It is no design verification, and what was not read is listed as not read."


def limits_defer(limits: str) -> str:
    """That the limits are a profile's, and who decides."""
    return (
        f"Limits are those of the profile “{limits}”; "
        "local code and a licensed person decide what applies to this installation."
    )


PROBABILITY = "probability"
"""Name of the number of a finding that says how sure its cause is."""
LEAST_SURE = 0.999
"""Probability above which a finding says no more than that it is above it."""
CAUSES_NOT_JUDGED = (
    "Causes are not yet judged: a drop that agrees within its doubt is “measure”, and no circuit is called sound."
)


def causes_are_judged(circuits: tuple[CircuitResult, ...]) -> bool:
    """Whether any circuit names its causes."""
    return any(result.causes for result in circuits)


def status_words(status: Status) -> str:
    """Sign and word: ``! act``."""
    return f"{STATUS_SIGNS[status]} {status}"


def figure_words(figure: Figure) -> str:
    """A quantity in people's units with its standard uncertainty; a share as a percentage."""
    if not math.isfinite(figure.value):
        return "not known"
    return show(figure.value, figure.unit, figure.u if figure.u is not None and math.isfinite(figure.u) else None)


def number_words(finding: Finding) -> tuple[str, ...]:
    """Each number of a finding with its name: ``measured drop 8.10 V ± 0.03 V``."""
    return tuple(
        f"{name.replace('_', ' ')} {certainty_words(figure.value) if name == PROBABILITY else figure_words(figure)}"
        for name, figure in finding.numbers.items()
        if math.isfinite(figure.value)
    )


def certainty_words(probability: float) -> str:
    """
    A probability as a percentage that is never certain.

    >>> certainty_words(0.834), certainty_words(0.99996), certainty_words(1e-9)
    ('83.4 %', 'above 99.9 %', 'below 0.1 %')
    """
    if probability > LEAST_SURE:
        return f"above {show(LEAST_SURE, '1')}"
    if probability < 1 - LEAST_SURE:
        return f"below {show(1 - LEAST_SURE, '1', digits=3)}"
    return show(probability, "1", digits=3)


@dataclass(frozen=True, slots=True)
class DropWords:
    """What a list says of a circuit's drop."""

    bar: Bar | None
    of_allowed: str
    """``1.4 of 3 %``; ``not read`` where it was not."""
    computed: str
    """``1.3 %``, in the same state; empty where it cannot be computed."""


def drop_words(result: CircuitResult) -> DropWords:
    """
    The bar and the percentages of a circuit.

    Where a drop was read, measured and computed are of the same round; where nothing was read, the
    computed one is at design current.
    """
    nominal, allowed = result.nominal_voltage_v, result.allowed_drop_percent
    drop = result.drop
    measured = None if drop is None else drop.measured
    computed = result.design_drop if drop is None else drop.computed
    said = "not read" if not result.visit else "not compared"
    if nominal is None or not nominal > 0:
        read = said if measured is None else figure_words(measured)
        return DropWords(None, read, "" if computed is None else figure_words(computed))
    percent = None if measured is None else 100 * measured.value / nominal
    doubt = None if measured is None or measured.u is None else 100 * measured.u / nominal
    tick = None if computed is None else 100 * computed.value / nominal
    if percent is not None:
        said = percent_words(percent, allowed) + (" %" if allowed is None else f" of {allowed:g} %")
    computed_words = "" if tick is None else f"{percent_words(tick, allowed)} %"
    words = said + (f", computed {computed_words}" if computed_words else "")
    return DropWords(drop_bar(percent, doubt, tick, allowed, words), said, computed_words)


def percent_words(percent: float, limit: float | None) -> str:
    """
    A percentage with one decimal, or as many as it takes to bear out which side of the limit it is on.

    >>> percent_words(5.04, 5), percent_words(1.44, 5)
    ('5.04', '1.4')
    """
    text = f"{percent:.1f}"
    shown = float(text)
    if limit is None or (shown > limit, shown < limit) == (percent > limit, percent < limit):
        return text
    return show_against(percent / 100, limit / 100, "1")[0].removesuffix(" %")


def share_words(part: int, whole: int) -> str:
    """``38 of 61 (62 %)``."""
    return f"{part} of {whole}" + (f" ({100 * part / whole:.0f} %)" if whole else "")


def counted(number: int, noun: str) -> str:
    """
    A number with its noun.

    >>> counted(1, "circuit"), counted(0, "circuit")
    ('1 circuit', '0 circuits')
    """
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"


def place_words(circuit: str | None, board: str | None, where: str) -> str:
    """
    A place as a person would say it.

    >>> place_words("DB1-02", None, "run 2"), place_words(None, None, "")
    ('DB1-02, run 2', 'the site')
    """
    owner = circuit if circuit is not None else board
    parts = ["the site"] if owner is None and not where else [owner or "", where if where != owner else ""]
    return ", ".join(part for part in parts if part)


def finding_place(finding: Finding) -> str:
    """Where a finding is."""
    return place_words(finding.circuit, finding.board, finding.where)


def reading_words(reading: Reading) -> str:
    """What was read and where: ``drop from way to p2, positive leg``."""
    if reading.quantity == "voltage" and reading.leg in ("positive", "negative"):
        return f"voltage at {reading.at}, {reading.leg} to earth"
    if reading.to:
        where = f"{reading.quantity} from {reading.at} to {reading.to}"
    elif reading.at == "ambient":
        where = f"ambient {reading.quantity}"
    else:
        where = f"{reading.quantity} at {reading.at}"
    return where + (f", {leg_words(reading.leg)}" if reading.leg and reading.quantity != "voltage" else "")


def leg_words(leg: str) -> str:
    """``positive leg``, ``both legs``."""
    return "both legs" if leg == "both" else f"{leg} leg"


def next_reading_words(reading: NextReading) -> str:
    """
    What to read next: ``millivolts across run 2 end, positive leg, at 4 A or more``.

    >>> next_reading_words(NextReading("dead test", "resistance", "run 2 end", leg="positive"))
    'dead test: resistance across run 2 end, positive leg'
    """
    parts = [_asked_words(reading)]
    if reading.leg and reading.quantity != "voltage":
        parts.append(leg_words(reading.leg))
    if reading.current_at_least is not None:
        parts.append(f"at {figure_words(reading.current_at_least)} or more")
    if reading.current_at_most is not None:
        parts.append(f"at most {figure_words(reading.current_at_most)}")
    return ", ".join(parts)


def _asked_words(reading: NextReading) -> str:
    """The reading without leg and current."""
    where = f" of {reading.at}" if reading.at else ""
    if reading.what == "length":
        return f"the taped length{where}"
    if reading.what == "temperature":
        return f"the temperature{where} by probe"
    if not reading.quantity:
        return f"a look at {reading.at}" if reading.at else "a look at the circuit"
    if reading.to:
        said = f"{'voltages' if reading.quantity == 'voltage' else reading.quantity} from {reading.at} to {reading.to}"
    elif reading.quantity == "joint":
        said = f"millivolts across {reading.at}"
    elif reading.quantity == "resistance":
        said = f"resistance across {reading.at}"
    else:
        said = f"{reading.quantity} at {reading.at}"
    return said if reading.what == "reading" else f"{WHAT_WORDS.get(reading.what, reading.what)}: {said}"


WHAT_WORDS = {"round": "a round with its current", "finer meter": "with a finer meter"}
"""What is to be done, where it is more than a reading."""


def time_words(taken_at: str) -> str:
    """An ISO time to the minute, as people write it."""
    return taken_at.replace("T", " ", 1)[:16]


def visit_words(visit: Visit) -> str:
    """Tag, kind, date and surveyor of a visit."""
    kind = visit.kind if visit.kind and visit.kind not in visit.tag else ""
    return ", ".join(part for part in (visit.tag, kind, visit.date, f"by {visit.by}" if visit.by else "") if part)
