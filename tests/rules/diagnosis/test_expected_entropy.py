"""
Expected entropy against brute force: outcomes are drawn from the plain model, entered, and judged anew.

Nothing but the weights of the atoms is shared with what is tested: the drawn outcome comes from the plain loop's joint
Gaussian, and the entropy after it from the diagnosis of a record that holds it.
"""

from __future__ import annotations

from dataclasses import replace
from types import ModuleType
from typing import Any

import numpy as np
import pytest

from rules.calc.doubt import Weighted
from rules.case import CircuitCase
from rules.context import Measured
from rules.diagnosis.candidates import AGAIN, JOINT, LEG, POINT, SINGLE, Meters, imagined_rounds, posed
from rules.diagnosis.choice import Batch, looked_at
from rules.diagnosis.hypotheses import AS_RECORDED, BAD_CONNECTION, LONGER, SMALLER
from rules.diagnosis.information import entropy
from rules.diagnosis.judge import judge_block
from rules.diagnosis.options import AS_IT_IS, LESS, ROUND
from rules.diagnosis.shape import Floats, shape_of
from rules.measured import posed_by
from rules.record import Site
from rules.rounds import Round

PRIOR = """
[prior]
source = "this test: what the plain loop takes in single rows"
series_semiconductor = 0
reading_or_record_doubtful = 0
other_metal = 0
"""
DRAWN = 240
LEFT_OUT = 0.02
"""What few outcomes and few sizes leave out. [nat]"""


def entropy_of(case: CircuitCase) -> float:
    """Of the causes, each termination a place of its own."""
    problem = posed_by(case.context, Measured(case.visit, (), case.rounds, case.tree))
    assert problem is not None
    judged = judge_block(shape_of(problem.signature), [problem], case.limits)
    parts: list[float] = []
    for cause in {name.cause for name in judged.hypotheses.names}:
        share = judged.posterior[0, judged.of_cause(cause)]
        if cause == BAD_CONNECTION:
            for place, each in zip(judged.block.shape.places, share, strict=True):
                parts += [each / len(place.members)] * len(place.members)
        else:
            parts.append(float(share.sum()))
    return float(entropy(np.array(parts)))


class Drawer:
    """Outcomes of the imagined readings of one case, from the plain model."""

    def __init__(self, case: CircuitCase, plain: ModuleType, level: float = 1.0) -> None:
        self.case = case
        this = posed(case, Meters())
        assert this is not None
        self.posed = this
        self.batch: Batch = looked_at([this], case.limits)
        self.once, more = imagined_rounds(case, this.read, Meters())
        self.more = at_level(more, level)
        self.model: Any = plain.Plain(replace(case, rounds=(*case.rounds, self.once, self.more)))
        self.read = len(this.read.signature.rows)

    def draw(self, rng: np.random.Generator) -> Floats:
        """One outcome of all imagined rows."""
        atoms, shape = self.batch.atoms, self.batch.shape
        ours = [n for n in range(atoms.weight.shape[1]) if atoms.groups[atoms.group[0, n]].cause in CAUSES]
        share = atoms.weight[0, ours] / atoms.weight[0, ours].sum()
        atom = ours[int(rng.choice(len(ours), p=share))]
        cause, place = atoms.groups[atoms.group[0, atom]]
        by = float(rng.normal(0, atoms.smoothed[0, atom]))
        known: dict[str, Any] = {"factor": float(atoms.ratios[0, atoms.conductor[0, atom], 0]) + by}
        if cause == BAD_CONNECTION:
            at = shape.places[place]
            ohm = max(float(atoms.size[0, atom]) + by, 1e-5)
            known = {"bad": (list(self.case.tree.ends)[at.branch], at.members[0]), "ohm": ohm}
        mean, covariance = self.model.gaussian(**known)
        n = self.read
        gain = np.linalg.solve(covariance[:n, :n], covariance[:n, n:]).T
        left = covariance[n:, n:] - gain @ covariance[:n, n:]
        return np.asarray(rng.multivariate_normal(mean[n:] + gain @ (self.model.shown[:n] - mean[:n]), left))

    def with_single(self, row: int, outcome: Floats) -> CircuitCase:
        """The case with one single reading as if it had shown its outcome."""
        said = self.posed.observation(row).readings[0]
        shown = replace(self.once.shown[said.id], value=float(outcome[row - self.read]))
        kept = tuple(each for each in self.once.readings if each.id == said.id or each.quantity == "current")
        one = replace(self.once, readings=kept, shown=dict(self.once.shown) | {said.id: shown})
        return replace(self.case, rounds=(*self.case.rounds, one))

    def with_round(self, outcome: Floats) -> CircuitCase:
        """The case with one more round: voltages that fall by the drops that were drawn."""
        ids = [row.id for row in self.more.readings if row.quantity == "voltage"]
        volts = [self.more.shown[ids[0]].value]
        for row in self.posed.rows_of(AGAIN):
            volts.append(volts[-1] - float(outcome[row - self.read]))
        found = {id_: replace(self.more.shown[id_], value=volt) for id_, volt in zip(ids, volts, strict=True)}
        return replace(self.case, rounds=(*self.case.rounds, replace(self.more, shown=dict(self.more.shown) | found)))


