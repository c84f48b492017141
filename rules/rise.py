"""Rise of terminations and devices over similar ones and over the ambient, by temperature readings."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import dataclass, replace

from rules.assessment import Severity
from rules.calc.doubt import Weighted, total
from rules.calc.joint_heat import rise_at
from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.errors import MissingData
from rules.heat import full_a
from rules.meters import worth
from rules.record import Figure, Reading
from rules.rounds import Round, current_at
from rules.tables.ampacity import limit_c
from rules.units import show

PLACE = re.compile(r"device|run (\d+) (start|end)")
LEAST_INSULATION = "PVC"
"""What counts where no insulation is recorded: the one that bears least."""
ALIKE = 0.1
"""Relative: two terminations whose currents differ by no more are similar. Our own default."""

BEYOND = "; hotter than its insulation bears"


@dataclass(frozen=True, slots=True)
class Rise:
    """One termination above one reference, in one round."""

    place: str
    round: str
    read: Figure
    """Its temperature. [degC]"""
    rise: Figure
    """[K]"""
    above: str
    """``run 1 start, the coolest similar one``, ``the ambient``."""
    scaled: Figure
    """At the largest current; the rise as read where it is not scaled. [K]"""
    how: str
    """At which currents, and whether it was scaled."""
    full: bool
    """Whether ``scaled`` is at full load."""
    severity: Severity | None
    """``None`` where it conforms or is not settled."""
    open: bool
    """Not settled."""

    @property
    def words(self) -> str:
        """As a sentence of a finding."""
        return (
            f"{show(self.read.value, 'degC', self.read.u)} was read at {self.place} in round {self.round}, "
            f"{show(self.rise.value, 'K', self.rise.u)} above {self.above}{self.how}"
        )


def rises_of(case: CircuitCase) -> dict[str, Rise]:
    """By place: the rise that says most."""
    found: dict[str, Rise] = {}
    for this in case.rounds:
        for rise in _of_round(case, this):
            known = found.get(rise.place)
            if known is None or _weight(rise) > _weight(known):
                found[rise.place] = rise
    return found


def _weight(rise: Rise) -> tuple[int, bool, float]:
    return -(rise.severity.rank if rise.severity is not None else len(Severity)), rise.open, rise.scaled.value


def _of_round(case: CircuitCase, this: Round) -> Iterator[Rise]:
    read: dict[str, list[Reading]] = {}
    for row in this.readings:
        if row.quantity == "temperature":
            read.setdefault(row.at, []).append(row)
    places = {place: _mean(case, rows) for place, rows in read.items() if PLACE.fullmatch(place)}
    amps = {place: _current(case, place, this) for place in places}
    ambient = _ambient(case, read.get("ambient", []))
    for place, temperature in places.items():
        similar = {
            other: value
            for other, value in places.items()
            if other != place and (other == "device") == (place == "device") and _are_alike(amps[place], amps[other])
        }
        against = "device_ambient" if place == "device" else "ambient"
        if similar:
            coolest = min(similar, key=lambda other: similar[other].value)
            words = f"{coolest}, the coolest similar one"
            above = _rise(case, this, place, temperature, similar[coolest], words, amps[place], "similar")
            yield above
            if above.severity is None and _conductor_bears(case, place, temperature):
                continue  # alike hot: the conductor's own heat, no joint's
        if ambient is not None:
            yield _rise(case, this, place, temperature, *ambient, amps[place], against)
        elif not similar:
            alone = _rise(case, this, place, temperature, *_assumed(case), amps[place], against)
            bears = place == "device" or _conductor_bears(case, place, temperature)
            yield alone if bears else replace(alone, severity=Severity.SOON, how=f"{alone.how}{BEYOND}")


def _conductor_bears(case: CircuitCase, place: str, read: Figure) -> bool:
    """Whether a temperature is not beyond doubt above what the insulation of the run there lives with."""
    run = case.tree.ends.get(_branch(case, place))
    insulation = run.insulation if run is not None and run.insulation not in ("", "unknown") else LEAST_INSULATION
    most = limit_c(insulation)
    return against_limit(read.value, most, read.u or 0.0, case.limits) is not Verdict.FAILS


def _rise(
    case: CircuitCase,
    this: Round,
    place: str,
    read: Figure,
    reference: Figure,
    above: str,
    amps: Figure | None,
    against: str,
) -> Rise:
    limits = case.limits
    rise = Figure(read.value - reference.value, "K", math.hypot(read.u or 0.0, reference.u or 0.0))
    factor, factor_u, how, full = _scale(case, place, amps)
    scaled = Figure(
        factor * rise.value, "K", math.hypot(factor * (rise.u or 0.0), factor_u * rise.value)
    )  # of a rise below zero nothing follows
    watch_k, soon_k = limits[f"joint_rise.{against}_watch_k"], limits[f"joint_rise.{against}_soon_k"]
    watch = against_limit(scaled.value, watch_k, scaled.u or 0.0, limits)
    severity = Severity.WATCH if watch is Verdict.FAILS else None
    if against_limit(scaled.value, soon_k, scaled.u or 0.0, limits) is Verdict.FAILS:
        severity = Severity.SOON
    told = how.format(show(scaled.value, "K", scaled.u))
    return Rise(
        place, this.name, read, rise, above, scaled, told, full, severity, watch is Verdict.OPEN and rise.value > 0
    )


def _scale(case: CircuitCase, place: str, amps: Figure | None) -> tuple[float, float, str, bool]:
    """By what a rise grows up to the largest current, its doubt, its words, and whether it is known at all."""
    limits, most = case.limits, full_a(case, _branch(case, place))
    if amps is None or not amps.value:
        return 1.0, 0.0, "; no current was read, so that it is not scaled to full load", False
    at = f" at {show(amps.value, 'A', amps.u)}"
    if most is None or most <= amps.value:
        return 1.0, 0.0, at, True
    power = limits["joint_scaling.power"]
    if amps.value < limits["joint_scaling.least_share"] * most:
        return 1.0, 0.0, f"{at}; too little of the {show(most, 'A', digits=3)} of full load to scale it", False
    factor = float(rise_at(1.0, amps.value, most, power))
    words = f"{at}; at {show(most, 'A', digits=3)} of full load {{}}, by the square of the current (practice)"
    if power != 2:
        words = words.replace("by the square of the current", f"by the current to the power of {power:g}")
    return factor, power * factor * (amps.u or 0.0) / amps.value, words, True


def _current(case: CircuitCase, place: str, this: Round) -> Figure | None:
    try:
        current = current_at(_branch(case, place), this, case.tree, case.limits)
    except MissingData:
        return None
    value, u = total(current.terms)
    return Figure(abs(value), "A", math.hypot(u, *(share for _, share in current.shares)))


def _are_alike(one: Figure | None, other: Figure | None) -> bool:
    if one is None or other is None:
        return False
    return abs(one.value - other.value) <= ALIKE * max(one.value, other.value)


def _branch(case: CircuitCase, place: str) -> str:
    matched = PLACE.fullmatch(place)
    number = int(matched[1]) if matched and matched[1] else 0
    return next((point for point, run in case.tree.ends.items() if run.number == number), "way")


def _ambient(case: CircuitCase, rows: list[Reading]) -> tuple[Figure, str] | None:
    if rows:
        return _mean(case, rows), "the ambient"
    recorded = case.context.site.ambient_temperature_c
    if recorded is None:
        return None
    return Figure(
        recorded, "degC", case.limits["temperature_doubt.air"]
    ), f"the site's ambient of {show(recorded, 'degC')}"


def _assumed(case: CircuitCase) -> tuple[Figure, str]:
    """The profile's ambient, for a reading with nothing beside it."""
    assumed_c = case.limits["ambient.assumed_c"]
    doubt = case.limits["temperature_doubt.assumed"]
    return Figure(assumed_c, "degC", doubt), f"an assumed ambient of {show(assumed_c, 'degC')}"


def _mean(case: CircuitCase, rows: list[Reading]) -> Figure:
    """Of one place, with the doubt of the probe's contact, which another reading at the same place does not lessen."""
    shown = [worth(row, case.context.index, case.limits).shown for row in rows]
    value, u = total([Weighted(1 / len(shown), one) for one in shown])
    return Figure(value, "degC", math.hypot(u, case.limits["temperature_doubt.probe"]))
