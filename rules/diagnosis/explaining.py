"""
What may be behind an error that circuits share: the neighbours of the best set of habits as explanations.

One habit of the set may be left out, exchanged for another that the readings hardly tell from it, or have such another
beside it; each of these has its posterior.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from itertools import combinations

import numpy as np

from rules.diagnosis.common_error import CommonError, Explanation, Way
from rules.diagnosis.habit_search import Chosen, Search
from rules.diagnosis.habits import UNITS, Habit, order
from rules.diagnosis.pool import Pool
from rules.diagnosis.pool_fit import summed_at
from rules.diagnosis.shape import Floats
from rules.limits import Limits
from rules.record import Figure

TIED = 0.3
"""How little the readings tell two habits apart from where on both may explain the same."""
PLAUSIBLE = 4.0
"""Natural logarithms below the best single explanation within which two of them are looked at together."""
NEGLIGIBLE = 1e-4
"""Probability of a set below which its sizes are not carried."""


def explained(
    search: Search, chosen: Chosen, number: int, counts: Mapping[Habit, int], limits: Limits
) -> tuple[CommonError, tuple[Way, ...]]:
    """
    The error that one habit of the best set stands for, and the sets that may be behind it as a mixture.

    Parameters
    ----------
    counts : mapping
        How many circuits share each habit.
    """
    pool, without = search.pool, chosen - {number}
    sets = [without, *_alike(search, chosen, number)]
    score = np.array([search.log_posterior(near) for near in sets])
    weight = np.exp(score - score.max())
    weight /= weight.sum()
    added = [near - without for near in sets]
    ways = [Way(share, search.fit(near)) for near, share in zip(sets, weight.tolist(), strict=True)]
    sound = search.fit(chosen).sound
    alone, involved, several = _shares(added, ways, _per_unit(pool, sound), limits["habit.least_relative"])
    explanations = [
        Explanation(
            habit := pool.habits[one],
            alone[one],
            involved[one],
            Figure(float(way.fit.size[one]), UNITS[habit.kind], float(way.fit.covariance[one, one]) ** 0.5),
            float(pool.within[one]),
        )
        for way, more in zip(ways, added, strict=True)
        if len(more) == 1
        for one in more
    ]
    explanations.sort(key=lambda one: (-one.probability, order(one.habit)))
    error = CommonError(
        circuits=counts[explanations[0].habit],
        relative=_mixed(_direction(pool, number, list(alone), sound), ways),
        explanations=tuple(explanations),
        several=several,
        none=ways[0].weight,
    )
    return error, tuple(_kept(ways))


def _alike(search: Search, chosen: Chosen, number: int) -> list[Chosen]:
    """
    Sets that explain by a habit what the best one explains by its own.

    The best one, with another in that place, and with two of those that are plausible there.
    """
    tied, without = search.tied(chosen, number), chosen - {number}
    near = [chosen, *search.with_one_more(without), *search.with_one_more(chosen)]
    found = [one for one in dict.fromkeys(near) if all(tied[n] >= TIED for n in one - without)]
    singly = [one for one in found if len(one) == len(chosen)]
    best = max(search.log_posterior(one) for one in singly)
    plausible = [one for one in singly if search.log_posterior(one) > best - PLAUSIBLE]
    for first, second in combinations(plausible, 2):
        search.fit(first | second, search.fit(first).size)
        found.append(first | second)
    return list(dict.fromkeys(found))


def _shares(
    added: Sequence[Chosen], ways: Sequence[Way], per_unit: Floats, least: float
) -> tuple[dict[int, float], dict[int, float], float]:
    """
    Probability of each habit as the one, and as one of those that err; probability of more than one.

    Of two habits that err together one may be too small to matter: the other then counts as the one.
    """
    alone = dict.fromkeys(sorted(set().union(*added)), 0.0)
    involved, several = dict(alone), 0.0
    for way, more in zip(ways, added, strict=True):
        moved = {one: abs(float(way.fit.size[one] * per_unit[one])) for one in sorted(more)}
        counted = [one for one in moved if moved[one] >= least] or sorted(moved, key=lambda one: -moved[one])[:1]
        for one in counted:
            involved[one] += way.weight
        if len(counted) == 1:
            alone[counted[0]] += way.weight
        elif counted:
            several += way.weight
    # shares that sum to one may pass it in the last digit
    return {one: min(p, 1.0) for one, p in alone.items()}, {one: min(p, 1.0) for one, p in involved.items()}, several


def _kept(ways: Sequence[Way]) -> list[Way]:
    """Ways that are probable enough to be carried, their weights summing to one."""
    kept = [way for way in ways if way.weight >= NEGLIGIBLE]
    total = sum(way.weight for way in kept)
    return [Way(way.weight / total, way.fit) for way in kept]


def _per_unit(pool: Pool, sound: Floats) -> Floats:
    """(E,): what one unit of each habit adds to the computed drops of the circuits that share it, on average."""
    weight = np.broadcast_to((pool.weight * sound)[:, None], pool.index.shape)
    count = len(pool.habits) + 1
    total = summed_at(pool.index, weight, count)
    relative: Floats = summed_at(pool.index, weight * pool.relative, count) / np.maximum(total, 1e-300)
    return relative[:-1]


def _direction(pool: Pool, number: int, habits: Sequence[int], sound: Floats) -> Floats:
    """(E,): what one unit of some habits adds to the computed drops of the circuits that share one of them, on average."""
    here = (pool.index == number).any(axis=1)
    weight = np.where(here, pool.weight * sound, 0.0)
    moved = np.where(np.isin(pool.index, habits), pool.relative, 0.0) * weight[:, None]
    direction: Floats = summed_at(pool.index, moved, len(pool.habits) + 1)[:-1] / max(float(weight.sum()), 1e-300)
    return direction


def _mixed(direction: Floats, ways: Sequence[Way]) -> Figure:
    """Mean and standard uncertainty of a sum of sizes over a mixture."""
    weight = np.array([way.weight for way in ways])
    mean = np.array([float(direction @ way.fit.size) for way in ways])
    variance = np.array([float(direction @ way.fit.covariance @ direction) for way in ways])
    middle = float(weight @ mean)
    return Figure(middle, "1", float(weight @ (variance + (mean - middle) ** 2)) ** 0.5)
