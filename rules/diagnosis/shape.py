"""
The arrays that circuits of equal structure share: which element enters which row, and which doubt touches it.

An *element* is a resistance that the readings can tell from others: the conductors of one leg of a run, or
of both; a termination, or several that no reading separates; a pole of the device. All arrays here are
made once for a ``Signature``.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from rules.diagnosis.problem import DEAD, ENDS, LEGS, TERMINATIONS, Signature

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

LONG = 48
"""Branches from which sums over them are taken one by one rather than as a product of matrices."""
DEVICE_UNITS = 1.0
"""How often a bad connection is expected in the device, beside one for each end of a run."""


@dataclass(frozen=True, slots=True)
class Place:
    """Where a bad connection may be, as far as the readings separate it."""

    branch: int
    members: tuple[str, ...]
    """Terminations of a run, or poles of a device."""
    whole: bool
    """It is all of the run or device: no reading separates its ends and legs."""
    share: float
    """Of all places, before anything is read."""


@dataclass(frozen=True, slots=True, eq=False)
class Shape:
    """Structure of a group of problems as arrays: n rows, O observations, S sources, B branches, E elements."""

    signature: Signature
    difference: Floats
    """(n, O): a row as a sum of observations."""
    coefficient: Floats
    """(n, E): how often an element lies on a row's path, with its sense."""
    element_branch: Integers
    """(E,)"""
    conductors: slice
    terminations: slice
    poles: slice
    """Where the three kinds of elements stand."""
    conductor_of: Floats
    """(E of conductors, 2 B): sums of branch legs, positive before negative."""
    termination_of: Floats
    """(E of terminations, 2 B): how many of a branch leg's terminations it holds."""
    pole_of: Floats
    """(E of poles, 2 B)"""
    run_of: Floats
    """(B, E of conductors): the branch that a conductor belongs to."""
    row_state: Integers
    """(n,); the last state is that of dead tests."""
    reached: NDArray[np.bool_]
    """(B,): branches that a row's path holds."""
    gain_rows: Floats
    """(gains, n): 1 where all observations of a row share this gain."""
    gain_parts: Floats | None
    """(gains, n, O): of rows whose observations have several gains, the sum under each; ``None`` without such rows."""
    slot_state: Integers
    slot_branch: Integers
    error_slot: Integers
    error_source: Integers
    places: tuple[Place, ...]
    place_element: Integers
    """(places,): the element that each stands in."""
    offsets: tuple[tuple[tuple[int, str], ...], ...]
    """Where a semiconductor may be, as far as the readings separate it: branches with a leg."""
    offset_rows: Floats
    """(offsets, n): with its sense, where the current is positive."""
    offset_slot: Integers
    """(offsets, n): the slot whose current gives the sense; -1 where it does not enter."""
    moved_rows: Integers
    """(places and offsets, m): the rows that each moves, before others where it moves fewer than the most."""
    moving_columns: Integers
    """(places and offsets, q): the gains and sources through which each moves them, before others as above."""
    read: Integers
    """Observations that a row uses."""

    @property
    def rows(self) -> int:
        return len(self.signature.rows)

    def offset_branch(self, number: int) -> int:
        """The branch at whose start a semiconductor is taken to be; the last of those that are not told apart."""
        return self.offsets[number][-1][0]


