"""What was understood by ``ohmwalk drop`` and what follows from it, in full words."""

from __future__ import annotations

import math
from collections.abc import Iterator

from audit.drop.reading import Understood
from audit.drop.words import ALLOWED, AMBIENT, LENGTH, SIZE
from audit.report.phrases import figure_words
from rules.calc.ampacity import Capacity
from rules.calc.peak import energy_kwh_a_year
from rules.cautions import ARC, ARC_VOLTAGE_V, SHOCK, SHOCK_LIMIT_V
from rules.decision import Verdict
from rules.limits import Limits
from rules.one_run import MOST_PARALLEL, Answer, Carried
from rules.record import Figure, Run
from rules.tables.conductors import resistance_20c_ohm_per_m
from rules.units import show, show_against, show_size

Row = tuple[str, str]
"""A label and its words."""

ASSUMED = " (assumed)"
CAUTION = (
    "Computed for steady current from what was typed, with healthy terminations and no protective device in the way. It says "
    "nothing of inrush, of fault current, or of whether a device would clear it, and of nothing that it is safe or complies: "
    "local code and a licensed person decide."
)


def read_rows(understood: Understood, found: Answer, limits: Limits) -> Iterator[Row]:
    """How each input was read."""
    run, asked = understood.asked.run, understood.asked
    yield "length", f"{_as_typed(understood, LENGTH.name)}{_length(run, limits)}"
    yield "size", f"{_as_typed(understood, SIZE.name)}{_conductor(run, run.size, run.material)}"
    if run.return_size or run.return_material:
        back = _conductor(run, run.return_size_or_default, run.return_material_or_default)
        yield "way back", back
    else:
        yield "way back", f"the same conductor{ASSUMED}"
    if run.parallel_or_default > 1:
        yield "parallel", f"{run.parallel} conductors side by side in each leg"
    constant = understood.load.name.removeprefix("load ")
    load = show(understood.load_value, understood.load.unit)
    yield "load", f"{_as_typed(understood, understood.load.name)}{load}, a constant {constant}"
    yield "nominal", f"{show(asked.nominal_v, 'V')} between the legs at the start of the run"
    profile = "" if ALLOWED.name in understood.typed else f", of the limits profile {limits.name}"
    allowed_v = asked.allowed_percent / 100 * asked.nominal_v
    yield "allowed", f"{asked.allowed_percent:g} % of nominal, {show(allowed_v, 'V')}{profile}"
    if asked.lowest_v is not None:
        yield "lowest", f"{show(asked.lowest_v, 'V')} that the load needs"
    yield "ambient", f"{show(asked.ambient_c, 'degC')}{'' if AMBIENT.name in understood.typed else ASSUMED}"
    yield "conductor", f"{figure_words(found.temperature)}, {found.warmth.value}"


def result_rows(found: Answer) -> Iterator[Row]:
    """What was computed."""
    joints = show(found.terminations_ohm, "ohm")
    yield "resistance", f"{figure_words(found.loop)} out and back, with four healthy terminations of together {joints}"
    if (carried := found.carried) is None:
        return
    yield "current", figure_words(carried.current)
    yield "drop", f"{figure_words(carried.drop)}, {figure_words(carried.share)} of nominal"
    yield "at the load", figure_words(carried.at_load)
    yield "heat", f"{figure_words(carried.loss)} in the run"
    if (duty := found.asked.duty) is not None:
        energy = Figure(energy_kwh_a_year(carried.loss.value, duty), "kWh")
        yield "energy", f"{figure_words(energy)} lost a year, with the load on for {show(duty, '1')} of it"
    yield "margin", f"{figure_words(carried.margin)} to the allowed drop"
    if carried.lowest_margin is not None:
        yield "", f"{figure_words(carried.lowest_margin)} to the load's lowest"


def capacity_rows(found: Answer) -> Iterator[Row]:
    """What the conductors may carry, or why that is not known."""
    capacity = found.capacity
    if capacity is None:
        yield "capacity", f"not known: {found.capacity_gap}"
        return
    yield "capacity", f"{show(capacity.ampacity_a, 'A')}{_judged(found)}"
    yield "", _factors(capacity)
    yield "", f"{capacity.source}, edition {capacity.edition}, {capacity.status} (ohmwalk tables {capacity.table})"
    if capacity.assumed:
        yield "", f"assumed: {', '.join(capacity.assumed)}"
    for note in capacity.notes:
        yield "", note


