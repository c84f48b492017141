"""Words and figures of a report in one place, so that the terminal and every form use the same ones."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from audit.report.bar import Bar, drop_bar
from rules.assessment import (
    STATUS_SIGNS,
    CircuitResult,
    Drop,
    Finding,
    JointHeat,
    LoadMargin,
    NextReading,
    Place,
    Severity,
    Status,
)
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
MOST_LISTED = 12
"""Consequences or numbers of one finding that a page lists."""
LEAST_SURE = 0.999
"""Probability above which a finding says no more than that it is above it."""
CAUSES_NOT_JUDGED = "No reading here lets a cause be weighed: a drop that agrees within its doubt is “measure”, and no circuit is sound."


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


def some_of(texts: Sequence[str]) -> str:
    """
    Texts in one line, the first twelve of very many; the JSON and the table have them all.

    >>> some_of(["a", "b"]), some_of([str(n) for n in range(14)])
    ('a; b', '0; 1; 2; 3; 4; 5; 6; 7; 8; 9; 10; 11; and 2 more')
    """
    more = [f"and {len(texts) - MOST_LISTED} more"] if len(texts) > MOST_LISTED + 1 else []
    return "; ".join([*texts[: MOST_LISTED if more else None], *more])


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


def heat_words(heat: JointHeat) -> str:
    """
    Heat in a suspected bad connection: ``4.24 ± 0.04 W in it at 9.61 A as read, 4.23 ± 0.04 W at design 9.6 A``.

    >>> heat_words(JointHeat("run 2", Figure(6.0, "A"), Figure(5.58, "W", 0.08), None, None))
    '5.58 ± 0.08 W in it at 6 A as read'
    """
    parts = []
    if heat.read is not None and heat.read_a is not None:
        parts.append(f"{figure_words(heat.read)} in it at {show(heat.read_a.value, 'A', digits=3)} as read")
    if heat.design is not None and heat.design_a is not None:
        words = "" if parts else " in it"
        parts.append(f"{figure_words(heat.design)}{words} at design {show(heat.design_a.value, 'A', digits=3)}")
    return ", ".join(parts)


def extra_words(place: Place) -> str:
    """
    Extra resistance with the bounds of its central 95 %; empty where there is none.

    >>> extra_words(Place("bad connection", "run 2", 0.93, 0.151, 0.155, 0.159))
    '155 mΩ (151 mΩ to 159 mΩ)'
    """
    if place.best_ohm is None or place.low_ohm is None or place.high_ohm is None:
        return ""
    best, low, high = (show(ohm, "ohm", digits=3) for ohm in (place.best_ohm, place.low_ohm, place.high_ohm))
    return f"{best} ({low} to {high})"


def with_and_without(margin: LoadMargin) -> str:
    """
    What a load gets with the source at its lowest, by the readings and as recorded; empty where one is not known.

    >>> volts = [Figure(v, "V", u) for v, u in ((38.1, 0.2), (39.7, 0.1))]
    >>> with_and_without(LoadMargin("fan", "p1", worst=volts[0], worst_recorded=volts[1], source_lowest=Figure(40.5, "V")))
    'fan, source at its lowest 40.5 V: 38.1 ± 0.2 V, 2.4 ± 0.2 V lost; without the fault 39.70 ± 0.10 V, 0.80 ± 0.10 V lost'
    """
    worst, recorded, source = margin.worst, margin.worst_recorded, margin.source_lowest
    if worst is None or recorded is None or source is None:
        return ""
    lost = [Figure(source.value - figure.value, "V", figure.u) for figure in (worst, recorded)]
    return (
        f"{margin.load}, source at its lowest {figure_words(source)}: {figure_words(worst)}, {figure_words(lost[0])} lost; "
        f"without the fault {figure_words(recorded)}, {figure_words(lost[1])} lost"
    )


def peak_words(margin: LoadMargin) -> str:
    """
    Which state of a load the peak is.

    >>> peak_words(LoadMargin("coil", "p1", peak=Figure(10.0, "A")))
    'at peak, 10 A'
    """
    return "" if margin.peak is None else f"at peak, {figure_words(margin.peak)}"


def source_words(margins: tuple[LoadMargin, ...]) -> str:
    """
    What the source has at design and at worst; empty where it is not known.

    >>> source_words((LoadMargin("coil", "p1", source_working=Figure(118.0, "V"), source_lowest=Figure(99.0, "V")),))
    'at design: the source at 118 V; at worst: the source at its lowest, 99 V, hot conductors'
    """
    design = dict.fromkeys(figure_words(each.source_working) for each in margins if each.source_working is not None)
    lowest = dict.fromkeys(figure_words(each.source_lowest) for each in margins if each.source_lowest is not None)
    said = [f"at design: the source at {' or '.join(design)}"] if design else []
    said += [f"at worst: the source at its lowest, {' or '.join(lowest)}, hot conductors"] if lowest else []
    return "; ".join(said)


def fault_is_likely(result: CircuitResult) -> bool:
    """Whether a fault is more probable than none."""
    return sum(place.probability for place in result.causes if place.cause not in NO_FAULT) > 0.5


NO_FAULT = ("as recorded", "reading or record doubtful")


@dataclass(frozen=True, slots=True)
class DoubtRow:
    """One part of the doubt of a drop's difference."""

    name: str
    adds: str
    """What it adds: its standard uncertainty."""
    part: float
    """Of the variance, 0 to 1."""
    share: str
    """The same in words."""
    bar: Bar | None
    """The same share, drawn; the right edge is all of it."""
    stated: str
    """Who states it: a group of the limits profile, or the instruments' record."""