@lru_cache(maxsize=4096)
def shape_of(signature: Signature) -> Shape:
    """The arrays of a structure."""
    rows = signature.rows
    branches = len(signature.branches)
    reached = np.zeros(branches, dtype=bool)
    for row in rows:
        reached[[branch for branch, _ in row.path]] = True
    # a device that lies between no readings is no place of this diagnosis
    looked_at = [kind == "run" or bool(reached[branch]) for branch, kind in enumerate(signature.branches)]
    groups, coefficient = _elements(signature)
    element_branch = np.array([branch for branch, _, _ in groups], dtype=np.int64)
    kinds = [kind for _, kind, _ in groups]
    difference = np.zeros((len(rows), len(signature.gain_of)))
    for number, row in enumerate(rows):
        for observation, sign in row.shown:
            difference[number, observation] += sign
    bounds = [sum(kind == name for kind in kinds) for name in ("conductor", "termination", "pole")]
    edges = np.cumsum([0, *bounds])
    of = [np.zeros((count, 2 * branches)) for count in bounds]
    for number, (branch, kind, members) in enumerate(groups):
        which = ("conductor", "termination", "pole").index(kind)
        for member in members:
            of[which][number - edges[which], 2 * branch + LEGS.index(member.split()[-1])] += 1
    row_state = np.array([signature.states if row.state == DEAD else row.state for row in rows], dtype=np.int64)
    gain_rows, gain_parts = _gains(signature, difference)
    places = _places(signature, groups, looked_at)
    offsets, offset_rows, offset_slot = _offsets(signature, looked_at)
    place_element = np.array([element for element, _ in places], dtype=np.int64)
    moved_rows, moving_columns = _moved(signature, coefficient[:, place_element].T, offset_rows, places, gain_rows)
    conductors = slice(0, edges[1])
    return Shape(
        signature=signature,
        difference=difference,
        coefficient=coefficient,
        element_branch=element_branch,
        conductors=conductors,
        terminations=slice(edges[1], edges[2]),
        poles=slice(edges[2], edges[3]),
        conductor_of=of[0],
        termination_of=of[1],
        pole_of=of[2],
        run_of=(np.arange(branches)[:, None] == element_branch[conductors]).astype(float),
        row_state=row_state,
        reached=reached,
        gain_rows=gain_rows,
        gain_parts=gain_parts,
        slot_state=np.array([state for state, _ in signature.slots], dtype=np.int64),
        slot_branch=np.array([branch for _, branch in signature.slots], dtype=np.int64),
        error_slot=np.array([slot for slot, _ in signature.errors], dtype=np.int64),
        error_source=np.array([source for _, source in signature.errors], dtype=np.int64),
        places=tuple(place for _, place in places),
        place_element=place_element,
        offsets=offsets,
        offset_rows=offset_rows,
        offset_slot=offset_slot,
        moved_rows=moved_rows,
        moving_columns=moving_columns,
        read=np.flatnonzero(np.any(difference != 0, axis=0)),
    )


Element = tuple[int, str, tuple[str, ...]]
"""Branch, kind (conductor, termination, pole) and members."""


def _enters(part: str, kind: str, member: str) -> bool:
    """Whether a row of some part sees a member of the branches on its path."""
    if part in TERMINATIONS:
        return kind == "termination" and member == part
    return part in ("both", member.split()[-1])


def _elements(signature: Signature) -> tuple[list[Element], Floats]:
    """
    All elements, conductors first; members that enter every row alike are one element.

    Returns
    -------
    list of Element
    array (n, E)
        How often each lies on a row's path, with its sense.
    """
    passed: list[dict[str, list[tuple[int, int]]]] = [{} for _ in signature.branches]
    for number, row in enumerate(signature.rows):
        senses: dict[int, int] = {}
        for branch, sign in row.path:
            senses[branch] = senses.get(branch, 0) + sign
        for branch, sense in senses.items():
            if sense:
                passed[branch].setdefault(row.part, []).append((number, sense))
    found: dict[str, dict[Element, list[tuple[int, int]]]] = {"conductor": {}, "termination": {}, "pole": {}}
    for branch, kind in enumerate(signature.branches):
        if kind == "run":
            kinds = [("conductor", LEGS), ("termination", TERMINATIONS)]
        else:
            legs = kind.partition(" ")[2]
            kinds = [("pole", LEGS if legs == "both" else (legs,))]
        for name, members in kinds:
            alike: dict[tuple[str, ...], list[str]] = {}
            for member in members:
                alike.setdefault(tuple(p for p in passed[branch] if _enters(p, name, member)), []).append(member)
            for parts, group in alike.items():
                found[name][branch, name, tuple(group)] = [entry for part in parts for entry in passed[branch][part]]
    groups = {element: column for elements in found.values() for element, column in elements.items()}
    coefficient = np.zeros((len(signature.rows), len(groups)))
    for number, column in enumerate(groups.values()):
        if column:
            seeing, sense_of = zip(*column, strict=True)
            coefficient[seeing, number] = sense_of
    return list(groups), coefficient


def _places(signature: Signature, groups: Sequence[Element], looked_at: Sequence[bool]) -> list[tuple[int, Place]]:
    """Places of a bad connection with the element that each stands in."""
    kinds = [kind for kind, counts in zip(signature.branches, looked_at, strict=True) if counts]
    units = sum(2.0 if kind == "run" else DEVICE_UNITS for kind in kinds)
    places = []
    for number, (branch, kind, members) in enumerate(groups):
        if kind == "conductor" or not looked_at[branch]:
            continue
        poles = sum(len(other) for b, k, other in groups if (b, k) == (branch, kind))
        of_branch = 2.0 if kind == "termination" else DEVICE_UNITS
        share = of_branch * len(members) / poles / units
        places.append((number, Place(branch, members, len(members) == poles, share)))
    return sorted(places, key=lambda entry: (entry[1].branch, entry[0]))


