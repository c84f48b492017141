"""Which habits err: the search and its explanations against every set of habits there is."""

from __future__ import annotations

import math
from collections import Counter, defaultdict
from dataclasses import replace
from itertools import combinations

import numpy as np
import pytest

from rules import limits
from rules.diagnosis.common_error import Taught, Way
from rules.diagnosis.explaining import explained
from rules.diagnosis.habit_search import Chosen, Search
from rules.diagnosis.habits import Habit, expected
from rules.diagnosis.pool import Pool
from rules.diagnosis.pool_fit import Fit, fitted
from rules.record import Site

GENERAL = limits.of(Site(name="x"))
V, C, PACED, DRAWING, CABLE = (
    Habit("voltage", "V1", "1"),
    Habit("current", "C1", "1"),
    Habit("length", "paced"),
    Habit("length", "drawing"),
    Habit("cable", "4 mm2"),
)
HABITS = (V, C, PACED, DRAWING, CABLE)


def pool_of(
    seed: int, loads: list[list[int]], size: list[float], circuits: int = 60, sd: float = 0.05, faulty: float = 0.15
) -> Pool:
    """Circuits that each read the sum of their habits' sizes with a noise; some read anything."""
    rng = np.random.default_rng(seed)
    most = max(len(load) for load in loads)
    index = np.full((circuits, most), len(HABITS))
    pull, curve, recorded = np.zeros((circuits, most)), np.zeros((circuits, most, most)), np.zeros(circuits)
    for number in range(circuits):
        load = loads[number % len(loads)]
        used = len(load)
        index[number, :used] = load
        read = rng.normal(sum(size[n] for n in load), sd) if rng.random() > faulty else rng.uniform(0.3, 1.5)
        pull[number, :used], curve[number, :used, :used] = read / sd**2, 1 / sd**2
        recorded[number] = math.log(0.8) - 0.5 * (read / sd) ** 2 - math.log(sd * math.sqrt(2 * math.pi))
    return Pool(
        habits=HABITS,
        within=np.array([0.003, 0.012, 0.0, 0.0, 0.0]),
        index=index,
        pull=pull,
        curve=curve,
        recorded=recorded,
        otherwise=np.full(circuits, math.log(0.1)),
        relative=np.where(index < len(HABITS), 1.0, 0.0),
        weight=np.full(circuits, 1 / sd**2),
    )


def everything(pool: Pool) -> dict[Chosen, float]:
    """Probability of every set of habits."""
    priors = [expected(habit, GENERAL) for habit in HABITS]
    score = {}
    for count in range(len(HABITS) + 1):
        for some in combinations(range(len(HABITS)), count):
            variance = pool.within**2
            variance[list(some)] += [priors[n].spread ** 2 for n in some]
            odds = sum(math.log(priors[n].probability / (1 - priors[n].probability)) for n in some)
            score[frozenset(some)] = fitted(pool, variance, np.zeros(len(HABITS))).log_evidence + odds
    best = max(score.values())
    total = sum(math.exp(value - best) for value in score.values())
    return {some: math.exp(value - best) / total for some, value in score.items()}


CROSSED = [[0, 1, 2, 4], [0, 1, 3], [1, 2, 4], [0, 2], [3], [0, 3, 4]]
TOGETHER = [[0, 1, 2]]


@pytest.mark.parametrize(
    ("loads", "size"),
    [
        (CROSSED, [0.0, 0.0, 0.0, 0.0, 0.0]),
        (CROSSED, [0.07, 0.0, 0.0, 0.0, 0.0]),
        (CROSSED, [0.0, -0.09, 0.0, 0.0, 0.0]),
        (CROSSED, [0.0, 0.0, 0.15, 0.0, 0.0]),
        (CROSSED, [0.08, 0.0, 0.0, -0.12, 0.0]),
        (TOGETHER, [0.08, 0.0, 0.0, 0.0, 0.0]),
    ],
)
@pytest.mark.parametrize("seed", [1, 2])
def test_the_search_finds_the_most_probable_of_all_sets(seed: int, loads: list[list[int]], size: list[float]) -> None:
    pool = pool_of(seed, loads, size)
    exact = everything(pool)
    assert Search(pool, GENERAL).best() == max(exact, key=lambda some: exact[some])


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_habits_that_always_come_together_share_the_probability(seed: int) -> None:
    """One meter, one clamp, all paced: prior odds, how far each may go, and nothing else."""
    pool = pool_of(seed, TOGETHER, [0.08, 0.0, 0.0, 0.0, 0.0], sd=0.03)
    matters = replace(GENERAL.groups["habit"], values={**GENERAL.groups["habit"].values, "least_relative": 0.0})
    everyone = replace(GENERAL, groups={**GENERAL.groups, "habit": matters})
    search = Search(pool, GENERAL)
    chosen = search.best()
    (number,) = chosen
    error, ways = explained(search, chosen, number, Counter(dict.fromkeys(HABITS[:3], 60)), everyone)
    exact: dict[Chosen, float] = defaultdict(float)
    for some, probability in everything(pool).items():
        exact[some & {0, 1, 2}] += probability  # no circuit has the other two
    said = {one.habit: one for one in error.explanations}
    assert set(said) == {V, C, PACED}
    for n, habit in enumerate(HABITS[:3]):
        assert said[habit].probability == pytest.approx(exact[frozenset({n})], abs=0.02)
    assert error.none == pytest.approx(exact[frozenset()], abs=0.01)
    assert max(one.probability for one in error.explanations) < 0.8
    assert sum(one.probability for one in error.explanations) + error.several + error.none == pytest.approx(1.0)
    assert sum(way.weight for way in ways) == pytest.approx(1.0)
    assert error.relative.value == pytest.approx(0.08, abs=0.03)
    assert error.circuits == 60


