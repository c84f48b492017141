"""What was read at one place beside what was computed, as sentences with numbers."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

from rules.calc.straight_line import fit
from rules.diagnosis.problem import LEGS, TERMINATIONS, Problem, Row
from rules.diagnosis.shape import Floats
from rules.units import show

AGREES = 2.0
"""Standard uncertainties within which a reading is as computed."""
LINE = 3
"""Currents from which a line is put through what was read."""
_DOUBT = re.compile(r" ± [^ ]+")


@dataclass(frozen=True, slots=True, eq=False)
class Fact:
    """Readings of one place in all rounds, beside what is computed."""

    problem: Problem
    rows: tuple[int, ...]
    """Of the problem."""
    read: Floats
    computed: Floats
    """(n,): of all rows, as recorded. [V or ohm]"""
    u: Floats
    """(n,): of the difference of both."""
    expected: Floats | None
    """(n,): with the cause in hand at its best size; ``None`` where that is as recorded."""

    @property
    def agrees(self) -> bool:
        """Whether all of it is as computed."""
        return all(abs(self.read[n] - self.computed[n]) <= AGREES * self.u[n] for n in self.rows)

    @property
    def most(self) -> float:
        """Largest computed drop."""
        return float(max(self.computed[n] for n in self.rows))

    def shown_rows(self) -> list[int]:
        """The row with the most current, and that with the least, where they differ."""
        order = sorted(self.rows, key=lambda n: -abs(_amps(self.problem, n) or 0.0))
        return [order[0], order[-1]] if len(order) > 1 else order

    def words(self, value: float, number: int, doubt: bool = False) -> str:
        """A value of a row, ending where its doubt begins."""
        unit = "ohm" if self.problem.signature.rows[number].state < 0 else "V"
        said = show(float(value), unit, float(self.u[number]))
        return said if doubt else _DOUBT.sub("", said)

    def at(self, number: int) -> str:
        """``" at 12 A"``; empty in a dead test."""
        amps = _amps(self.problem, number)
        return "" if amps is None else f" at {show(amps, 'A', digits=3)}"


def group_words(fact: Fact) -> str:
    """One fact as a sentence: ``run 2 loses 2.40 V at 12 A against 0.54 V computed, 1.86 ± 0.03 V more``."""
    row = fact.problem.signature.rows[fact.rows[0]]
    place, rows = row_words(fact.problem, row), fact.shown_rows()
    if not row.path:
        differences = " and ".join(fact.words(abs(fact.read[n]), n, doubt=True) for n in rows)
        return f"{place} {'agree to' if fact.agrees else 'differ by'} {differences}"
    verb = "has" if row.state < 0 else "loses"
    if min(fact.read[n] for n in rows) < 0:
        verb = "shows"
    said = f"{place} {verb} {' and '.join(fact.words(fact.read[n], n) + fact.at(n) for n in rows)}"
    if fact.agrees:
        return f"{said}, as computed: {' and '.join(fact.words(fact.computed[n], n, doubt=True) for n in rows)}"
    apart = [fact.read[n] - fact.computed[n] for n in rows]
    words = [fact.words(abs(volts), n, doubt=True) for volts, n in zip(apart, rows, strict=True)]
    if min(apart) < 0 < max(apart):
        words = [f"{said_} {_sense(volts)}" for said_, volts in zip(words, apart, strict=True)]
        return f"{said}, {' and '.join(words)} than computed"
    if len(rows) > 1:
        return f"{said}, {' and '.join(words)} {_sense(apart[0])} than computed"
    return f"{said} against {fact.words(fact.computed[rows[0]], rows[0])} computed, {words[0]} {_sense(apart[0])}"


def against_words(fact: Fact) -> str:
    """The same with what the cause in hand would make of it; empty where that is no other."""
    if fact.expected is None:
        return group_words(fact)
    expected = fact.expected
    rows = [n for n in fact.shown_rows() if fact.words(expected[n], n) != fact.words(fact.read[n], n)]
    would = " and ".join(fact.words(expected[n], n) + fact.at(n) for n in rows)
    return f"{group_words(fact)}; this cause would make it {would}" if rows else ""


def line_words(fact: Fact) -> str:
    """
    Readings of three rounds or more as a straight line over the current, beside the computed resistance: ``through 3
    rounds run 1 loses 0.50 ± 0.01 V and 41.2 ± 0.3 mΩ times its current, 40.1 mΩ computed``; empty of fewer.
    """
    row, amps = fact.problem.signature.rows[fact.rows[0]], [_amps(fact.problem, n) or 0.0 for n in fact.rows]
    if row.state < 0 or len({round(a, 9) for a in amps}) < LINE:
        return ""
    line = fit(amps, [float(fact.read[n]) for n in fact.rows])
    most = max(range(len(amps)), key=lambda n: abs(amps[n]))
    computed = show(float(fact.computed[fact.rows[most]]) / amps[most], "ohm", digits=3)
    offset, slope = show(line.intercept, "V", line.intercept_u), show(line.slope, "ohm", line.slope_u)
    name = row_words(fact.problem, row)
    return f"through {len(amps)} rounds {name} loses {offset} and {slope} times its current, {computed} computed"


def row_words(problem: Problem, row: Row) -> str:
    """
    The stretch that a row is about: ``run 2``, ``from way to p3``, ``run 2 end positive``, ``positive leg of run 2``.
    """
    observations = [problem.observations[number] for number, _ in row.shown]
    if not row.path:
        return f"two meters at {observations[0].at}"
    if len(row.path) == 1:
        name = problem.names[row.path[0][0]]
    else:
        start, end = observations[0].at, observations[0].to or observations[-1].at
        name = f"the way from {start} to {end}"
    if row.part in TERMINATIONS:
        return f"{name} {row.part}"
    return f"the {row.part} leg of {name}" if row.part in LEGS else name


def conductor_words(ratios: Sequence[float], factor: float, what: str) -> str:
    """
    Over their computed resistance, what the conductors of the stretches show that were read, beside a cause.

    >>> conductor_words([1.582, 1.634], 1.59, "one size smaller")
    'the conductors show 1.58 to 1.63 times the computed resistance; one size smaller makes 1.59'
    """
    low, high = f"{min(ratios):.2f}", f"{max(ratios):.2f}"
    times = low if low == high else f"{low} to {high}"
    return f"the conductors show {times} times the computed resistance; {what} makes {factor:.2f}"


def _amps(problem: Problem, number: int) -> float | None:
    """Current of a row; ``None`` in a dead test."""
    row = problem.signature.rows[number]
    if row.state < 0 or not row.path:
        return None
    return problem.amps[problem.signature.slots.index((row.state, row.path[-1][0]))]


def _sense(volts: float) -> str:
    return "more" if volts > 0 else "less"
