"""
The diagnosis of circuits: what is probably wrong, where and how much, in batches of equal shape.

``diagnose`` is what the rest of ``rules`` calls; how a batch is judged stands in ``judge``.
"""

from __future__ import annotations

import gc
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from rules.assessment import Place
from rules.calc.doubt import probability_above
from rules.diagnosis.hypotheses import BAD_CONNECTION, CAUSES, SEMICONDUCTOR
from rules.diagnosis.judge import Judged, grouped, judge_block
from rules.diagnosis.learned import Learned, Together, learned, together
from rules.diagnosis.problem import Problem
from rules.diagnosis.scatter import scales, whole
from rules.diagnosis.shape import Shape, place_words, shape_of
from rules.diagnosis.words import what_words
from rules.limits import Limits

OTHERS = tuple(cause for cause in CAUSES if cause not in (BAD_CONNECTION, SEMICONDUCTOR))
"""Causes that have no place."""
LEAST = 1e-12
"""Probability that the sum of all would not feel: such a row is left out."""
TOLD = 0.01
"""Probability of a cause from which its most probable way is put into words."""
COVERED = 0.95
"""Share of a place's posterior between the bounds of its extra resistance."""


@dataclass(frozen=True, slots=True)
class Diagnosis:
    """What is probably wrong with one circuit, where and how much."""

    causes: tuple[Place, ...]
    """Highest first; the probabilities sum to one."""
    run_ids: tuple[str, ...]
    """Of the branches; empty for the device."""
    figures: tuple[tuple[float, ...], ...]
    """Of each branch: the fields of ``Learned``."""
    together: Together | None
    """The two places that would be bad at the same time."""
    log_evidence: float

    def probability(self, cause: str) -> float:
        """Of a cause, its places together."""
        return sum(place.probability for place in self.causes if place.cause == cause)

    def of_branch(self, run_id: str) -> Learned | None:
        """What the readings support about a run, or with an empty id about the device; ``None`` for one they do not know."""
        if run_id not in self.run_ids:
            return None
        return Learned(*self.figures[self.run_ids.index(run_id)])


def diagnose(problems: Sequence[Problem], limits: Limits) -> list[Diagnosis]:
    """
    Judge circuits in batches of equal shape.

    Parameters
    ----------
    problems : sequence of Problem
        Of any shapes; one circuit is a batch of one.

    Returns
    -------
    list of Diagnosis
        In the order of the problems.
    """
    found: dict[int, Diagnosis] = {}
    of_each = [scales(problem) for problem in problems]
    every = [problem for several in of_each for problem in several]
    with _collector_paused():
        for batch in grouped(every):
            some = [every[number] for number in batch]
            judged = judge_block(shape_of(some[0].signature), some, limits)
            found |= dict(zip(batch, results(judged, some), strict=True))
    return whole(found, [len(several) for several in of_each])


@contextmanager
def _collector_paused() -> Iterator[None]:
    """Without the search for cycles: results hold none, and walking over all of them again costs a fifth of the time."""
    enabled = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if enabled:
            gc.enable()


def results(judged: Judged, problems: list[Problem]) -> list[Diagnosis]:
    """One diagnosis for each problem of a judged batch."""
    shape = judged.block.shape
    members = [judged.of_cause(cause) for cause in OTHERS]
    best = np.stack([np.array(ns)[judged.posterior[:, ns].argmax(axis=1)] for ns in members], axis=-1).tolist()
    posterior = np.concatenate(
        [
            judged.of_places,
            judged.posterior[:, judged.of_cause(SEMICONDUCTOR)],
            # a sum of shares may exceed 1 in its last digit
            *(judged.posterior[:, numbers].sum(axis=1, keepdims=True).clip(max=1.0) for numbers in members),
            judged.of_pair[:, None],
        ],
        axis=1,
    )
    order = np.argsort(-posterior, axis=1, kind="stable").tolist()
    shown, probabilities = (posterior > LEAST).sum(axis=1).tolist(), posterior.tolist()
    offsets = len(shape.places)
    others, both = offsets + len(shape.offsets), posterior.shape[1] - 1
    evidence, singles, doubles = judged.log_evidence.tolist(), _single(judged), _double(judged)
    figures, pairs_learned = learned(judged), together(judged, problems)
    words: dict[tuple[str, ...], Words] = {}
    found = []
    for number, problem in enumerate(problems):
        said = words.get(problem.names) or words.setdefault(problem.names, Words.of(shape, problem.names))
        rows = []
        for column in order[number][: shown[number]]:
            p = probabilities[number][column]
            if column < offsets:
                end = problem.ends[shape.places[column].branch]
                low, middle, high, heat = singles[number][column]
                rows.append(Place(BAD_CONNECTION, said.places[column], p, low, middle, high, heat, "", end))
            elif column < others:
                end = problem.ends[shape.offset_branch(column - offsets)]
                rows.append(Place(SEMICONDUCTOR, said.offsets[column - offsets], p, point=end))
            elif column < both:
                which = best[number][column - others]
                what = what_words(judged, number, which, problem) if p >= TOLD else ""
                rows.append(Place(OTHERS[column - others], "", p, what=what))
            else:
                rows.append(_both(doubles[number], said, [problem.ends[place.branch] for place in shape.places]))
        found.append(Diagnosis(tuple(rows), problem.run_ids, figures[number], pairs_learned[number], evidence[number]))
    return found