def doubt_rows(drop: Drop) -> tuple[DoubtRow, ...]:
    """
    What the doubt of a drop's difference is made of, largest first; the squares add up.

    >>> from rules.assessment import Doubt
    >>> drop = Drop("1", "way", "p1", *[Figure(1.0, "V", 0.05)] * 3, Figure(8.0, "A"), "two voltages",
    ...     budget=(Doubt("length", 0.04, "length_doubt"), Doubt("meter counts", 0.03)))
    >>> [(row.name, row.adds, row.share, row.stated) for row in doubt_rows(drop)]
    [('length', '40 mV', '64 %', 'profile, length_doubt'), ('meter counts', '30 mV', '36 %', 'record of instruments')]
    """
    whole = sum(doubt.u_v**2 for doubt in drop.budget)
    rows = []
    for doubt in drop.budget:
        share = doubt.u_v**2 / whole if whole > 0 else 0.0
        words = f"{100 * share:.0f} %" if share >= LEAST_SHARE else f"< {100 * LEAST_SHARE:.0f} %"
        bar = drop_bar(share, None, None, 1.0, f"{doubt.name}: {words}")
        stated = f"profile, {doubt.group}" if doubt.group else "record of instruments"
        stated += " and record of instruments" if doubt.group and doubt.by_instruments else ""
        rows.append(DoubtRow(doubt.name, show(doubt.u_v, "V", digits=2), share, words, bar, stated))
    return tuple(rows)


LEAST_SHARE = 0.01
"""Shares below it are said to be."""


def doubt_summary(drop: Drop) -> str:
    """The difference with its doubt: ``measured less computed 0.39 ± 0.03 V; its doubt, squared, is made of``."""
    return f"measured less computed {figure_words(drop.excess)}; its doubt, squared, is made of"


def percent_words(percent: float, limit: float | None) -> str:
    """
    A percentage with one decimal, or as many as it takes to bear out which side of the limit it is on.

    >>> percent_words(5.04, 5), percent_words(1.44, 5)
    ('5.04', '1.4')
    >>> percent_words(-0.02, 5)
    '0.0'
    """
    text = f"{percent:z.1f}"
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
    least, most = reading.current_at_least, reading.current_at_most
    if least is not None and least == most:
        parts.append(f"at {figure_words(least)}")
    elif least is not None:
        parts.append(f"at {figure_words(least)} or more")
    if most is not None and least != most:
        parts.append(f"at most {figure_words(most)}")
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