CAUSES = (AS_RECORDED, BAD_CONNECTION, SMALLER, LONGER)


def at_level(more: Round, level: float) -> Round:
    """A round at other currents, ready for the plain model."""
    amps = {
        point: tuple(Weighted(1.0, replace(term.shown, value=level * term.shown.value)) for term in terms)
        for point, terms in more.amps.items()
    }
    volts = {row.at: (Weighted(1.0, more.shown[row.id]),) for row in more.readings if row.quantity == "voltage"}
    clamped = [row for row in more.readings if row.quantity == "current"]
    shown = {row.id: terms[0].shown for row, terms in zip(clamped, amps.values(), strict=True)}
    return replace(more, amps=amps, volts=volts, shown=dict(more.shown) | shown)


def sites(chains: ModuleType) -> dict[str, Site]:
    """Three circuits that one round leaves open."""
    coarse = {"instruments": [chains.COARSE, chains.CLAMP]}
    one, two = chains.drops([12.0], 8.0, extra=[0.06]), chains.drops([6.0, 6.0], 8.0, extra=[0.0, 0.03])
    little = chains.drops([12.0], 8.0, extra=[0.004])
    return {
        "a joint or a conductor": chains.chain([12.0], chains.read(["way", "p1"], one, 8.0), own=PRIOR),
        "two runs": chains.chain([6.0, 6.0], chains.read(["way", "p2"], two, 8.0), own=PRIOR),
        "a coarse meter": chains.chain([12.0], chains.read(["way", "p1"], little, 8.0), own=PRIOR, tables=coarse),
    }


def tolerance(after: list[float]) -> float:
    """Three standard errors of drawn outcomes, and what is left out. [nat]"""
    return float(LEFT_OUT + 3 * float(np.std(after)) / len(after) ** 0.5)


@pytest.mark.parametrize("name", ["a joint or a conductor", "two runs", "a coarse meter"])
@pytest.mark.parametrize("kind", [JOINT, LEG, POINT])
def test_single_readings_against_drawn_outcomes(plain: ModuleType, chains: ModuleType, name: str, kind: str) -> None:
    drawer = Drawer(chains.case_from(sites(chains)[name]), plain)
    options, rows = drawer.batch.options, drawer.posed.rows_of(SINGLE)
    of_kind = [n for n, way in enumerate(options.ways) if way.kind == kind and way.how == AS_IT_IS]
    if kind == POINT:
        assert bool(of_kind) == (name == "two runs")
    for option in of_kind[:1]:
        row = rows[int(drawer.batch.outlook.candidate[0, options.column[0, option]])]
        rng = np.random.default_rng(7)
        after = [entropy_of(drawer.with_single(row, drawer.draw(rng))) for _ in range(DRAWN)]
        before = entropy_of(drawer.case)
        assert options.fall[0, option] == pytest.approx(before - np.mean(after), abs=tolerance(after))
        assert before == pytest.approx(float(entropy(drawer.batch.atoms.shares[0])), abs=1e-6)


@pytest.mark.parametrize("name", ["two runs", "a coarse meter"])
@pytest.mark.parametrize("how", [AS_IT_IS, LESS])
def test_another_round_against_drawn_outcomes(plain: ModuleType, chains: ModuleType, name: str, how: str) -> None:
    case = chains.case_from(sites(chains)[name])
    level = case.limits["next_reading.lower_share"] if how == LESS else 1.0
    drawer = Drawer(case, plain, level)
    options = drawer.batch.options
    (option,) = (n for n, way in enumerate(options.ways) if way.kind == ROUND and way.how == how)
    rng = np.random.default_rng(11)
    after = [entropy_of(drawer.with_round(drawer.draw(rng))) for _ in range(DRAWN)]
    assert options.fall[0, option] == pytest.approx(entropy_of(case) - np.mean(after), abs=tolerance(after))
