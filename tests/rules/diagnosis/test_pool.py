"""What circuits say of their habits: against densities computed at shifted sizes, and fits against scipy."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import integrate, optimize

from rules.case import CircuitCase
from rules.diagnosis.block import model_of, stacked
from rules.diagnosis.diagnose import diagnose
from rules.diagnosis.gaussian import log_density
from rules.diagnosis.habits import CURRENT, VOLTAGE, ZERO, Habit
from rules.diagnosis.hypotheses import AS_RECORDED
from rules.diagnosis.pool import Member, Pool, pooled
from rules.diagnosis.pool_fit import fitted, scanned
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import shape_of
from rules.measured import ties_by

Floats = NDArray[np.float64]
Draw = Callable[[int, int], tuple[CircuitCase, ...]]
ProblemFrom = Callable[[CircuitCase], Problem]


def members_of(cases: tuple[CircuitCase, ...], problem_from: ProblemFrom) -> list[Member]:
    problems = [problem_from(case) for case in cases]
    found = diagnose(problems, cases[0].limits)
    return [
        Member(problem, ties_by(case.context, case.context.measured[case.circuit.id], problem), diagnosis)
        for case, problem, diagnosis in zip(cases, problems, found, strict=True)
    ]


def moved(member: Member, habit: Habit, size: float) -> Problem:
    """The member's problem with one habit's error in what is computed; gains that habits stand for are exact."""
    problem = member.problem
    gains = {tie.number for tie in member.ties if tie.figure == "gain"}
    sources = {problem.signature.current_readings[tie.number].gain for tie in member.ties if tie.habit.kind == CURRENT}
    amps, branches = list(problem.amps), list(problem.branches)
    for tie in member.ties:
        if tie.habit == habit and tie.figure == "current":
            own = problem.signature.current_readings[tie.number].own
            for (slot, source), u in zip(problem.signature.errors, problem.error_a, strict=True):
                if source == own:
                    amps[slot] += size * tie.weight * u / problem.reading_u[tie.number]
        elif tie.habit == habit and tie.figure in ("ohm", "kelvin"):
            one = branches[tie.number]
            legs = (
                (one.positive_slope_ohm_per_k, one.negative_slope_ohm_per_k)
                if tie.figure == "kelvin"
                else (one.positive_ohm, one.negative_ohm)
            )
            branches[tie.number] = one._replace(
                positive_ohm=one.positive_ohm + size * legs[0], negative_ohm=one.negative_ohm + size * legs[1]
            )
    return replace(
        problem,
        amps=tuple(amps),
        branches=tuple(branches),
        gain_u=tuple(0.0 if n in gains else u for n, u in enumerate(problem.gain_u)),
        error_a=tuple(
            0.0 if source in sources else u
            for (_, source), u in zip(problem.signature.errors, problem.error_a, strict=True)
        ),
    )


def test_a_circuits_quadratic_is_its_log_density_at_shifted_sizes(draw: Draw, problem_from: ProblemFrom) -> None:
    """The mean moves, the covariance stays: for every habit, forwards and back, one at a time."""
    cases = draw(5, 40)[:12]
    members = members_of(cases, problem_from)
    habits = sorted({tie.habit for member in members for tie in member.ties})
    pool = pooled(members, habits, cases[0].limits)
    for number, member in enumerate(members):
        limits = cases[number].limits
        shape = shape_of(member.problem.signature)
        still = moved(member, habits[0], 0.0)
        block = stacked(shape, [still], limits)
        covariance = model_of(block, block.conductor[:, None], block.conductor_slope[:, None]).covariance[:, 0]
        for slot, which in enumerate(pool.index[number].tolist()):
            if which == len(habits):
                continue
            habit = habits[which]
            for size in (-0.02, 0.03):
                other = stacked(shape, [moved(member, habit, size)], limits)
                mean = model_of(other, other.conductor[:, None], other.conductor_slope[:, None]).whole_mean[:, 0]
                if habit.kind == VOLTAGE:
                    mean = mean * (1 + size)
                wanted = log_density(block.shown - mean, covariance)[0] + math.log(limits.prior[AS_RECORDED])
                quadratic = size * (pool.pull[number, slot] - 0.5 * size * pool.curve[number, slot, slot])
                assert pool.recorded[number] + quadratic == pytest.approx(wanted, abs=1e-6)


def test_what_else_may_be_wrong_is_everything_but_as_recorded(draw: Draw, problem_from: ProblemFrom) -> None:
    members = members_of(draw(5, 40)[:12], problem_from)
    pool = pooled(members, sorted({tie.habit for member in members for tie in member.ties}), draw(5, 40)[0].limits)
    for number, member in enumerate(members):
        share = math.exp(pool.otherwise[number] - member.diagnosis.log_evidence)
        assert share == pytest.approx(1 - member.diagnosis.probability(AS_RECORDED), abs=1e-6)


def test_relative_is_what_a_habit_adds_to_the_drop(draw: Draw, problem_from: ProblemFrom) -> None:
    members = members_of(draw(5, 40)[:12], problem_from)
    habits = sorted({tie.habit for member in members for tie in member.ties})
    pool = pooled(members, habits, draw(5, 40)[0].limits)
    for number in range(len(members)):
        for slot, which in enumerate(pool.index[number].tolist()):
            if which < len(habits) and habits[which].kind in (VOLTAGE, CURRENT):
                assert pool.relative[number, slot] == pytest.approx(1.0)
            elif which < len(habits) and habits[which].kind != ZERO:
                assert 0 < pool.relative[number, slot] <= 1.0


def invented(seed: int, circuits: int, loads: list[list[int]], size: Floats, faulty: float, sd: float = 0.05) -> Pool:
    """Circuits that each read a sum of their habits' sizes with a noise, and some that read anything."""
    rng = np.random.default_rng(seed)
    count, most = len(size), max(len(load) for load in loads)
    index = np.full((circuits, most), count)
    pull, curve = np.zeros((circuits, most)), np.zeros((circuits, most, most))
    recorded = np.zeros(circuits)
    for number in range(circuits):
        load = loads[number % len(loads)]
        used = len(load)
        index[number, :used] = load
        read = rng.normal(size[load].sum(), sd)
        if rng.random() < faulty:
            read = rng.uniform(0.2, 1.0)
        pull[number, :used] = read / sd**2
        curve[number, :used, :used] = 1 / sd**2
        recorded[number] = math.log(0.8) - 0.5 * (read / sd) ** 2 - math.log(sd * math.sqrt(2 * math.pi))
    return Pool(
        habits=tuple(Habit("voltage", f"V{n}", "1") for n in range(count)),
        within=np.zeros(count),
        index=index,
        pull=pull,
        curve=curve,
        recorded=recorded,
        otherwise=np.full(circuits, math.log(0.2 / 3)),
        relative=np.where(index < count, 1.0, 0.0),
        weight=np.full(circuits, 1 / sd**2),
    )


