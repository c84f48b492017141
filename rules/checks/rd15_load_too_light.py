"""RD15: the load was too light for the readings to say anything of a joint that would run hot."""

import math
from collections.abc import Iterator
from dataclasses import dataclass

from rules.assessment import Citation, Drop, Finding, Severity
from rules.case import CircuitCase, LoadPoint
from rules.diagnosis.bounds import largest_level
from rules.errors import MissingData
from rules.margins import Peak, margins_of
from rules.record import Figure
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, named, rule
from rules.units import show
from rules.verdict import claimed, unsettled, unsound

FIXED = ("meter counts", "source wander", "current counts")
"""Doubts of a drop that stay as they are when more current flows; all others grow with it."""

OF_A_PEAK = (
    "Read again with at least the current stated, when the load is next worked with the duty holder's permission; else read the "
    "resistance of the path dead, or with a finer meter."
)


@rule(
    id="RD15",
    title="Load too light to conclude",
    about="circuit",
    severity=Severity.NOTE,
    remedy="Read again at the current stated, with the circuit's own loads where they can be set; else with a finer meter.",
    caution="No load is added to a life-safety, trip or close circuit without the duty holder's permission, and none above what device, "
    "cable and source are rated for. A bad joint heats with the square of the current.",
    source=Citation("JCGM 100", "2008", "5.2: doubt of a difference of correlated readings", "from-memory"),
    limits=(
        "decision",
        "heat",
        "next_reading",
        "readings",
        "source",
        "load_share",
        *DOUBTS_OF_COMPUTED,
        *DOUBTS_OF_READINGS,
    ),
    under=("RD15",),
)
def load_too_light(case: CircuitCase) -> Iterator[Finding]:
    """
    The current that was read is too small for the readings to settle the circuit. A bad connection that would give the
    profile's heat at design current would lose less at it than the profile's number of standard uncertainties, because of
    what does not grow with the current: counts, display, source wander. The current is stated at which it would stand out, and whether
    device, cable and source allow it. Likewise of a load with a peak current, a coil or a lock: a joint that would leave it less
    than its lowest voltage at its peak, which a current at rest does not show.

    **Finds**: 0.5 A read on a circuit of 8 A: 2 W at 8 A are 31 mΩ, which lose 16 mV at 0.5 A, against 19 mV of doubt.

    **Leaves alone**: a circuit that is settled; one on which the doubt of the length hides the same joint at any current; one
    read at its full load.
    """
    drop = case.drop
    if drop is None or case.diagnosis is None:
        return
    if unsettled(case) or unsound(case):
        yield from _at_design(case, drop)
    if claimed(case.diagnosis.causes, case.limits) is None:
        yield from _at_peak(case, drop)


def _at_design(case: CircuitCase, drop: Drop) -> Iterator[Finding]:
    """By the heat of a joint at design current."""
    first = next(iter(case.tree.ends), "")
    design_a = max((case.largest_current_a.get(point, 0.0) for point in ("way", first)), default=0.0)
    if not design_a:
        raise MissingData("the design current is not known, so neither is the joint that would run hot")
    heat = case.limits["heat.limit_w"]
    extra_ohm, read_a = heat / design_a**2, abs(drop.current.value)
    if read_a * (1 + case.limits["readings.load_margin"]) >= design_a:
        return  # the load is all that there is: a finer meter is what it takes
    light = _light(case, drop, extra_ohm)
    if light is None:
        return
    beyond = f", more than the {show(design_a, 'A', digits=3)} of its own loads" if light.needed_a > design_a else ""
    yield load_too_light.finding(
        case,
        _where(drop),
        f"a joint of {show(extra_ohm, 'ohm', digits=2)}, {show(heat, 'W')} at {show(design_a, 'A', digits=3)}, "
        f"{light.words(light.beyond or beyond)}",
        numbers=light.numbers,
        source=f"{load_too_light.source}; {case.limits.citation('heat')}; {case.limits.citation('next_reading')}",
    )