def test_two_independent_errors_are_two() -> None:
    pool = pool_of(1, CROSSED, [0.08, 0.0, 0.0, -0.12, 0.0], circuits=120)
    search = Search(pool, GENERAL)
    chosen = search.best()
    assert chosen == {0, 3}
    found = [explained(search, chosen, n, Counter(dict.fromkeys(HABITS, 60)), GENERAL)[0] for n in sorted(chosen)]
    assert [error.explanations[0].habit for error in found] == [V, DRAWING]
    assert found[0].relative.value == pytest.approx(0.08, abs=0.02)
    assert found[1].relative.value == pytest.approx(-0.12, abs=0.02)


def test_of_two_that_err_one_may_be_too_small_to_matter() -> None:
    """A great many circuits show 1 % beside 8 %: the 8 % are the one."""
    pool = pool_of(1, CROSSED, [0.08, 0.0, 0.01, 0.0, 0.0], circuits=1500)
    search = Search(pool, GENERAL)
    chosen = search.best()
    assert 0 in chosen
    error, _ = explained(search, chosen, 0, Counter(dict.fromkeys(HABITS, 60)), GENERAL)
    assert error.explanations[0].habit == V
    assert error.explanations[0].probability > 0.95


def test_a_habit_without_spread_never_errs() -> None:
    group = replace(GENERAL.groups["habit"], values={**GENERAL.groups["habit"].values, "voltage_relative": 0.0})
    still = replace(GENERAL, groups={**GENERAL.groups, "habit": group})
    pool = pool_of(1, [[0], [3]], [0.08, 0.0, 0.0, 0.0, 0.0])
    assert Search(pool, GENERAL).best() == {0}
    assert Search(pool, still).best() == frozenset()


def test_a_circuit_is_told_what_the_others_say() -> None:
    """Against a pool without it; none has a fault, so that leaving one out changes no other."""
    drawn = pool_of(3, [[0, 1]], [0.08, 0.0, 0.0, 0.0, 0.0], circuits=8, faulty=0.0)
    pool = replace(drawn, otherwise=np.full(len(drawn), -1e3))
    taught = Taught(pool=pool, members={}, best=Search(pool, GENERAL).fit(frozenset({0})))
    for member in range(len(pool)):
        rest = np.arange(len(pool)) != member
        arrays = ("index", "pull", "curve", "recorded", "otherwise", "relative", "weight")
        without = replace(pool, **{name: getattr(pool, name)[rest] for name in arrays})
        fit = Search(without, GENERAL).fit(frozenset({0}))
        mean, covariance = taught.of_others(member, (0, 1))
        np.testing.assert_allclose(mean, fit.size[:2], atol=1e-6)
        np.testing.assert_allclose(covariance, fit.covariance[:2, :2], rtol=1e-5)


def test_two_explanations_make_a_mixture() -> None:
    """Either one is 6 % and the other nothing: each by half, their sum as sharp as before."""
    pool = pool_of(1, TOGETHER, [0.0] * 5)
    zero = np.zeros((5, 5))
    ways = tuple(Way(0.5, Fit(np.eye(5)[n] * 0.06, zero, 0.0, np.zeros(len(pool)), zero)) for n in (0, 1))
    taught = Taught(pool=pool, best=ways[0].fit, ways=(ways,))
    mean, covariance = taught.of_all((0, 1))
    assert mean == pytest.approx([0.03, 0.03])
    assert covariance == pytest.approx(np.array([[9e-4, -9e-4], [-9e-4, 9e-4]]))
    assert np.ones(2) @ covariance @ np.ones(2) == pytest.approx(0.0, abs=1e-12)