def verdict_words(found: Answer) -> str:
    """One sentence: whether the load is supplied and the drop allowed."""
    carried = found.carried
    if carried is None:
        what = "power, however much current flows" if found.most.unit == "W" else "current, into a dead short"
        return f"cannot be supplied: the run passes at most {show(found.most.value, found.most.unit)} of {what}"
    words = f"drop {figure_words(carried.drop)}, {figure_words(carried.share)}: {_allowed_words(found, carried)}"
    if carried.lowest_verdict is not None:
        words += f"; {_LOWEST_WORDS[carried.lowest_verdict]}"
    if found.is_above_capacity:
        words += "; the current is above what the conductors may carry"
    if carried.may_collapse:
        words += "; within its doubt the load may not be supplied at all"
    return words


_LOWEST_WORDS = {
    Verdict.CONFORMS: "enough for the load",
    Verdict.FAILS: "too little for the load",
    Verdict.OPEN: "too near the load's lowest for its doubt",
}


def sufficient_words(found: Answer | None, asked: Run) -> str:
    """The smallest size that would do, or that none does."""
    if found is None or found.carried is None:
        return f"no size of the trade, nor up to {MOST_PARALLEL} conductors in parallel of {show_size(asked.size)}, suffices"
    run = found.asked.run
    what = show_size(run.size)
    if run.parallel_or_default > 1:
        what = f"{run.parallel} in parallel of {what}"
    room = "" if found.capacity is None else f", capacity {show(found.capacity.ampacity_a, 'A')}"
    carried = found.carried
    return f"{what}: drop {figure_words(carried.drop)}, {figure_words(carried.share)}{room or ', capacity not known'}"


def caution_texts(nominal_v: float) -> tuple[str, ...]:
    """The cautions that go with a computation at a voltage."""
    chosen = ((CAUTION, 0.0), (SHOCK.text, math.nextafter(SHOCK_LIMIT_V, math.inf)), (ARC.text, ARC_VOLTAGE_V))
    return tuple(text for text, from_v in chosen if nominal_v >= from_v)


def _allowed_words(found: Answer, carried: Carried) -> str:
    allowed = found.asked.allowed_percent / 100
    share, limit = show_against(carried.share.value, allowed, "1")
    if carried.verdict is Verdict.FAILS:
        return f"{share} is above the allowed {limit}"
    if carried.verdict is Verdict.CONFORMS:
        return f"within the allowed {limit}"
    return f"{share} is too near the allowed {limit} for its doubt, not settled"


def _as_typed(understood: Understood, name: str) -> str:
    """The text as typed before what it was read as."""
    return f"“{understood.typed[name]}” is "


def _length(run: Run, limits: Limits) -> str:
    one_way_m = run.one_way_length_m or 0.0
    doubt = limits.values("length_doubt")[run.length_by_or_default]
    how = f"by {run.length_by_or_default}{'' if run.length_by else ASSUMED}, ± {show(doubt, '1')}"
    return f"{show(one_way_m, 'm')} one way along the cable, {show(2 * one_way_m, 'm')} out and back; {how}"


def _conductor(run: Run, size: str, material: str) -> str:
    metal = material or run.material_or_default
    kind = f"{run.stranding_or_default}{'' if run.stranding else ASSUMED} {metal}{'' if material else ASSUMED}"
    r20 = resistance_20c_ohm_per_m(size, metal, run.stranding_or_default)
    whence = "IEC 60228, its largest" if size.endswith(" mm2") else "by area and resistivity, nominal"
    return f"{show_size(size)}, {kind}: {show(r20, 'ohm/m')} at 20 °C, {whence}"


def _judged(found: Answer) -> str:
    return " as installed: the current is above it" if found.is_above_capacity else " as installed"


def _factors(capacity: Capacity) -> str:
    parts = [f"{show(capacity.tabulated_a, 'A')} ({capacity.column})"]
    parts.append(f"{capacity.ambient_factor:g} for {show(capacity.ambient_c, 'degC')}")
    if capacity.grouping_factor != 1:
        parts.append(f"{capacity.grouping_factor:g} for grouping")
    if capacity.parallel > 1:
        parts.append(f"{capacity.parallel} in parallel")
    words = " × ".join(parts)
    if capacity.terminal_a is not None and capacity.terminal_a < capacity.corrected_a:
        words += f"; terminals of {capacity.terminal_c} °C allow {show(capacity.terminal_a, 'A')}"
    return words
