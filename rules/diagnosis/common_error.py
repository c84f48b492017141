"""
Common errors that a site has taught, and what each circuit makes of them.

A circuit is judged with what the others say: its own readings are taken out of what it is told. The errors of
its meters and habits stay tied, since often only their sum is known.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property

import numpy as np

from rules.diagnosis.carry import with_common
from rules.diagnosis.habits import Habit, Tie
from rules.diagnosis.pool import Pool
from rules.diagnosis.pool_fit import Fit
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import Floats
from rules.record import Figure

TOLD = 0.01
"""Probability of an explanation from which its circuits carry it."""


@dataclass(frozen=True, slots=True)
class Explanation:
    """One habit that may be behind a common error."""

    habit: Habit
    probability: float
    """That it is the one."""
    involved: float
    """That it errs, alone or with another."""
    size: Figure
    """If it is the one; in the sense of ``Habit``."""
    specified_u: float
    """Standard uncertainty of a meter's gain by its specification; 0 of what has none."""


@dataclass(frozen=True, slots=True)
class CommonError:
    """An error that circuits share."""

    circuits: int
    """That share the most probable habit."""
    relative: Figure
    """What it adds to their computed drops, on average."""
    explanations: tuple[Explanation, ...]
    """Most probable first."""
    several: float
    """Probability that more than one of them errs."""
    none: float
    """Probability that none does."""


@dataclass(frozen=True, slots=True, eq=False)
class Way:
    """One set of habits that may be behind a common error, fitted, as a part of a mixture."""

    weight: float
    fit: Fit


@dataclass(frozen=True, eq=False)
class Taught:
    """What a site has taught; nothing, as it stands."""

    errors: tuple[CommonError, ...] = ()
    """That of the most circuits first."""
    pool: Pool | None = None
    members: Mapping[str, int] = field(default_factory=dict)
    """Place in the pool by circuit id."""
    best: Fit | None = None
    """The best set."""
    ways: tuple[tuple[Way, ...], ...] = ()
    """For each common error the sets that may be behind it; their weights sum to one."""

    @cached_property
    def touched(self) -> frozenset[Habit]:
        """Habits whose circuits carry what was learned."""
        explanations = (explanation for error in self.errors for explanation in error.explanations)
        return frozenset(one.habit for one in explanations if one.involved >= TOLD)

    def touches(self, ties: Sequence[Tie]) -> bool:
        """Whether anything that was learned is about a circuit with these ties."""
        return not self.touched.isdisjoint(tie.habit for tie in ties)

    def told(self, circuit_id: str, problem: Problem, ties: Sequence[Tie]) -> Problem:
        """A circuit's problem with what the other circuits teach; as it is where they teach nothing about it."""
        if not self.touches(ties):
            return problem
        known = [tie for tie in ties if tie.habit in self._place]
        numbers = tuple(sorted({self._place[tie.habit] for tie in known}))
        member = self.members.get(circuit_id)
        if member is None:
            mean, covariance = self.of_all(numbers)
        else:
            mean, covariance = self.of_others(member, numbers)
        slot = {number: place for place, number in enumerate(numbers)}
        return with_common(problem, known, [slot[self._place[tie.habit]] for tie in known], mean, covariance)

    @cached_property
    def _place(self) -> dict[Habit, int]:
        return {habit: number for number, habit in enumerate(self.pool.habits)} if self.pool is not None else {}

    @cached_property
    def _known(self) -> dict[tuple[int, ...], tuple[Floats, Floats]]:
        """What was asked before: many circuits share the same habits."""
        return {}

    @cached_property
    def _fits(self) -> tuple[Floats, Floats, Floats]:
        """Sizes (w, E), covariances (w, E, E) and probabilities as recorded (w, m): the best set, then all ways."""
        fits = [*((self.best,) if self.best else ()), *(way.fit for of_error in self.ways for way in of_error)]
        return (
            np.stack([fit.size for fit in fits]),
            np.stack([fit.covariance for fit in fits]),
            np.stack([fit.sound for fit in fits]),
        )

    def of_all(self, numbers: tuple[int, ...]) -> tuple[Floats, Floats]:
        """Mean (k,) and covariance (k, k) of some of the pool's habits by all circuits."""
        if numbers not in self._known:
            size, covariance, _ = self._fits
            some = np.array(numbers)
            self._known[numbers] = self._mixed(size[:, some], covariance[:, some[:, None], some])
        return self._known[numbers]

    def of_others(self, member: int, numbers: tuple[int, ...]) -> tuple[Floats, Floats]:
        """The same by all circuits but one of the pool."""
        size, covariance, sound = self._fits
        pool = self.pool
        assert pool is not None
        own = pool.index[member][pool.index[member] < len(pool.habits)]
        some = np.array([*numbers, *(number for number in own.tolist() if number not in numbers)])
        size, covariance = size[:, some], covariance[:, some[:, None], some]
        place, count = np.array([some.tolist().index(number) for number in own.tolist()]), len(own)
        curve, pull = np.zeros_like(covariance), np.zeros_like(size)
        curve[:, place[:, None], place] = sound[:, member, None, None] * pool.curve[member, :count, :count]
        pull[:, place] = sound[:, member, None] * pool.pull[member, :count]
        # natural parameters less the circuit's own, without an inverse of the covariance
        kept = np.eye(len(some)) - covariance @ curve
        moved = size[..., None] - covariance @ pull[..., None]
        solved = np.linalg.solve(kept, np.concatenate([covariance, moved], axis=-1))
        few = len(numbers)
        return self._mixed(solved[:, :few, -1], solved[:, :few, :few])

    def _mixed(self, size: Floats, covariance: Floats) -> tuple[Floats, Floats]:
        """
        Mean and covariance of some sizes over all explanations, given each way's (w, k) and (w, k, k).

        What each common error's ways say beyond the best set adds up: several errors are taken as independent.
        """
        mean, spread = size[0].copy(), covariance[0].copy()
        first = 1
        for of_error in self.ways:
            part = slice(first, first + len(of_error))
            weight = np.array([way.weight for way in of_error])
            middle = weight @ size[part]
            apart = size[part] - middle
            mean += middle - size[0]
            spread += np.tensordot(weight, covariance[part], 1) - covariance[0] + (apart.T * weight) @ apart
            first += len(of_error)
        return mean, spread
