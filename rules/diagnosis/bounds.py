"""
How much current may be asked for: device, cable, source, and the heat in what is suspected.

A reading is never worth a fire: what a circuit is loaded with for it stays within every rating that the record knows,
and within the current at which the upper bound of a suspected extra resistance turns the profile's
``heat.load_test_w`` into heat.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Iterator, Mapping
from typing import NamedTuple

from rules.capacity import capacity_of
from rules.case import CircuitCase
from rules.diagnosis.rows import DEVICE
from rules.errors import RulesError
from rules.record import Board, Circuit, Run, Source
from rules.units import show

DIGITS = 2
"""Digits of a current that is asked for."""
SUPERVISED = 1.2
"""Up to so many times the recorded current of a trip-or-close load a clamp's reading is taken for its supervision."""
OPERATES = "can operate the switch"
"""What more than the supervision current does."""


class Bound(NamedTuple):
    """By how much the currents of a round may be multiplied, and what bounds them."""

    level: float = math.inf
    why: str = ""
    """What more would do: ``passes the rating of C-04``; empty where no bound is known."""


def largest_level(case: CircuitCase, amps: Mapping[str, float]) -> float:
    """By how much the currents of a round may be multiplied: ``largest_bound`` without its reason."""
    return largest_bound(case, amps).level


def largest_bound(case: CircuitCase, amps: Mapping[str, float]) -> Bound:
    """
    By how much the currents of a round may be multiplied: the smallest over the ratings and, where a load trips or closes
    a switch, over what flows while it is supervised; infinite where none is known.

    Parameters
    ----------
    amps : mapping
        Current of the round by branch, ``device`` or ``run 2``. [A]

    Examples
    --------
    A device of 10 A that carries 4 A allows 2.5 times as much.
    """
    bounds = [Bound(limit_a / abs(a), why) for limit_a, a, why in _limits(case, amps) if a]
    return min(bounds, key=lambda bound: bound.level, default=Bound())


def _limits(case: CircuitCase, amps: Mapping[str, float]) -> Iterator[tuple[float, float, str]]:
    """Each rating with the current that it bounds, and what more would do."""
    whole = abs(amps.get(DEVICE, 0.0)) or sum(
        abs(amps.get(run.name, 0.0)) for run in case.tree.runs if run.from_point == "way"
    )
    for row in _upwards(case):
        if row.rated_current_a:
            yield row.rated_current_a, whole, f"passes the rating of {row.tag}"
    for run in case.tree.runs:
        capacity = capacity_a(case, run)
        if capacity is not None and run.name in amps:
            yield capacity, amps[run.name], f"passes the capacity of {run.name}"
    if not operates_a_switch(case):
        return
    for point, run in case.tree.ends.items():
        ampere = abs(amps.get(run.name, 0.0))
        supervised = case.tree.design_current_a.get(point)
        if ampere and not supervised:  # nothing supervises it by the record: no more than what was read
            yield ampere, ampere, OPERATES
        elif ampere and supervised:
            # what the clamp showed while the coil was supervised may flow again
            yield max(supervised, ampere if ampere <= SUPERVISED * supervised else 0.0), ampere, OPERATES


def operates_a_switch(case: CircuitCase) -> bool:
    """Whether a load of the circuit trips or closes a switch: more current than it is supervised with can operate it."""
    return any(each.load.function_or_default == "trip or close" for each in case.loads)


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


def heat_bound(suspects: Iterable[tuple[float, float]], watts: float) -> Bound:
    """
    By how much currents may be multiplied until a suspected extra resistance gives so much heat.

    Parameters
    ----------
    suspects : iterable of tuple
        Upper bound of an extra resistance, and the current through it. [ohm, A]

    Examples
    --------
    >>> heat_bound([(0.05, 5.0), (0.2, 1.0)], 5.0)
    Bound(level=2.0, why='turns more than 5 W into heat in a joint of 50 mΩ')
    """
    bounds = [(math.sqrt(watts / ohm) / abs(a), ohm) for ohm, a in suspects if ohm > 0 and a]
    if not bounds:
        return Bound()
    level, ohm = min(bounds)
    return Bound(level, f"turns more than {show(watts, 'W')} into heat in a joint of {show(ohm, 'ohm', digits=2)}")


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
