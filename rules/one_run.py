"""
One run with one load, computed without a site: drop with its doubt, margin, smallest sufficient size.

The same resistances, doubts, capacities and verdicts as a site's, from the same functions. The conductor has
the temperature that is given, else that in service at its current, else (no capacity is known) the profile's hot one.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from enum import Enum

from rules.calc.ampacity import Capacity
from rules.capacity import capacity_of
from rules.decision import Verdict, against_limit
from rules.errors import MissingData
from rules.limits import Limits
from rules.loads import Drawn
from rules.record import Figure, Run, Site
from rules.runs import Carrying, RunFigures, figures, record_variance
from rules.tables.conductors import area_mm2, ladder

MOST_PARALLEL = 20
"""Conductors side by side up to which a sufficient number is looked for. Our own default."""
SETTLED_K = 1e-9
"""Change of temperature at which the temperature in service has settled. [K]"""
MOST_PASSES = 200
"""Passes after which it counts as settled; only a load next to collapse needs more than ten."""


class Warmth(Enum):
    """Where the temperature of the conductors comes from."""

    GIVEN = "as given"
    IN_SERVICE = "in service at this current"
    AMBIENT = "that of the ambient, since no steady current can flow"
    LIMIT = "held at the limit of its insulation, since the current is above capacity"
    HOT = "the profile's hot temperature, since no capacity is known"


@dataclass(frozen=True, slots=True, kw_only=True)
class OneRun:
    """What is asked: a run, what feeds it and what it feeds."""

    run: Run
    nominal_v: float
    """At the start of the run. [V]"""
    draws: Drawn
    """Of the load at its end."""
    allowed_percent: float
    """Of nominal. [%]"""
    ambient_c: float
    lowest_v: float | None = None
    """Voltage that the load needs; ``None`` for not asked. [V]"""
    duty: float | None = None
    """Share of the year in which the load is on, 0 to 1; ``None`` for not asked."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Carried:
    """The run under a load that it can supply."""

    current: Figure
    drop: Figure
    share: Figure
    """Drop over nominal."""
    at_load: Figure
    loss: Figure
    """Heat in the run. [W]"""
    margin: Figure
    """Allowed drop less drop. [V]"""
    verdict: Verdict
    """On the allowed drop."""
    lowest_margin: Figure | None
    """Voltage at the load less the lowest that it needs. [V]"""
    lowest_verdict: Verdict | None
    may_collapse: bool
    """Within twice the doubt of the resistance the load could not be supplied."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Answer:
    """What follows for one run."""

    asked: OneRun
    loop: Figure
    """Both legs with their terminations. [ohm]"""
    terminations_ohm: float
    """Mean of the healthy terminations in it."""
    temperature: Figure
    warmth: Warmth
    carried: Carried | None
    """``None`` where the load cannot be supplied through the run."""
    most: Figure
    """The most that could be had: power, or current into a dead short."""
    capacity: Capacity | None
    capacity_gap: str
    """Why there is no capacity; empty where there is one."""

    @property
    def is_above_capacity(self) -> bool:
        """The current is more than the conductors may carry as installed."""
        if self.capacity is None or self.carried is None:
            return False
        return self.carried.current.value > self.capacity.ampacity_a

    @property
    def suffices(self) -> bool:
        """The load is supplied, within what is allowed beyond the doubt, and not above capacity where one is known."""
        if self.carried is None or self.carried.may_collapse or self.is_above_capacity:
            return False
        verdicts = (self.carried.verdict, self.carried.lowest_verdict or Verdict.CONFORMS)
        return all(verdict is Verdict.CONFORMS for verdict in verdicts)


def answer(asked: OneRun, limits: Limits) -> Answer:
    """
    Compute one run.

    Raises
    ------
    UnknownSize
        If no table has the size.
    InvalidQuantity
        If a quantity of the run cannot be.

    Examples
    --------
    29 m of 4 mm² in PVC clipped to a wall, 8 A, 24 V, in 25 °C:

    >>> from rules import limits
    >>> run = Run(id="", circuit_id="", number=1, one_way_length_m=29.0, size="4 mm2", insulation="PVC", method="C")
    >>> of_run = OneRun(run=run, nominal_v=24.0, draws=Drawn(current_a=8.0), allowed_percent=5.0, ambient_c=25.0)
    >>> found = answer(of_run, limits.of(Site(name="")))
    >>> round(found.temperature.value, 1), round(found.carried.drop.value, 2), found.carried.verdict.value
    (27.0, 2.21, 'does not conform')
    """
    run = asked.run
    site = Site(name="", ambient_temperature_c=asked.ambient_c)
    cold = figures([run], site, limits)[run.id]
    capacity, gap = _capacity(run, site, limits)
    temperature_c, warmth = _temperature(asked, cold, capacity, limits)
    known = cold.at(temperature_c, limits["temperature_doubt.assumed"])
    loop = Figure(known.loop_ohm, "ohm", math.sqrt(record_variance([Carrying(known, 1.0)], limits)))
    return Answer(
        asked=asked,
        loop=loop,
        terminations_ohm=known.joints_ohm,
        temperature=Figure(temperature_c, "degC", known.temperature_u_k),
        warmth=warmth,
        carried=_carried(asked, loop, limits),
        most=_most(asked, loop.value),
        capacity=capacity,
        capacity_gap=gap,
    )


def sufficient(asked: OneRun, limits: Limits) -> Answer | None:
    """
    The same with the smallest size that suffices, else with the fewest equal conductors in parallel.

    Sizes are those of the trade in the standard of the size that was asked for, and that size itself. Where the
    capacity of that size is known, one whose capacity no table has does not count. Where the return has a size of its own
    it keeps it. ``None`` where nothing suffices.
    """
    run = asked.run
    needs_capacity = answer(asked, limits).capacity is not None
    sizes = [replace(run, size=size) for size in sorted({*ladder(run.size), run.size}, key=area_mm2)]
    beside = [replace(run, parallel=number) for number in range(run.parallel_or_default + 1, MOST_PARALLEL + 1)]
    for other in (*sizes, *beside):
        found = answer(replace(asked, run=other), limits)
        if found.suffices and not (needs_capacity and found.capacity is None):
            return found
    return None


def _capacity(run: Run, site: Site, limits: Limits) -> tuple[Capacity | None, str]:
    try:
        return capacity_of(run, site, limits), ""
    except MissingData as error:
        return None, str(error)


def _temperature(asked: OneRun, cold: RunFigures, capacity: Capacity | None, limits: Limits) -> tuple[float, Warmth]:
    """The conductors' temperature, settled with the current that it lets through. [degC]"""
    given = asked.run.conductor_temperature_c
    if given is not None:
        return given, Warmth.GIVEN
    if capacity is None:
        return max(limits["temperature.hot_c"], asked.ambient_c), Warmth.HOT
    temperature_c = asked.ambient_c
    for _ in range(MOST_PASSES):
        solved = _solve(asked, cold.at(temperature_c, 0.0).loop_ohm)
        if solved is None:
            return temperature_c, Warmth.AMBIENT
        fresh = min(capacity.temperature_c(solved.current_a), capacity.limit_c)
        settled = abs(fresh - temperature_c) < SETTLED_K
        temperature_c = fresh
        if settled:
            break
    return temperature_c, Warmth.LIMIT if temperature_c >= capacity.limit_c else Warmth.IN_SERVICE


