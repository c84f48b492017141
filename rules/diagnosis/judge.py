"""
A batch of problems of one shape, judged.

Posterior ∝ prior × evidence over all hypotheses of all causes; the evidence is the integral over the size of
each cause (``extra``, ``conductor_causes``, ``doubtful``).
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from rules.diagnosis.block import Block, Model, model_of, stacked
from rules.diagnosis.conductor_causes import ConductorCauses, conductor_causes
from rules.diagnosis.doubtful import Slips, slips
from rules.diagnosis.extra import extras
from rules.diagnosis.gaussian import whitener
from rules.diagnosis.healthy import corrected
from rules.diagnosis.hypotheses import (
    AS_RECORDED,
    BAD_CONNECTION,
    CAUSES,
    DOUBTFUL,
    SEMICONDUCTOR,
    Hypotheses,
    Hypothesis,
    joined,
    normalised,
)
from rules.diagnosis.pairs import MATTERS, TWO_PLACES, Pairs, pairs, summed
from rules.diagnosis.problem import Problem
from rules.diagnosis.quadrature import Density
from rules.diagnosis.shape import Floats, Shape
from rules.limits import Limits

BATCH = 512
"""Most problems that go through the arrays together: memory grows with this, not with the site."""
ROOM = 200_000
"""Problems in a batch times their rows squared: fewer of the large ones go together."""


@dataclass(frozen=True, slots=True, eq=False)
class Judged:
    """A batch of problems judged: b problems, h hypotheses."""

    block: Block
    recorded: Model
    hypotheses: Hypotheses
    posterior: Floats
    """(b, h): sums to one."""
    log_evidence: Floats
    """(b,): of everything that was read."""
    density: Density
    """Of the sizes of bad connections, then of semiconductors: (b, places and offsets)."""
    conductors: ConductorCauses
    slips: Slips
    pairs: Pairs

    def of_cause(self, cause: str) -> list[int]:
        """Where a cause's hypotheses stand, a pair of bad connections left out."""
        return [
            number
            for number, name in enumerate(self.hypotheses.names)
            if name.cause == cause and name.what != TWO_PLACES
        ]

    @property
    def of_places(self) -> Floats:
        """(b, places): probability of one bad connection at each."""
        return self.posterior[:, self.of_cause(BAD_CONNECTION)]

    @property
    def of_pair(self) -> Floats:
        """(b,): probability of bad connections at both places of the best pair."""
        if not self.pairs.hypotheses.names:
            return np.zeros(len(self.block))
        return self.posterior[:, self.hypotheses.names.index(self.pairs.hypotheses.names[0])]


def judge_block(shape: Shape, problems: Sequence[Problem], limits: Limits) -> Judged:
    """Judge problems of one shape; all arrays of the batch are kept for whoever asks why."""
    block = stacked(shape, problems, limits)
    recorded = model_of(block, block.conductor[:, None], block.conductor_slope[:, None])
    white = whitener(recorded.covariance[:, 0])
    evidence = white.log_density(block.shown - recorded.whole_mean[:, 0])[:, None]
    density = extras(block, recorded, white)
    conductors = conductor_causes(block, recorded)
    found, two = slips(block, recorded, white), pairs(block, recorded, white)
    places = [Hypothesis(BAD_CONNECTION, which=(number,)) for number in range(len(shape.places))]
    offsets = [Hypothesis(SEMICONDUCTOR, which=(number,)) for number in range(len(shape.offsets))]
    shares = [place.share for place in shape.places] + [1 / len(offsets)] * len(offsets)
    parts = [
        Hypotheses((Hypothesis(AS_RECORDED),), np.ones((1, 1)), evidence),
        Hypotheses((*places, *offsets), np.array([shares]), density.log_evidence),
    ]
    hypotheses = joined([*parts, conductors.hypotheses, found.hypotheses, two.hypotheses])
    pair = shape.place_element[two.places] if shape.places else two.places
    hypotheses = replace(hypotheses, log_evidence=corrected(block, hypotheses.names, hypotheses.log_evidence, pair))
    with np.errstate(divide="ignore"):
        joint = np.log(_weights(hypotheses, limits)) + hypotheses.log_evidence
    if two.hypotheses.names:
        place = hypotheses.names.index(two.hypotheses.names[0])
        some = np.flatnonzero(joint[:, place] > joint.max(axis=1) - MATTERS)
        more, two = summed(two, some)
        joint[some, place] += more
        hypotheses.log_evidence[some, place] += more
    best = joint.max(axis=1, keepdims=True)
    posterior = np.exp(joint - best)
    total = posterior.sum(axis=1, keepdims=True)
    return Judged(
        block=block,
        recorded=recorded,
        hypotheses=hypotheses,
        posterior=posterior / total,
        log_evidence=(best + np.log(total))[:, 0],
        density=density,
        conductors=conductors,
        slips=found,
        pairs=two,
    )


def _weights(hypotheses: Hypotheses, limits: Limits) -> Floats:
    """(b, h): prior probability of each hypothesis; they sum to one over what is possible."""
    prior = limits.prior
    causes = np.array([CAUSES.index(name.cause) for name in hypotheses.names])
    share = hypotheses.share.copy()
    doubtful = causes == CAUSES.index(DOUBTFUL)
    share[:, doubtful] = normalised(share[:, doubtful])
    weight = share * np.array([prior.get(cause, 0.0) for cause in CAUSES])[causes]
    return normalised(weight)


def grouped(problems: Sequence[Problem]) -> list[list[int]]:
    """Batches of equal shape, as places in the list."""
    by_shape: dict[int, list[int]] = defaultdict(list)
    for number, problem in enumerate(problems):
        by_shape[id(problem.signature)].append(number)  # equal signatures are one object
    batches = []
    for group in by_shape.values():
        most = min(BATCH, max(1, ROOM // len(problems[group[0]].signature.rows) ** 2))
        batches += [group[start : start + most] for start in range(0, len(group), most)]
    return batches
