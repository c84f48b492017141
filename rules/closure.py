"""Sums that must come out: voltages around a circuit, currents at a point. What does not close cannot all be right."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from rules.calc.agreement import probability_apart
from rules.calc.doubt import Shown, Weighted, probability_above, total
from rules.limits import Limits
from rules.record import Figure, Reading, Run
from rules.rounds import Round, Tree
from rules.units import show

Terms = tuple[Weighted, ...]
TWO = "the two voltages"
BY_WAY = "by way of "
"""How two ways of knowing a drop are said."""


@dataclass(frozen=True, slots=True)
class Unclosed:
    """Two sums that should be one."""

    where: str
    first: str
    """What it is made of: ``positive leg and negative leg``."""
    first_sum: Figure
    second: str
    second_sum: Figure
    gap: Figure
    """First less second; its ``u`` holds both doubts with what they share."""

    @property
    def words(self) -> str:
        one, other, gap = self.first_sum, self.second_sum, self.gap
        return (
            f"{self.first}: {show(one.value, one.unit, one.u)}; {self.second}: {show(other.value, other.unit, other.u)}; "
            f"{show(abs(gap.value), gap.unit, gap.u)} apart"
        )

    @property
    def times(self) -> float:
        """The gap in standard uncertainties."""
        return abs(self.gap.value) / self.gap.u if self.gap.u else math.inf


def voltages_around(this: Round, limits: Limits) -> list[Unclosed]:
    """
    Ways from one point to another in a round along which different voltages were lost beyond doubt, the clearest of each
    two points.

    Two voltages, a long lead along both legs, one along each leg, and leads that follow each other.
    """
    found: list[Unclosed] = []
    ways = _drops(this)
    for (start, end), known in ways.items():
        gaps = [
            unclosed
            for n, (first, terms) in enumerate(known)
            for second, others in known[n + 1 :]
            if (unclosed := _compared(f"{start} to {end}", first, terms, second, others, "V", limits)) is not None
        ]
        if gaps:
            found.append(max(gaps, key=lambda gap: gap.times))
    return found


def _drops(this: Round) -> dict[tuple[str, str], list[tuple[str, Terms]]]:
    """Every way in which the drop over both legs between two points is known, a direct one among them."""
    rows: dict[tuple[str, str], dict[str, list[Reading]]] = {}
    for row in this.readings:
        if row.quantity == "drop":
            rows.setdefault((row.at, row.to), {}).setdefault(row.leg or "both", []).append(row)
    legs = {pair: {leg: _mean(alike, this) for leg, alike in of_pair.items()} for pair, of_pair in rows.items()}
    both: dict[tuple[str, str], list[tuple[str, Terms]]] = {}
    for pair, of_pair in legs.items():
        known: list[tuple[str, Terms]] = []
        if "both" in of_pair:
            known.append(("along both legs", of_pair["both"]))
        if "positive" in of_pair and "negative" in of_pair:
            known.append(("positive leg and negative leg", of_pair["positive"] + of_pair["negative"]))
        if known:
            both[pair] = known
    for (start, end), known in both.items():
        if start in this.volts and end in this.volts:
            known.append((TWO, this.volts[start] + _negative(this.volts[end])))
        known += [
            (f"{BY_WAY}{middle}", both[start, middle][0][1] + both[middle, end][0][1])
            for first, middle in both
            if first == start and (middle, end) in both and middle != end
        ]
    return both


def poles_of(readings: Sequence[Reading], shown: Mapping[str, Shown], limits: Limits) -> Iterator[Unclosed]:
    """
    Points at which both poles to earth do not make the voltage between them, beyond doubt.

    Parameters
    ----------
    readings : sequence of Reading
        Of one round.
    shown : mapping
        What each is worth, by its id.
    """
    by_place: dict[str, dict[str, list[Reading]]] = {}
    for row in readings:
        if row.quantity == "voltage":
            by_place.setdefault(row.at, {}).setdefault(row.leg or "both", []).append(row)
    for at, legs in by_place.items():
        if len(legs) == 3:
            mean = {leg: tuple(Weighted(1 / len(rows), shown[row.id]) for row in rows) for leg, rows in legs.items()}
            poles = mean["positive"] + _negative(mean["negative"])
            unclosed = _compared(
                at, "positive less negative to earth", poles, "between the legs", mean["both"], "V", limits
            )
            if unclosed is not None:
                yield unclosed


def currents_at_points(this: Round, tree: Tree, drawn: frozenset[str], limits: Limits) -> list[Unclosed]:
    """
    Points of a circuit where what goes in and what leaves do not add up, beyond doubt and what a load may move meanwhile.

    Where something draws at the point, what leaves by its runs may be less than what arrives, not more. Points of a mesh, and
    of returns that circuits share, are left out: a clamp there sees more than the circuit's own current.

    Parameters
    ----------
    drawn : frozenset of str
        Points at which a load, a board or a converter takes current.
    """
    found = []
    starting: dict[str, dict[str, Run]] = {}
    for end, run in tree.ends.items():
        starting.setdefault(run.from_point, {})[end] = run
    for point, arriving in this.amps.items():
        leaving = starting.get(point, {})
        of_point = [*leaving.values(), *([tree.ends[point]] if point in tree.ends else [])]
        if not leaving or any(run.id in tree.meshed or run.id in tree.shared for run in of_point):
            continue
        read = {end: this.amps[end] for end in leaving if end in this.amps}
        if not read:
            continue
        whole = len(read) == len(leaving) and point not in drawn
        names = [leaving[end].name for end in read]
        unclosed = added_up(
            point,
            f"into {point}",
            {"": arriving},
            f"out of it by {' and '.join(names)}",
            read,
            whole,
            limits,
        )
        if unclosed is not None:
            found.append(unclosed)
    return found


def added_up(
    where: str,
    first: str,
    arriving: Mapping[str, Terms],
    second: str,
    leaving: Mapping[str, Terms],
    whole: bool,
    limits: Limits,
) -> Unclosed | None:
    """
    What arrives against what leaves; ``None`` where they may be one.

    Parameters
    ----------
    arriving, leaving : mapping
        Currents by what carries them.
    whole : bool
        Whether all that leaves is known. Otherwise it is only asked that no more leaves than arrives.
    """
    values = [total(terms)[0] for terms in (*arriving.values(), *leaving.values())]
    moved = limits["closure.load_moves"] * math.sqrt(sum(value**2 for value in values))
    arrived = tuple(term for terms in arriving.values() for term in terms)
    left = tuple(term for terms in leaving.values() for term in terms)
    value, u = total((*arrived, *_negative(left)))
    u = math.hypot(u, moved)
    beyond = limits["decision.beyond_doubt"]
    sure = probability_apart(value, u) if whole else probability_above(-value, 0.0, u)
    if sure < beyond or (not whole and min(values) < 0):
        return None
    return Unclosed(where, first, _figure(arrived, "A"), second, _figure(left, "A"), Figure(value, "A", u))


def _compared(
    where: str, first: str, terms: Terms, second: str, others: Terms, unit: str, limits: Limits
) -> Unclosed | None:
    value, u = total((*terms, *_negative(others)))
    if probability_apart(value, u) < limits["decision.beyond_doubt"]:
        return None
    return Unclosed(where, first, _figure(terms, unit), second, _figure(others, unit), Figure(value, unit, u))


def _figure(terms: Terms, unit: str) -> Figure:
    value, u = total(terms)
    return Figure(value, unit, u)


def _mean(rows: Sequence[Reading], this: Round) -> Terms:
    return tuple(Weighted(1 / len(rows), this.shown[row.id]) for row in rows)


def _negative(terms: Terms) -> Terms:
    return tuple(Weighted(-term.weight, term.shown) for term in terms)
