"""What other circuits teach, in a problem's arrays: against problems in which the same errors were put right one by one."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from rules.case import CircuitCase
from rules.diagnosis.block import Block, Model, model_of, stacked
from rules.diagnosis.carry import with_common
from rules.diagnosis.extra import line_of
from rules.diagnosis.gaussian import log_density, whitener
from rules.diagnosis.habits import Habit, Tie
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import shape_of
from rules.limits import Limits
from rules.measured import ties_by

Floats = NDArray[np.float64]
Draw = Callable[[int, int], tuple[CircuitCase, ...]]
ProblemFrom = Callable[[CircuitCase], Problem]
STEP = 1e-6


def ties_of_case(case: CircuitCase, problem: Problem) -> tuple[Tie, ...]:
    measured = case.context.measured[case.circuit.id]
    return ties_by(case.context, measured, problem)


def put_right(problem: Problem, ties: tuple[Tie, ...], sizes: dict[Habit, float]) -> Problem:
    """The problem with its readings and its record corrected by hand, gains that habits stand for exact."""
    value, amps, branches = list(problem.value), list(problem.amps), list(problem.branches)
    gain_u, error_a = list(problem.gain_u), list(problem.error_a)
    factor = [1.0] * len(branches)
    for tie in ties:
        size = sizes[tie.habit]
        if tie.figure == "gain":
            gain_u[tie.number] = 0.0
            for number, gain in enumerate(problem.signature.gain_of):
                if gain == tie.number:
                    value[number] /= 1 + size
        elif tie.figure == "current":
            read = problem.signature.current_readings[tie.number]
            for (slot, source), u in zip(problem.signature.errors, problem.error_a, strict=True):
                if source == read.own:
                    amps[slot] += tie.weight * size * u / problem.reading_u[tie.number]
            error_a = [
                0.0 if source == read.gain else u
                for (_, source), u in zip(problem.signature.errors, error_a, strict=True)
            ]
        elif tie.figure == "ohm":
            factor[tie.number] += size
        else:
            one = branches[tie.number]
            slope = one.positive_slope_ohm_per_k + one.negative_slope_ohm_per_k
            factor[tie.number] += size * slope / (one.positive_ohm + one.negative_ohm)
    branches = [
        one._replace(
            positive_ohm=one.positive_ohm * f,
            negative_ohm=one.negative_ohm * f,
            positive_slope_ohm_per_k=one.positive_slope_ohm_per_k * f,
            negative_slope_ohm_per_k=one.negative_slope_ohm_per_k * f,
        )
        for one, f in zip(branches, factor, strict=True)
    ]
    return replace(
        problem,
        value=tuple(value),
        amps=tuple(amps),
        branches=tuple(branches),
        gain_u=tuple(gain_u),
        error_a=tuple(error_a),
    )


def modelled(problem: Problem, limits: Limits) -> tuple[Block, Model]:
    block = stacked(shape_of(problem.signature), [problem], limits)
    return block, model_of(block, block.conductor[:, None], block.conductor_slope[:, None])


def excess(problem: Problem, limits: Limits) -> Floats:
    """(n,): what the rows show above what they should."""
    block, model = modelled(problem, limits)
    found: Floats = (block.shown - model.whole_mean[:, 0])[0]
    return found


@pytest.fixture(params=[0, 7, 12], ids=lambda number: f"circuit {number}")
def told(
    request: pytest.FixtureRequest, draw: Draw, problem_from: ProblemFrom
) -> tuple[Problem, Problem, tuple[Tie, ...], dict[Habit, float], Floats, Limits]:
    """A problem, the same with what others teach, its ties, means by habit, columns (habits, columns) and limits."""
    case = sorted(draw(5, 40), key=lambda case: len(case.runs) * len(case.rounds))[int(request.param) * 3]
    problem = problem_from(case)
    ties = ties_of_case(case, problem)
    habits = sorted({tie.habit for tie in ties})
    rng = np.random.default_rng(1)
    unit = np.array([{"temperature": 5.0, "zero": 0.05}.get(habit.kind, 0.03) for habit in habits])
    mean, root = unit * rng.normal(size=len(habits)), unit[:, None] * rng.normal(size=(len(habits), len(habits)))
    carried = with_common(problem, ties, [habits.index(tie.habit) for tie in ties], mean, root @ root.T)
    value, vector = np.linalg.eigh(root @ root.T)
    columns = vector * np.sqrt(np.maximum(value, 0.0))
    return problem, carried, ties, dict(zip(habits, mean.tolist(), strict=True)), columns, case.limits


Told = tuple[Problem, Problem, tuple[Tie, ...], dict[Habit, float], Floats, Limits]


def test_means_put_readings_and_record_right(told: Told) -> None:
    problem, carried, ties, mean, _, limits = told
    np.testing.assert_allclose(excess(carried, limits), excess(put_right(problem, ties, mean), limits), atol=1e-12)


def test_each_column_moves_everything_together(told: Told) -> None:
    """Currents and conductors as a difference quotient says; a voltmeter's gain in proportion to what it should show."""
    problem, carried, ties, mean, columns, limits = told
    _, model = modelled(carried, limits)
    found = model.whole_shared[0, 0][:, -columns.shape[1] :]
    (voltmeter,) = {tie.habit for tie in ties if tie.figure == "gain"}
    for number, column in enumerate(columns.T):
        there, back = (
            modelled(
                put_right(
                    problem, ties, {h: m + side * STEP * c for (h, m), c in zip(mean.items(), column, strict=True)}
                ),
                limits,
            )[1].whole_mean[0, 0]
            for side in (1, -1)
        )
        gain = column[list(mean).index(voltmeter)] * model.whole_mean[0, 0]
        np.testing.assert_allclose(found[:, number], (there - back) / (2 * STEP) + gain, rtol=1e-6, atol=1e-9)


def test_doubts_are_those_of_the_corrected_problem_and_the_columns(told: Told) -> None:
    problem, carried, ties, mean, columns, limits = told
    _, model = modelled(carried, limits)
    _, right = modelled(put_right(problem, ties, mean), limits)
    shared = model.whole_shared[0, 0][:, -columns.shape[1] :]
    np.testing.assert_allclose(model.covariance[0, 0], right.covariance[0, 0] + shared @ shared.T, rtol=1e-6)


def test_an_extra_resistance_carries_the_columns_too(told: Told) -> None:
    _, carried, _, _, _, limits = told
    block, model = modelled(carried, limits)
    shape = block.shape
    which = np.arange(len(shape.places))
    line = line_of(block, model, whitener(model.covariance[:, 0]))
    along = line.log_density(np.log(np.full((len(which), 1), 0.02)), which)
    for number in range(len(shape.places)):
        others = block.others.copy()
        others[:, shape.place_element[number] - shape.conductors.stop] += 0.02
        moved = replace(block, others=others)
        wanted = model_of(moved, block.conductor[:, None], block.conductor_slope[:, None])
        whole = log_density(block.shown - wanted.whole_mean[:, 0], wanted.covariance[:, 0])
        assert along[number, 0] == pytest.approx(whole[0], abs=1e-6)


def test_a_problem_that_was_told_nothing_has_no_columns(draw: Draw, problem_from: ProblemFrom) -> None:
    case = draw(5, 40)[0]
    problem = problem_from(case)
    assert problem.common is None
    assert problem.signature.common == 0
