"""
How much current may be asked for: device, cable, source, and the heat in what is suspected.

A reading is never worth a fire: what a circuit is loaded with for it stays within every rating that the record knows,
and within the current at which the upper bound of a suspected extra resistance turns the profile's
``heat.load_test_w`` into heat.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping

from rules.capacity import capacity_of
from rules.case import CircuitCase
from rules.diagnosis.rows import DEVICE
from rules.errors import RulesError
from rules.record import Board, Circuit, Run, Source

DIGITS = 2
"""Digits of a current that is asked for."""


def largest_level(case: CircuitCase, amps: Mapping[str, float]) -> float:
    """
    By how much the currents of a round may be multiplied: the smallest over the ratings; infinite where none is known.

    Parameters
    ----------
    amps : mapping
        Current of the round by branch, ``device`` or ``run 2``. [A]

    Examples
    --------
    A device of 10 A that carries 4 A allows 2.5 times as much.
    """
    levels = [limit_a / abs(a) for limit_a, a in _limits(case, amps) if a]
    return min(levels, default=math.inf)


def _limits(case: CircuitCase, amps: Mapping[str, float]) -> Iterator[tuple[float, float]]:
    """Each rating with the current that it bounds."""
    whole = abs(amps.get(DEVICE, 0.0)) or sum(
        abs(amps.get(run.name, 0.0)) for run in case.tree.runs if run.from_point == "way"
    )
    for rating in ratings(case):
        yield rating, whole
    for run in case.tree.runs:
        capacity = capacity_a(case, run)
        if capacity is not None and run.name in amps:
            yield capacity, amps[run.name]


def ratings(case: CircuitCase) -> list[float]:
    """Ratings of the devices and sources between a circuit and what feeds it. [A]"""
    rated = [row.rated_current_a for row in _upwards(case)]
    return [ampere for ampere in rated if ampere]


def _upwards(case: CircuitCase) -> Iterator[Circuit | Source]:
    """The circuit, and every circuit and source above it."""
    index = case.context.index
    above: list[Circuit | Board | Source] = [case.circuit]
    seen: set[str] = set()
    while above:
        here = above.pop()
        if here.id in seen:
            continue
        seen.add(here.id)
        if not isinstance(here, Board):
            yield here
        feeds = here.fed_by if isinstance(here, Board) else (here.fed_from,)
        if isinstance(here, Source):
            continue  # behind a converter the currents are others
        named = (index.named(feed) for feed in feeds if feed is not None)
        above += [row for row in named if row is not None]


def capacity_a(case: CircuitCase, run: Run) -> float | None:
    """What a run may carry as installed; ``None`` where no table has it. [A]"""
    try:
        return capacity_of(run, case.context.site, case.limits, case.circuit.rated_current_a).ampacity_a
    except RulesError:
        return None


def heat_level(suspects: Iterable[tuple[float, float]], watts: float) -> float:
    """
    By how much currents may be multiplied until a suspected extra resistance gives so much heat.

    Parameters
    ----------
    suspects : iterable of tuple
        Upper bound of an extra resistance, and the current through it. [ohm, A]

    Examples
    --------
    >>> heat_level([(0.05, 5.0), (0.2, 1.0)], 5.0)
    2.0
    """
    levels = [math.sqrt(watts / ohm) / abs(a) for ohm, a in suspects if ohm > 0 and a]
    return min(levels, default=math.inf)


def rounded_up(ampere: float) -> float:
    """
    A current to ask for: two digits, not below it.

    >>> rounded_up(0.3131), rounded_up(4.0), rounded_up(0.0)
    (0.32, 4.0, 0.0)
    """
    unit = _unit(ampere)
    return float(f"{math.ceil(ampere / unit - 1e-9) * unit:.{DIGITS}g}") if unit else ampere


def rounded_down(ampere: float) -> float:
    """
    A bound on a current: two digits, not above it.

    >>> rounded_down(15.81), rounded_down(0.4), rounded_down(math.inf)
    (15.0, 0.4, inf)
    """
    unit = _unit(ampere)
    return float(f"{math.floor(ampere / unit) * unit:.{DIGITS}g}") if unit else ampere


def _unit(ampere: float) -> float:
    """The last digit that is kept; 0 where there is nothing to round."""
    if ampere <= 0 or math.isinf(ampere):
        return 0.0
    return float(10.0 ** (math.floor(math.log10(ampere)) + 1 - DIGITS))
