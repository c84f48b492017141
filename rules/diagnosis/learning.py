"""
The site learns: which common errors its circuits show, what may be behind each, and with what probability.

The best set of habits that err (``habit_search``) and its neighbours are the explanations (``explaining``). What a
circuit makes of them stands in ``common_error``.
"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import astuple, replace

from rules.diagnosis.common_error import CommonError, Taught
from rules.diagnosis.diagnose import Diagnosis, diagnose
from rules.diagnosis.explaining import explained
from rules.diagnosis.habit_search import Search
from rules.diagnosis.habits import Habit, Tie, order, shared
from rules.diagnosis.learned import Learned
from rules.diagnosis.pool import Member, pooled
from rules.diagnosis.problem import Common, Problem
from rules.limits import Limits

ENOUGH = 400
"""Circuits of each habit that are learned from: more would sharpen nothing that matters."""
MOST_HABITS = 256
"""Habits that are looked at, the most shared: the work grows with their cube."""

Posed = Mapping[str, tuple[Problem, tuple[Tie, ...]]]
"""By circuit id: what its readings pose, and its ties."""


def learn(posed: Posed, diagnoses: Mapping[str, Diagnosis], limits: Limits) -> Taught:
    """
    What circuits teach about the habits that they share.

    Parameters
    ----------
    posed : mapping
        By circuit id: what its readings pose, and its ties.
    diagnoses : mapping
        By circuit id: judged as if it shared nothing.

    Returns
    -------
    Taught
        The same for the same circuits in whatever order; nothing where too few share anything, where no common
        error is probable enough, or where it is too small to matter.
    """
    counts = shared((ties for _, ties in posed.values()), limits["habit.least_circuits"])
    most = sorted(counts, key=lambda habit: (-counts[habit], order(habit)))[:MOST_HABITS]
    habits = sorted(most, key=order)
    members = _members(posed, frozenset(habits), diagnoses)
    search = Search(pooled(list(members.values()), habits, limits), limits)
    chosen = search.best()
    while chosen:
        found = [explained(search, chosen, number, counts, limits) for number in sorted(chosen)]
        weakest = min(zip(sorted(chosen), found, strict=True), key=lambda pair: _strength(pair[1][0], limits))
        if _strength(weakest[1][0], limits) > 0:
            return Taught(
                errors=tuple(sorted((error for error, _ in found), key=lambda error: -error.circuits)),
                pool=search.pool,
                members={id_: number for number, id_ in enumerate(members)},
                best=search.fit(chosen),
                ways=tuple(ways for _, ways in found),
            )
        chosen -= {weakest[0]}
    return Taught()


def _strength(error: CommonError, limits: Limits) -> float:
    """Above zero where an error is probable and large enough to be carried."""
    probable = 1 - error.none - limits["habit.learned_at"]
    large = abs(error.relative.value) - limits["habit.least_relative"]
    return min(probable, large)


def _members(posed: Posed, habits: frozenset[Habit], diagnoses: Mapping[str, Diagnosis]) -> dict[str, Member]:
    """Circuits that are learned from, by id: in an order that is the same for any order of the record's rows."""
    taken: Counter[Habit] = Counter()
    members = {}
    for id_ in sorted(posed):
        problem, ties = posed[id_]
        kept = tuple(tie for tie in ties if tie.habit in habits)
        own = {tie.habit for tie in kept}
        if any(taken[habit] < ENOUGH for habit in own):
            taken.update(own)
            members[id_] = Member(problem, kept, diagnoses[id_])
    return members


def diagnose_told(problems: Sequence[Problem], limits: Limits) -> list[Diagnosis]:
    """
    Diagnoses of problems, some of which carry what other circuits teach.

    What the readings support of a run's resistance then holds the common error too, as far as it lies in the run.
    """
    return [
        found if problem.common is None else _with_ohm(found, problem.common)
        for found, problem in zip(diagnose(problems, limits), problems, strict=True)
    ]


def _with_ohm(diagnosis: Diagnosis, common: Common) -> Diagnosis:
    branches = []
    for figures, more in zip(diagnosis.figures, common.lasting, strict=True):
        learned = Learned(*figures)
        factor, u = learned.factor * (1 + more.value), math.hypot(learned.factor_u, more.u or 0.0)
        branches.append(astuple(replace(learned, factor=factor, factor_u=u)))
    return replace(diagnosis, figures=tuple(branches))