def _at_peak(case: CircuitCase, drop: Drop) -> Iterator[Finding]:
    """By what a joint would leave a load at its peak current; of several loads at the one that asks for the most current."""
    found: list[tuple[_Light, LoadPoint, Peak, float]] = []
    for point, margin in zip(case.loads, margins_of(case), strict=True):
        peak, lowest = margin.peak, point.load.lowest_voltage_v
        if (
            peak is None
            or lowest is None
            or peak.current_a <= abs(drop.current.value)
            or not _passes(case, drop, point)
        ):
            continue
        spare_v = (peak.design_v if peak.lowest_v is None else peak.lowest_v) - lowest
        light = _light(case, drop, spare_v / peak.current_a) if spare_v > 0 else None  # else LV03 and LV01 say so
        if light is not None:
            found.append((light, point, peak, lowest))
    if not found:
        return
    light, point, peak, lowest = max(found, key=lambda one: one[0].needed_a)
    why = (
        f"a joint of {show(light.extra_ohm, 'ohm', digits=2)}, which would leave {point.load.tag} less than its lowest "
        f"{show(lowest, 'V')} at its peak of {show(peak.current_a, 'A')}, {light.words(light.beyond)}"
    )
    yield load_too_light.finding(
        case,
        f"{_where(drop)}, peak of {point.load.tag}",
        why,
        numbers=light.numbers | {"peak": Figure(peak.current_a, "A"), "lowest": Figure(lowest, "V")},
        source=f"{load_too_light.source}; {case.limits.citation('next_reading')}",
        remedy=OF_A_PEAK,
        without=("heat",),
        under=(named("RD15", case, _where(drop)),),
        as_consequence=why,
    )


def _where(drop: Drop) -> str:
    return f"{drop.start} to {drop.end}, round {drop.round}"


def _passes(case: CircuitCase, drop: Drop, point: LoadPoint) -> bool:
    """Whether the way to a load goes along the drop, or a part of it."""
    at = point.load.point
    return at == drop.end or case.leads_over(at, drop.end) or case.leads_over(drop.end, at)


@dataclass(frozen=True, slots=True)
class _Light:
    """An extra resistance that the current read does not show."""

    drop: Drop
    extra_ohm: float
    doubt_v: float
    needed_a: float
    beyond: str
    """That the current needed is more than may flow; empty where it may."""

    def words(self, beyond: str) -> str:
        read_a = abs(self.drop.current.value)
        return (
            f"loses {show(self.extra_ohm * read_a, 'V', digits=2)} at the {show(read_a, 'A', digits=3)} read, against a doubt "
            f"of {show(self.doubt_v, 'V', digits=2)}; it takes {show(self.needed_a, 'A', digits=2)}{beyond}"
        )

    @property
    def numbers(self) -> dict[str, Figure]:
        return {
            "current": self.drop.current,
            "needed": Figure(self.needed_a, "A"),
            "joint": Figure(self.extra_ohm, "ohm"),
            "doubt": Figure(self.doubt_v, "V"),
        }


def _light(case: CircuitCase, drop: Drop, extra_ohm: float) -> _Light | None:
    """Whether a drop is too small to show an extra resistance, and the current that would; ``None`` where none would, or this does."""
    read_a, apart = abs(drop.current.value), case.limits["next_reading.apart"]
    fixed, growing = _doubts(drop)
    doubt_v = math.hypot(fixed, growing)
    if not read_a or extra_ohm * read_a >= apart * doubt_v:
        return None
    rest = extra_ohm**2 - (apart * growing / read_a) ** 2
    if rest <= 0:
        return None
    needed = apart * fixed / math.sqrt(rest)
    most = read_a * largest_level(case, dict.fromkeys(("device", *(run.name for run in case.runs)), read_a))
    beyond = f", more than the {show(most, 'A', digits=2)} that is allowed here: a finer meter" if needed > most else ""
    return _Light(drop, extra_ohm, doubt_v, needed, beyond)


def _doubts(drop: Drop) -> tuple[float, float]:
    """What of a drop's doubt stays and what grows with the current, at the current that was read. [V]"""
    fixed = math.sqrt(sum(doubt.u_v**2 for doubt in drop.budget if doubt.name in FIXED))
    return fixed, math.sqrt(sum(doubt.u_v**2 for doubt in drop.budget if doubt.name not in FIXED))
