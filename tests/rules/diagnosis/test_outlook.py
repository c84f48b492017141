"""What atoms say of readings not taken yet, against the plain model: joint Gaussians, conditioned by numpy."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from types import ModuleType
from typing import Any

import numpy as np
import pytest
from numpy.testing import assert_allclose

from rules.calc.doubt import Weighted
from rules.case import CircuitCase
from rules.diagnosis.atoms import Atoms, atoms_of
from rules.diagnosis.block import Block, stacked
from rules.diagnosis.candidates import AGAIN, SINGLE, Meters, Posed, imagined_rounds, posed
from rules.diagnosis.hypotheses import AS_RECORDED, BAD_CONNECTION, CAUSES, LONGER, SMALLER
from rules.diagnosis.judge import Judged, judge_block
from rules.diagnosis.outlook import Outlook, outlook_of
from rules.diagnosis.shape import Floats, shape_of

CIRCUITS = 24


def looked_at(case: CircuitCase) -> tuple[Posed, Judged, Block, Atoms, Outlook]:
    """Atoms and outlook of one circuit, without the smoothing between neighbouring sizes."""
    this = posed(case, Meters())
    assert this is not None
    judged = judge_block(shape_of(this.read.signature), [this.read], case.limits)
    block = stacked(shape_of(this.imagined.signature), [this.imagined], case.limits)
    atoms = atoms_of(judged, block, negligible=0.0)
    atoms = replace(atoms, smoothed=np.zeros_like(atoms.smoothed))
    every = np.arange(len(this.rows_of(SINGLE)) + len(this.imagined.names) + 1)
    return this, judged, block, atoms, outlook_of(judged, block, atoms, [this], every[None])


def conditioned(mean: Floats, covariance: Floats, shown: Floats) -> tuple[Floats, Floats]:
    """Mean and covariance of the last rows, given the first."""
    n = len(shown)
    gain = np.linalg.solve(covariance[:n, :n], covariance[:n, n:]).T
    return mean[n:] + gain @ (shown - mean[:n]), covariance[n:, n:] - gain @ covariance[:n, n:]


@pytest.mark.parametrize("number", range(CIRCUITS))
def test_outcomes_are_those_of_the_plain_model(
    draw: Callable[[int, int], tuple[CircuitCase, ...]], plain: ModuleType, number: int
) -> None:
    """As recorded, with a bad connection, a smaller conductor or a longer route, for every reading that is imagined."""
    case = draw(4, CIRCUITS)[number]
    this, _, block, atoms, outlook = looked_at(case)
    once, more = imagined_rounds(case, this.read, Meters())
    volts = {row.at: (Weighted(1.0, more.shown[row.id]),) for row in more.readings if row.quantity == "voltage"}
    rounds = (*case.rounds, once, replace(more, volts=volts))
    model: Any = plain.Plain(replace(case, rounds=rounds))
    read = len(this.read.signature.rows)
    single = [row - read for row in this.rows_of(SINGLE)]
    again = [row - read for row in this.rows_of(AGAIN)]
    checked = 0
    for atom in range(atoms.weight.shape[1]):
        hypothesis = _hypothesis(case, block, atoms, atom)
        if hypothesis is None:
            continue
        checked += 1
        before, joint = model.gaussian(**hypothesis)[:2]
        mean, covariance = conditioned(before, joint, model.shown[:read])
        of_single = (outlook.mean + outlook.steady)[0, : len(single), atom]
        spread = (outlook.variance + outlook.clamp)[0, : len(single), atom] + outlook.counts[0, : len(single)]
        assert_allclose(of_single, mean[single], rtol=1e-7, atol=1e-9)
        assert_allclose(spread, covariance[single, single], rtol=1e-6, atol=1e-12)
        assert_allclose((outlook.again_mean + outlook.again_steady)[0, atom], mean[again], rtol=1e-7, atol=1e-9)
        whole = (outlook.again_covariance + outlook.again_fixed)[0, atom]
        assert_allclose(whole, covariance[np.ix_(again, again)], rtol=1e-6, atol=1e-12)
    assert checked >= 4


def _hypothesis(case: CircuitCase, block: Block, atoms: Atoms, atom: int) -> dict[str, Any] | None:
    """An atom as the plain model takes it; ``None`` for slips and what has no leg in it."""
    cause, place = atoms.groups[atoms.group[0, atom]]
    if cause == BAD_CONNECTION:
        at = block.shape.places[place]
        return {"bad": (list(case.tree.ends)[at.branch], at.members[0]), "ohm": float(atoms.size[0, atom])}
    if cause in (AS_RECORDED, SMALLER, LONGER):
        # all runs of a drawn circuit are of one size: one factor holds for all
        return {"factor": float(atoms.ratios[0, atoms.conductor[0, atom], 0])}
    return None


def test_weights_are_the_posterior(draw: Callable[[int, int], tuple[CircuitCase, ...]]) -> None:
    """Of each cause together; a place that is told apart has its share of the run's."""
    for case in draw(4, CIRCUITS):
        _, judged, block, atoms, _ = looked_at(case)
        for cause in CAUSES:
            ours = [group.cause == cause for group in atoms.groups]
            of_cause = judged.posterior[0, judged.of_cause(cause)].sum()
            of_cause += judged.of_pair[0] if cause == BAD_CONNECTION else 0.0
            assert_allclose(atoms.shares[0, ours].sum(), of_cause, rtol=1e-9, atol=1e-12)
        assert_allclose(atoms.shares[0].sum(), 1.0, rtol=1e-9)
        assert len(block.shape.places) == 4 * len(case.runs)
