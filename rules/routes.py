"""
Ways between two points of a circuit, and what flows beside it in the returns that its runs share.

A circuit is a tree from ``way``; a run that ends where another has arrived, or on a board that something else feeds,
closes a mesh. In a mesh no share of the loads says what a run carries: only a clamp on it does.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass

from rules.calc.doubt import Weighted
from rules.diagnosis.budget import Current
from rules.errors import MissingData
from rules.record import Run
from rules.runs import RunFigures


def together(currents: Sequence[Current]) -> Current:
    """What several currents make in one conductor."""
    terms = tuple(term for current in currents for term in current.terms)
    return Current(terms, tuple(share for current in currents for share in current.shares))


def along(current: Current, sign: float) -> Current:
    """A current as it counts along a way: against the run, turned."""
    if sign > 0:
        return current
    terms = tuple(Weighted(sign * term.weight, term.shown) for term in current.terms)
    return Current(terms, tuple((tap, sign * u) for tap, u in current.shares))


@dataclass(frozen=True, slots=True)
class Shared:
    """The return that a run shares with runs of other circuits."""

    figures: RunFigures
    others: Callable[[str], tuple[Current, ...]]
    """What the other runs carry in a round, by its name; raises ``MissingData`` where one was not read."""


@dataclass(frozen=True, slots=True)
class Hop:
    """One branch of a way: the point at which it arrives, or ``run N`` of a run that closes a mesh."""

    branch: str
    sign: float = 1.0
    """-1 where the way leads against the run."""


def first_ends(runs: Sequence[Run], end_of: Callable[[Run], str]) -> dict[str, Run]:
    """The run that arrives at each point; one that closes a mesh stands under its own name, ``run N``."""
    ends: dict[str, Run] = {}
    for run in runs:
        end = end_of(run)
        ends.setdefault(run.name if end in ends or end == "way" else end, run)
    return ends


def tree_path(start: str, end: str, ends: Mapping[str, Run]) -> list[Hop]:
    """
    The branches after ``start`` up to ``end``, walking away from the source.

    Raises
    ------
    MissingData
        If ``end`` does not lie behind ``start``.
    """
    hops: list[Hop] = []
    here = end
    while here != start:
        hops.append(Hop(here))
        if here == "way" and start == "bus":
            break
        run = ends.get(here)
        if run is None or len(hops) > len(ends) + 2:
            raise MissingData(f"no way leads from {start} to {end}")
        here = run.from_point
    return hops[::-1]


def ways(
    start: str, end: str, ends: Mapping[str, Run], meshed: frozenset[str], read: frozenset[str]
) -> Iterator[list[Hop]]:
    """
    The way along the tree, then in a mesh the shortest through runs whose current was read.

    Parameters
    ----------
    start, end : str
        Points.
    ends : mapping
        From ``first_ends``.
    meshed : frozenset of str
        Ids of the runs that are part of a mesh.
    read : frozenset of str
        Branches whose current was read.
    """
    yield tree_path(start, end, ends)
    if not meshed:
        return
    beside: dict[str, list[tuple[str, Hop]]] = {}
    for branch, run in ends.items():
        if run.id in meshed and branch not in read:
            continue
        arrives = run.to_point if branch == run.name else branch
        beside.setdefault(run.from_point, []).append((arrives, Hop(branch)))
        beside.setdefault(arrives, []).append((run.from_point, Hop(branch, -1.0)))
    if start == "bus":
        beside["bus"] = [("way", Hop("way"))]
    came: dict[str, tuple[str, Hop] | None] = {start: None}
    queue = deque([start])
    while queue and end not in came:
        here = queue.popleft()
        for there, hop in beside.get(here, ()):
            if there not in came:
                came[there] = (here, hop)
                queue.append(there)
    hops: list[Hop] = []
    step = came.get(end)
    while step is not None:
        hops.append(step[1])
        step = came[step[0]]
    if hops:
        yield hops[::-1]
