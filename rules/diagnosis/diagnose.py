"""
The diagnosis of circuits: what is probably wrong, where and how much, in batches of equal shape.

``diagnose`` is what the rest of ``rules`` calls; how a batch is judged stands in ``judge``.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from rules.assessment import Place
from rules.diagnosis.hypotheses import BAD_CONNECTION, CAUSES, SEMICONDUCTOR
from rules.diagnosis.judge import Judged, grouped, judge_block
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import Floats, Shape, place_words, shape_of
from rules.diagnosis.words import what_words
from rules.limits import Limits

TOLD = 1e-3
"""Probability of a cause from which its most probable way is put into words."""
COVERED = 0.95
"""Share of a place's posterior between the bounds of its extra resistance."""


@dataclass(frozen=True, slots=True)
class Learned:
    """What the readings support about one branch, over all causes: means with standard deviations."""

    extra_ohm: float
    extra_u: float
    factor: float
    """Resistance of the conductors over the recorded one."""
    factor_u: float
    offset_v: float
    """Lost in a semiconductor at its start."""
    offset_u: float


@dataclass(frozen=True, slots=True)
class Diagnosis:
    """What is probably wrong with one circuit, where and how much."""

    causes: tuple[Place, ...]
    """Highest first; the probabilities sum to one."""
    learned: tuple[tuple[str, Learned], ...]
    """By id of the run; empty for the device."""
    log_evidence: float

    def probability(self, cause: str) -> float:
        """Of a cause, its places together."""
        return sum(place.probability for place in self.causes if place.cause == cause)

    def of_branch(self, run_id: str) -> Learned | None:
        """What the readings support about a run, or with an empty id about the device; ``None`` for one they do not know."""
        return next((learned for branch, learned in self.learned if branch == run_id), None)


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
    for batch in grouped(problems):
        some = [problems[number] for number in batch]
        judged = judge_block(shape_of(some[0].signature), some, limits)
        found |= dict(zip(batch, results(judged, some), strict=True))
    return [found[number] for number in range(len(problems))]


def results(judged: Judged, problems: Sequence[Problem]) -> list[Diagnosis]:
    """One diagnosis for each problem of a judged batch."""
    shape = judged.block.shape
    places = len(shape.places)
    of_places = judged.posterior[:, judged.of_cause(BAD_CONNECTION)]
    of_offsets = judged.posterior[:, judged.of_cause(SEMICONDUCTOR)]
    sizes = [
        np.exp(judged.density.quantile(share)[:, :places]) for share in ((1 - COVERED) / 2, 0.5, (1 + COVERED) / 2)
    ]
    with np.errstate(divide="ignore"):
        hot = np.log(judged.block.hot_ohm[:, [place.branch for place in shape.places]])
    edge = np.concatenate([hot, np.full((len(problems), len(shape.offsets)), np.inf)], axis=1)
    heat = judged.density.above(edge)[:, :places]
    columns = np.stack([of_places, *sizes, heat], axis=-1).tolist()
    others = [cause for cause in CAUSES if cause not in (BAD_CONNECTION, SEMICONDUCTOR)]
    members = [judged.of_cause(cause) for cause in others]
    sums = np.stack([judged.posterior[:, numbers].sum(axis=1) for numbers in members], axis=-1).tolist()
    best = np.stack([np.array(ns)[judged.posterior[:, ns].argmax(axis=1)] for ns in members], axis=-1).tolist()
    offsets, learned = of_offsets.tolist(), _learned(judged, of_places, of_offsets)
    evidence = judged.log_evidence.tolist()
    found = []
    for number, problem in enumerate(problems):
        branches = problem.names
        rows = [
            Place(
                BAD_CONNECTION,
                where_words(shape, place, branches),
                p,
                low,
                middle,
                high,
                heat=p * hotter,
                point=problem.ends[shape.places[place].branch],
            )
            for place, (p, low, middle, high, hotter) in enumerate(columns[number])
        ]
        rows += [
            Place(
                SEMICONDUCTOR,
                offset_words(shape, place, branches),
                p,
                point=problem.ends[shape.offset_branch(place)],
            )
            for place, p in enumerate(offsets[number])
        ]
        rows += [
            Place(cause, "", p, what=what_words(judged, number, which, problem) if p >= TOLD else "")
            for cause, p, which in zip(others, sums[number], best[number], strict=True)
        ]
        rows = [row for row in rows if row.probability > 0]
        rows.sort(key=lambda row: -row.probability)
        said = tuple(zip(problem.run_ids, (Learned(*figures) for figures in learned[number]), strict=True))
        found.append(Diagnosis(tuple(rows), said, evidence[number]))
    return found


def _learned(judged: Judged, of_places: Floats, of_offsets: Floats) -> list[list[list[float]]]:
    """For each problem and branch: mean and standard deviation of extra resistance, factor and offset."""
    shape, places = judged.block.shape, len(judged.block.shape.places)
    branches = len(shape.signature.branches)
    at = np.zeros((places, branches))
    at[np.arange(places), [place.branch for place in shape.places]] = 1.0
    extra = (of_places * judged.density.mean(np.exp)[:, :places]) @ at
    extra_square = (of_places * judged.density.mean(lambda u: np.exp(2 * u))[:, :places]) @ at
    # the offsets' coordinate is the voltage itself
    start = np.zeros((len(shape.offsets), branches))
    start[np.arange(len(shape.offsets)), [shape.offset_branch(n) for n in range(len(shape.offsets))]] = 1.0
    offset = (of_offsets * judged.density.mean(lambda u: u)[:, places:]) @ start
    offset_square = (of_offsets * judged.density.mean(lambda u: u**2)[:, places:]) @ start
    first = 1 + places + len(shape.offsets)
    weight = judged.posterior[:, first : first + len(judged.conductors.hypotheses.names), None]
    change = judged.conductors.factor - 1
    factor = (weight * change).sum(axis=1)
    factor_square = (weight * (judged.conductors.factor_square - 2 * judged.conductors.factor + 1)).sum(axis=1)

    def spread(square: Floats, mean: Floats) -> Floats:
        return np.sqrt(np.maximum(square - mean**2, 0.0))

    figures = [
        extra,
        spread(extra_square, extra),
        1 + factor,
        spread(factor_square, factor),
        offset,
        spread(offset_square, offset),
    ]
    said: list[list[list[float]]] = np.stack(figures, axis=-1).tolist()
    return said


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