@dataclass(frozen=True, slots=True)
class _Solved:
    """A run that is supplied."""

    at_load_v: float
    current_a: float
    slope_a: float
    """How much the drop gains with each ohm. [V/ohm]"""


def _solve(asked: OneRun, loop_ohm: float) -> _Solved | None:
    """
    Voltage at the load; ``None`` where it cannot be supplied.

    Constant power: V = (Vs + sqrt(Vs² - 4 P R)) / 2, of the two solutions the one at which it starts; none below
    Vs² = 4 P R.
    """
    source_v, draws = asked.nominal_v, asked.draws
    if draws.power_w:
        under_root = source_v**2 - 4 * draws.power_w * loop_ohm
        if under_root <= 0:
            return None
        at_load_v = (source_v + math.sqrt(under_root)) / 2
        return _Solved(at_load_v, draws.power_w / at_load_v, draws.power_w / math.sqrt(under_root))
    if draws.conductance_s:
        at_load_v = source_v / (1 + loop_ohm * draws.conductance_s)
        current_a = at_load_v * draws.conductance_s
        return _Solved(at_load_v, current_a, current_a * at_load_v / source_v)
    at_load_v = source_v - draws.current_a * loop_ohm
    return _Solved(at_load_v, draws.current_a, draws.current_a) if at_load_v > 0 else None


def _most(asked: OneRun, loop_ohm: float) -> Figure:
    """The most power that a load could draw at the end of the run, or the most current. [W, A]"""
    if asked.draws.power_w:
        return Figure(asked.nominal_v**2 / (4 * loop_ohm), "W")
    return Figure(asked.nominal_v / loop_ohm, "A")


def _carried(asked: OneRun, loop: Figure, limits: Limits) -> Carried | None:
    solved = _solve(asked, loop.value)
    if solved is None:
        return None
    loop_u = loop.u or 0.0
    drop_v = asked.nominal_v - solved.at_load_v
    # near collapse the slope has no bound, but no drop is more than the source has
    drop_u = min(solved.slope_a * loop_u, asked.nominal_v)
    current_slope = asked.draws.power_w / solved.at_load_v**2 - asked.draws.conductance_s  # with the drop [A/V]
    loss_slope = solved.current_a + current_slope * drop_v
    allowed_v = asked.allowed_percent / 100 * asked.nominal_v
    lowest_v = asked.lowest_v
    return Carried(
        current=Figure(solved.current_a, "A", abs(current_slope) * drop_u or None),
        drop=Figure(drop_v, "V", drop_u),
        share=Figure(drop_v / asked.nominal_v, "1", drop_u / asked.nominal_v),
        at_load=Figure(solved.at_load_v, "V", drop_u),
        loss=Figure(drop_v * solved.current_a, "W", abs(loss_slope) * drop_u),
        margin=Figure(allowed_v - drop_v, "V", drop_u),
        verdict=against_limit(drop_v, allowed_v, drop_u, limits),
        lowest_margin=None if lowest_v is None else Figure(solved.at_load_v - lowest_v, "V", drop_u),
        lowest_verdict=None
        if lowest_v is None
        else against_limit(solved.at_load_v, lowest_v, drop_u, limits, above_is_bad=False),
        may_collapse=_solve(asked, loop.value + 2 * loop_u) is None,
    )