def _gains(signature: Signature, difference: Floats) -> tuple[Floats, Floats | None]:
    """Rows under one gain, and the sums of rows under several."""
    rows, observations = difference.shape
    one = np.zeros((signature.gains, rows))
    several = np.zeros((signature.gains, rows, observations))
    for number, row in enumerate(signature.rows):
        gains = {signature.gain_of[observation] for observation, _ in row.shown}
        if len(gains) == 1:
            one[gains.pop(), number] = 1.0
            continue
        for observation, sign in row.shown:
            several[signature.gain_of[observation], number, observation] += sign
    return one, several if several.any() else None


def _moved(
    signature: Signature, of_places: Floats, of_offsets: Floats, places: Sequence[tuple[int, Place]], gain_rows: Floats
) -> tuple[Integers, Integers]:
    """Rows that each place of a bad connection, then of a semiconductor, moves, and the columns of shared doubt."""
    seen = np.concatenate([of_places, of_offsets]) != 0
    sources = np.zeros((len(seen), signature.sources), dtype=bool)
    states = np.array([row.state for row in signature.rows], dtype=np.int64)
    of_branch: dict[int, list[int]] = {}
    for number, (_, place) in enumerate(places):
        of_branch.setdefault(place.branch, []).append(number)
    for slot, source in signature.errors:
        state, branch = signature.slots[slot]
        its = of_branch.get(branch, [])
        sources[its, source] |= seen[its][:, states == state].any(axis=1)
    sources[:, signature.sources - signature.common :] = True  # such a column may move any row
    return _first(seen), _first(np.concatenate([seen @ gain_rows.T > 0, sources], axis=1))


def _first(chosen: NDArray[np.bool_]) -> Integers:
    """Of each row where it is true, before others where it is so less often than the most."""
    order = np.argsort(~chosen, axis=1, kind="stable")
    return order[:, : int(chosen.sum(axis=1).max(initial=0))]


def _offsets(
    signature: Signature, looked_at: Sequence[bool]
) -> tuple[tuple[tuple[tuple[int, str], ...], ...], Floats, Integers]:
    """
    Places of a semiconductor: the device, and either leg of the first run.

    A joint or a dead test does not see it: it lies within the cable's path, and an ohmmeter does not open it.
    """
    slot_of = {key: slot for slot, key in enumerate(signature.slots)}
    first = next((b for b, kind in enumerate(signature.branches) if kind == "run"), None)
    candidates: list[tuple[int, str]] = []
    for branch, kind in enumerate(signature.branches):
        legs = kind.partition(" ")[2]
        if branch == first or (kind != "run" and looked_at[branch]):
            candidates += [(branch, leg) for leg in (LEGS if legs in ("", "both") else (legs,))]
    alike: dict[tuple[tuple[float, int], ...], list[tuple[int, str]]] = {}
    for branch, leg in candidates:
        column = []
        for row in signature.rows:
            sense = sum(sign for passed, sign in row.path if passed == branch)
            seen = row.state != DEAD and row.part in ("both", leg)
            entered = float(sense) if seen else 0.0
            column.append((entered, slot_of[row.state, branch] if entered else -1))
        alike.setdefault(tuple(column), []).append((branch, leg))
    shape = (len(alike), len(signature.rows))
    rows = np.array([[entered for entered, _ in column] for column in alike]).reshape(shape)
    slots = np.array([[slot for _, slot in column] for column in alike], dtype=np.int64).reshape(shape)
    return tuple(tuple(members) for members in alike.values()), rows, slots


def of_runs(shape: Shape, per_conductor: Floats) -> Floats:
    """Sums (..., B) over the conductors (..., E of conductors) of each branch."""
    if len(shape.run_of) < LONG:
        return per_conductor @ shape.run_of.T
    branches, first = np.unique(shape.element_branch[shape.conductors], return_index=True)
    sums = np.zeros((*per_conductor.shape[:-1], len(shape.run_of)))
    sums[..., branches] = np.add.reduceat(per_conductor, first, axis=-1)  # they stand branch by branch
    return sums


def place_words(members: Sequence[str]) -> str:
    """
    Some of a run's four terminations in words.

    >>> place_words(("end positive",)), place_words(("start positive", "end positive"))
    ('end positive', 'positive')
    >>> place_words(("start positive", "start negative", "end negative"))
    'start or end negative'
    """
    left = list(members)
    words: list[str] = []
    for group in (*ENDS, *LEGS):
        inside = [name for name in TERMINATIONS if group in name.split()]
        if all(name in left for name in inside):
            words.append(group)
            left = [name for name in left if name not in inside]
    return " or ".join([*words, *left])