def log_joint(pool: Pool, size: Floats, variance: Floats) -> float:
    """Log density of all circuits and sizes, written out circuit by circuit."""
    total = -0.5 * float((size**2 / variance + np.log(2 * math.pi * variance)).sum())
    for number in range(len(pool)):
        used = [n for n in pool.index[number].tolist() if n < len(size)]
        local, k = size[used], len(used)
        quadratic = float(local @ pool.pull[number, :k] - 0.5 * local @ pool.curve[number, :k, :k] @ local)
        total += float(np.logaddexp(pool.recorded[number] + quadratic, pool.otherwise[number]))
    return total


@pytest.mark.parametrize("seed", [1, 3])
def test_a_fit_is_the_best_and_its_evidence_the_integral(seed: int) -> None:
    """Against scipy: the sizes by Nelder and Mead, the evidence by a double integral."""
    pool = invented(seed, 15, [[0], [0, 1], [1]], np.array([0.05, -0.04]), faulty=0.2)
    variance = np.array([0.06**2, 0.08**2])
    fit = fitted(pool, variance, np.zeros(2))

    def below(size: Floats) -> float:
        return -log_joint(pool, size, variance)

    best = optimize.minimize(below, np.zeros(2), method="Nelder-Mead", options={"xatol": 1e-9})
    np.testing.assert_allclose(fit.size, best.x, atol=1e-6)
    top = log_joint(pool, fit.size, variance)
    edges = [(float(fit.size[n] - 8 * fit.covariance[n, n] ** 0.5), float(fit.size[n] + 8 * fit.covariance[n, n] ** 0.5))
             for n in (0, 1)]  # fmt: skip
    total, _ = integrate.dblquad(
        lambda b, a: math.exp(log_joint(pool, np.array([a, b]), variance) - top), *edges[0], *edges[1], epsrel=1e-4
    )
    assert fit.log_evidence == pytest.approx(top + math.log(total), abs=0.05)


def test_faulty_circuits_say_nothing() -> None:
    """A fifth reads anything: the sizes are those of the other circuits alone."""
    pool = invented(1, 200, [[0]], np.array([0.05]), faulty=0.2)
    fit = fitted(pool, np.array([0.06**2]), np.zeros(1))
    assert fit.size[0] == pytest.approx(0.05, abs=3 * fit.covariance[0, 0] ** 0.5)
    read = pool.pull[:, 0] / pool.curve[:, 0, 0]
    assert fit.sound[read > 0.4].max() < 1e-6
    assert fit.sound[read < 0.15].min() > 0.7


def test_a_habit_that_does_not_err_has_no_size() -> None:
    pool = invented(1, 40, [[0], [0, 1], [1]], np.array([0.05, -0.04]), faulty=0.2)
    fit = fitted(pool, np.array([0.06**2, 0.0]), np.full(2, 0.3))
    assert fit.size[1] == 0.0
    assert not fit.covariance[1].any()


def test_a_scan_is_the_integral_over_one_habit() -> None:
    pool = invented(2, 40, [[0], [1]], np.array([0.05, 0.0]), faulty=0.2)
    spread = np.array([0.06, 0.08])
    found = scanned(pool, np.zeros(2), spread)
    base = log_joint(pool, np.zeros(2), np.ones(2))
    for number in (0, 1):

        def density(size: float, number: int = number) -> float:
            sizes = np.zeros(2)
            sizes[number] = size
            prior = -0.5 * (size / spread[number]) ** 2 - math.log(spread[number] * math.sqrt(2 * math.pi))
            return math.exp(log_joint(pool, sizes, np.ones(2)) + 0.5 * size**2 - base + prior)

        total, _ = integrate.quad(density, -4 * spread[number], 4 * spread[number], points=[found.best[number]])
        assert found.gain[number] == pytest.approx(math.log(total), abs=1e-3)
    assert found.gain[0] > 4
    assert found.gain[1] < 1
