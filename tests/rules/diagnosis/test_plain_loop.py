"""The fast path against the plain loop over causes and sizes: the same log evidence and the same probabilities."""

from __future__ import annotations

from collections.abc import Callable
from types import ModuleType
from typing import Any

import numpy as np
import pytest

from rules.case import CircuitCase
from rules.diagnosis.diagnose import diagnose
from rules.diagnosis.hypotheses import AS_RECORDED, BAD_CONNECTION, DOUBTFUL, SEMICONDUCTOR
from rules.diagnosis.judge import Judged, judge_block
from rules.diagnosis.pairs import TWO_PLACES
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import place_words, shape_of

Draw = Callable[[int, int], tuple[CircuitCase, ...]]
ProblemFrom = Callable[[CircuitCase], Problem]

CIRCUITS = 300
ALWAYS = 30
AGREES = 1e-4
MATTERS = 30.0
"""Natural logarithms below the best evidence: less has no probability that could be seen."""
NAMES = {
    "one size smaller": "1",
    "two sizes smaller": "2",
    "a loop entered as one way": "2",
    "feet entered as metres": "3.28",
    "a longer way": "range",
}


def evidences(judged: Judged, problem: Problem) -> dict[tuple[str, str], float]:
    """Log evidence of the fast path under the loop's names, slips left out."""
    shape = judged.block.shape
    found: dict[tuple[str, str], float] = {}
    for name, evidence in zip(judged.hypotheses.names, judged.hypotheses.log_evidence[0].tolist(), strict=True):
        if name.what == TWO_PLACES:
            continue
        if name.cause == BAD_CONNECTION:
            place = shape.places[name.which[0]]
            words = [""] if place.whole else [place_words([member]) for member in place.members]
            found |= {(name.cause, f"{problem.names[place.branch]} {what}".strip()): evidence for what in words}
        elif name.cause != DOUBTFUL:
            what = "" if name.cause == SEMICONDUCTOR else NAMES.get(name.what, name.what)
            found[name.cause, what] = evidence
    return found


def doubtful_evidences(judged: Judged) -> list[float]:
    """Log evidence of the fast path of every slip and doubtful record, in order of size."""
    return sorted(
        evidence
        for name, evidence, share in zip(
            judged.hypotheses.names, judged.hypotheses.log_evidence[0], judged.hypotheses.share[0], strict=True
        )
        if name.cause == DOUBTFUL and share
    )


def same_evidence(case: CircuitCase, loop: Any, problem: Problem) -> tuple[Judged, float]:
    """One circuit judged, its log evidences those of the loop; the best of them."""
    judged = judge_block(shape_of(problem.signature), [problem], case.limits)
    fast = evidences(judged, problem)
    slow: dict[tuple[str, str], float] = loop.evidences()
    assert fast.keys() == slow.keys()
    best = max(slow.values())
    apart = {key: abs(fast[key] - slow[key]) for key in slow if slow[key] > best - MATTERS}
    assert max(apart.values()) < AGREES, (case.tag, apart)
    return judged, best


def agrees(case: CircuitCase, plain: ModuleType, plain_slips: ModuleType, problem_from: ProblemFrom) -> None:
    """One circuit by both ways."""
    problem, loop = problem_from(case), plain.Plain(case)
    judged, best = same_evidence(case, loop, problem)
    (diagnosis,) = diagnose([problem], case.limits)
    both = sum(row.probability for row in diagnosis.causes if row.joints)
    settled = 1 - both
    slips = plain_slips.slips(loop, plain)
    slow_slips, fast_slips = sorted(evidence for _, evidence in slips.values()), doubtful_evidences(judged)
    assert len(slow_slips) == len(fast_slips)
    for one, other in zip(slow_slips, fast_slips, strict=True):
        assert one == pytest.approx(other, abs=AGREES) or max(one, other) < best - MATTERS
    for cause, probability in loop.posterior(slips).items():
        single = diagnosis.probability(cause) - (both if cause == BAD_CONNECTION else 0.0)
        assert single / settled == pytest.approx(probability, abs=AGREES)