@dataclass(frozen=True, slots=True)
class Words:
    """Where causes are, for problems of one shape whose branches have the same names."""

    places: tuple[str, ...]
    offsets: tuple[str, ...]

    @classmethod
    def of(cls, shape: Shape, names: Sequence[str]) -> Words:
        return cls(
            tuple(where_words(shape, place, names) for place in range(len(shape.places))),
            tuple(offset_words(shape, place, names) for place in range(len(shape.offsets))),
        )


def _single(judged: Judged) -> list[list[list[float]]]:
    """For each problem and place that is shown: bounds and median of the extra resistance, probability of it being hot."""
    shape, of_places = judged.block.shape, judged.of_places
    shown = of_places > LEAST
    cumulative = judged.density[:, : len(shape.places)][shown].cumulative()
    with np.errstate(divide="ignore"):
        hot = np.log(judged.block.hot_ohm[:, [place.branch for place in shape.places]][shown])
    edges = cumulative.quantiles((1 - COVERED) / 2, 0.5, (1 + COVERED) / 2)
    said = np.zeros((*shown.shape, 4))
    said[shown] = np.stack([*np.exp(edges), of_places[shown] * cumulative.above(hot)], axis=-1)
    figures: list[list[list[float]]] = said.tolist()
    return figures


class Double(NamedTuple):
    """Bad connections at two places at once."""

    probability: float
    heat: float
    """Probability of it and of either being hot."""
    joints: list[list[float]]
    """Place, bounds and median of its extra resistance, probability of it being hot."""


def _double(judged: Judged) -> list[Double]:
    """The pair of each problem; nothing where no pair is told apart."""
    if not judged.pairs.hypotheses.names:
        return []
    places, ohm, u = judged.pairs.places, judged.pairs.ohm, judged.pairs.ohm_u
    branches = np.array([place.branch for place in judged.block.shape.places])[places]
    edge = np.take_along_axis(judged.block.hot_ohm, branches, axis=1)
    p = judged.of_pair
    hot = np.where(ohm > edge, 1.0, 0.0)
    for row in np.flatnonzero(p >= TOLD).tolist():
        hot[row] = [probability_above(*figures) for figures in zip(ohm[row], edge[row], u[row], strict=True)]
    either = p * (1 - (1 - hot).prod(axis=1))
    low, high = np.moveaxis(judged.pairs.bounds, -1, 0)
    columns = np.stack([places, low, ohm, high, p[:, None] * hot], axis=-1).tolist()
    return [Double(*row) for row in zip(p.tolist(), either.tolist(), columns, strict=True)]


def _both(double: Double, said: Words, ends: Sequence[str]) -> Place:
    """The row of two bad connections."""
    joints = tuple(
        Place(BAD_CONNECTION, said.places[int(n)], double.probability, low, middle, high, heat=hot, point=ends[int(n)])
        for n, low, middle, high, hot in double.joints
    )
    where = " and ".join(joint.where for joint in joints)
    return Place(BAD_CONNECTION, where, double.probability, heat=double.heat, joints=joints)


def where_words(shape: Shape, number: int, branches: Sequence[str]) -> str:
    """Where a bad connection is: ``run 2``, or ``run 2 end positive`` where the readings separate it."""
    place = shape.places[number]
    name = branches[place.branch]
    return name if place.whole else f"{name} {place_words(place.members)}"


def offset_words(shape: Shape, number: int, branches: Sequence[str]) -> str:
    """Where a semiconductor is: ``run 1``, or with its leg where the readings separate it."""
    places: dict[int, list[str]] = {}
    for branch, leg in shape.offsets[number]:
        places.setdefault(branch, []).append(leg)
    words = []
    for branch, legs in places.items():
        whole = len(legs) == sum(b == branch for members in shape.offsets for b, _ in members)
        words.append(branches[branch] if whole else f"{branches[branch]} {legs[0]}")
    return " or ".join(words)
