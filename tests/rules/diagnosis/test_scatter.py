"""Wander that few repeated readings show: the scales against scipy, their mixture against Student's t."""

from __future__ import annotations

import math
from dataclasses import replace
from types import ModuleType

import numpy as np
import pytest
import scipy.stats

from rules import limits
from rules.assess import prepare
from rules.diagnosis.diagnose import diagnose
from rules.diagnosis.hypotheses import AS_RECORDED
from rules.diagnosis.problem import Problem
from rules.diagnosis.scatter import QUANTILES, RATIOS, WEIGHTS, scales
from rules.measured import posed_by

LENGTHS = (9.0, 7.0)


def posed(chains: ModuleType, repeats: tuple[str, ...], off_v: float = 0.0) -> tuple[Problem, limits.Limits]:
    """Two runs as recorded, but for ``off_v`` more at the end; ``way`` read as often as there are repeats."""
    volts = chains.drops(LENGTHS, 8.0)
    rows = chains.read(("p1", "p2"), [volts[0], volts[1] - off_v, volts[2] - off_v], 8.0)
    rows += [rows[0] | {"at": "way", "value": value} for value in repeats]
    site = chains.chain(LENGTHS, rows)
    context = prepare(site, limits.of(site))
    problem = posed_by(context, context.measured[site.circuits[0].id])
    assert problem is not None
    return problem, context.limits


def test_the_scales_are_those_of_chi_squared() -> None:
    assert math.fsum(WEIGHTS) == pytest.approx(1.0)
    edges = np.cumsum([0.0, *WEIGHTS])
    assert all(low < share < high for low, share, high in zip(edges, QUANTILES, edges[1:], strict=False))
    for freedom, ratios in enumerate(RATIOS, 1):
        expected = freedom / scipy.stats.chi2(freedom).ppf(QUANTILES)
        np.testing.assert_allclose(ratios, expected, rtol=1e-4)


@pytest.mark.parametrize("freedom", [2, 4, 6, 10])
def test_the_mixture_is_about_students_t(freedom: int) -> None:
    """Within a tenth of a nat to two standard deviations and one nat to eight, where a widened Gaussian misses by tens."""
    x = np.linspace(0, 8, 81)
    spreads = np.sqrt(np.array(RATIOS[freedom - 1]))
    ours = np.log((np.array(WEIGHTS) * scipy.stats.norm.pdf(x[:, None], scale=spreads)).sum(axis=1))
    apart = np.abs(ours - scipy.stats.t(freedom).logpdf(x))
    assert apart[x <= 2].max() < 0.1
    assert apart.max() < 1.0


def test_what_was_not_repeated_has_one_scale(chains: ModuleType) -> None:
    problem, _ = posed(chains, ("24.000",))
    assert problem.wander_freedom == 0
    assert scales(problem) == [problem]


def test_only_what_repeats_show_is_scaled(chains: ModuleType) -> None:
    problem, _ = posed(chains, ("24.000", "24.006", "24.003"))
    assert problem.wander_freedom == 2
    several = scales(problem)
    assert len(several) == len(WEIGHTS)
    # of the readings: s = 3 mV; of each voltage by itself that is its variance, of the mean of three a third
    s2 = 0.003**2
    for ratio, one in zip(RATIOS[1], several, strict=True):
        more = [after - before for after, before in zip(one.variance, several[0].variance, strict=True)]
        expected = [s2 * (ratio - RATIOS[1][0]) / (3 if said.at == "way" else 1) for said in one.observations]
        np.testing.assert_allclose(more, expected, rtol=1e-9, atol=1e-18)


def test_repeats_that_agree_by_chance_accuse_nobody(chains: ModuleType) -> None:
    """Three readings within 1 mV, and 30 mV more lost than computed: by a widened Gaussian alone it is a fault sooner."""
    problem, in_force = posed(chains, ("24.000", "24.001", "24.000"), off_v=0.03)
    (found,) = diagnose([problem], in_force)
    (widened,) = diagnose([replace(problem, wander_freedom=0)], in_force)
    assert widened.probability(AS_RECORDED) < found.probability(AS_RECORDED)
    assert sum(row.probability for row in found.causes) == pytest.approx(1.0)
    probabilities = [row.probability for row in found.causes]
    assert probabilities == sorted(probabilities, reverse=True)
    assert max(probabilities) <= 1.0


def test_a_certainty_stays_at_most_one(chains: ModuleType) -> None:
    """0.4 V more: every scale says a fault, and their sum is not to end above one by rounding."""
    for off_v in np.linspace(0.4, 0.8, 9).tolist():
        problem, in_force = posed(chains, ("24.000", "24.004", "24.001"), off_v=off_v)
        (found,) = diagnose([problem], in_force)
        assert max(row.probability for row in found.causes) <= 1.0


def test_a_batch_gives_what_each_alone_gives(chains: ModuleType) -> None:
    problems = [
        posed(chains, repeats)[0] for repeats in (("24.000",), ("24.000", "24.004"), ("24.00", "24.01", "24.02"))
    ]
    in_force = posed(chains, ("24.000",))[1]
    for problem, together in zip(problems, diagnose(problems, in_force), strict=True):
        (alone,) = diagnose([problem], in_force)
        assert [(row.cause, row.where) for row in alone.causes] == [(row.cause, row.where) for row in together.causes]
        np.testing.assert_allclose(
            [row.probability for row in alone.causes], [row.probability for row in together.causes], atol=1e-9
        )
        np.testing.assert_allclose(np.array(alone.figures), np.array(together.figures), atol=1e-9)