def by_size(cases: tuple[CircuitCase, ...]) -> list[CircuitCase]:
    """Cases from one run and one round to five runs and two rounds."""
    return sorted(cases, key=lambda case: len(case.runs) * len(case.rounds))


def test_a_tenth_of_the_circuits_agrees(
    draw: Draw, plain: ModuleType, plain_slips: ModuleType, problem_from: ProblemFrom
) -> None:
    cases = by_size(draw(5, CIRCUITS))
    for case in [*cases[:: CIRCUITS // (ALWAYS - 2)], *cases[-2:]]:
        agrees(case, plain, plain_slips, problem_from)


@pytest.mark.long
def test_every_circuit_agrees(
    draw: Draw, plain: ModuleType, plain_slips: ModuleType, problem_from: ProblemFrom
) -> None:
    for case in draw(5, CIRCUITS):
        agrees(case, plain, plain_slips, problem_from)


def test_a_long_circuit_agrees(
    plain: ModuleType, plain_slips: ModuleType, chains: ModuleType, problem_from: ProblemFrom
) -> None:
    """Twenty runs, every point read: what a place moves is one row of twenty."""
    lengths = [6.0] * 20
    volts = chains.drops(lengths, 8.0, [0.0] * 11 + [0.02])
    readings = chains.read(["way", *(f"p{n}" for n in range(1, 21))], volts, 8.0)
    agrees(chains.case_from(chains.chain(lengths, readings)), plain, plain_slips, problem_from)


@pytest.mark.parametrize("bad", [0, 3, 8])
def test_a_place_that_moves_more_rows_than_it_has_columns_agrees(
    plain: ModuleType, chains: ModuleType, problem_from: ProblemFrom, bad: int
) -> None:
    """Drops with a long lead from the way to each of nine points: what is wrong in the first run moves all of them."""
    lengths = [6.0] * 9
    volts = chains.drops(lengths, 8.0, [0.0] * bad + [0.02])
    readings = [
        {"quantity": "drop", "at": "way", "to": f"p{n}", "leg": "both", "value": f"{volts[0] - volts[n]:.3f}"}
        | {"instrument": "M1", "circuit": "C1", "round": "1"}
        for n in range(1, 10)
    ]
    readings += chains.read([], volts, 8.0)
    case = chains.case_from(chains.chain(lengths, readings))
    problem = problem_from(case)
    shape = shape_of(problem.signature)
    assert shape.moved_rows.shape[1] > 1 + shape.moving_columns.shape[1]
    same_evidence(case, plain.Plain(case), problem)


def test_a_batch_gives_what_each_circuit_alone_gives(draw: Draw, problem_from: ProblemFrom) -> None:
    cases = draw(5, CIRCUITS)[:60]
    problems = [problem_from(case) for case in cases]
    for problem, together in zip(problems, diagnose(problems, cases[0].limits), strict=True):
        (alone,) = diagnose([problem], cases[0].limits)
        assert [row.where for row in alone.causes[:2]] == [row.where for row in together.causes[:2]]
        first, second = ([row.probability for row in found.causes] for found in (alone, together))
        np.testing.assert_allclose(first, second, atol=1e-7)


def test_probabilities_sum_to_one_and_bounds_enclose_the_value(draw: Draw, problem_from: ProblemFrom) -> None:
    cases = draw(5, CIRCUITS)
    for diagnosis in diagnose([problem_from(case) for case in cases], cases[0].limits):
        assert sum(row.probability for row in diagnosis.causes) == pytest.approx(1.0, abs=1e-12)
        assert diagnosis.probability(AS_RECORDED) <= 1.0
        probabilities = [row.probability for row in diagnosis.causes]
        assert probabilities == sorted(probabilities, reverse=True)
        for row in diagnosis.causes:
            for joint in row.joints or (row,):
                if row.cause == BAD_CONNECTION and row.probability > 1e-3:
                    assert joint.low_ohm is not None
                    assert joint.best_ohm is not None
                    assert joint.high_ohm is not None
                    assert joint.low_ohm < joint.best_ohm < joint.high_ohm
