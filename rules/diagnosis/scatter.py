"""
A source's wander that few repeated readings show: judged at several scales, each as probable as the readings make it.

The standard deviation of three readings is a tenth of the true one in one case of a hundred. Put in as it is, or widened
alike for all, it makes faults of healthy circuits. With a flat prior over its logarithm the true variance is that of
the readings times ``f / chi-squared(f)``: a handful of its quantiles stand for it.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

from rules.assessment import Place
from rules.calc.doubt import few_readings_factor
from rules.diagnosis.problem import Problem

if TYPE_CHECKING:
    from rules.diagnosis.diagnose import Diagnosis

QUANTILES = (0.004, 0.03, 0.12, 0.35, 0.65, 0.9)
"""Of chi-squared, in the middle of each share of ``WEIGHTS``."""
WEIGHTS = (0.01, 0.05, 0.14, 0.30, 0.30, 0.20)
RATIOS = (
    (39788, 707.02, 43.876, 4.8567, 1.1449, 0.36961),
    (249.5, 32.831, 7.8227, 2.3214, 0.95254, 0.43429),
    (48.635, 12.24, 4.4709, 1.8275, 0.91377, 0.47989),
    (21.686, 7.4759, 3.3658, 1.6194, 0.90137, 0.51418),
    (13.347, 5.5368, 2.8253, 1.5037, 0.89717, 0.54134),
    (9.6269, 4.5126, 2.5049, 1.4295, 0.89622, 0.56366),
    (7.5979, 3.8854, 2.2924, 1.3775, 0.89673, 0.58251),
    (6.3433, 3.4631, 2.1405, 1.3388, 0.89793, 0.59873),
    (5.4989, 3.1596, 2.0262, 1.3088, 0.89946, 0.61293),
    (4.8948, 2.9308, 1.9367, 1.2848, 0.90113, 0.6255),
)
"""True variance over that of the readings at ``QUANTILES``, for 1 to 10 degrees of freedom; computed."""


def scales(problem: Problem) -> list[Problem]:
    """A problem at each scale of its wander, in the order of ``WEIGHTS``; alone where its wander is known well enough."""
    freedom = problem.wander_freedom
    if not 0 < freedom <= len(RATIOS):
        return [problem]
    taken = few_readings_factor(freedom) ** 2
    return [
        replace(
            problem,
            variance=tuple(v + w * (ratio / taken - 1) for v, w in zip(problem.variance, problem.wander, strict=True)),
        )
        for ratio in RATIOS[freedom - 1]
    ]


def mixed(diagnoses: Sequence[Diagnosis]) -> Diagnosis:
    """
    Diagnoses of one problem at each scale as one: probabilities, heat and what was learned are means; a size with its
    bounds, and what cannot be averaged, come from the scale that says most of it.
    """
    if len(diagnoses) == 1:
        return diagnoses[0]
    joint = [math.log(weight) + one.log_evidence for weight, one in zip(WEIGHTS, diagnoses, strict=True)]
    best = max(joint)
    weights = [math.exp(value - best) for value in joint]
    total = math.fsum(weights)
    weights = [weight / total for weight in weights]
    rows: dict[tuple[str, str], list[tuple[float, Place]]] = {}
    for weight, one in zip(weights, diagnoses, strict=True):
        for row in one.causes:
            rows.setdefault((row.cause, row.where), []).append((weight, row))
    causes = sorted((_row(parts) for parts in rows.values()), key=lambda row: -row.probability)
    heaviest = diagnoses[weights.index(max(weights))]
    figures = [
        _figures([(weight, one.figures[branch]) for weight, one in zip(weights, diagnoses, strict=True)])
        for branch in range(len(heaviest.figures))
    ]
    return replace(heaviest, causes=tuple(causes), figures=tuple(figures), log_evidence=best + math.log(total))


def _row(parts: Sequence[tuple[float, Place]]) -> Place:
    most = max(parts, key=lambda part: part[0] * part[1].probability)[1]
    probability = math.fsum(weight * row.probability for weight, row in parts)
    heats = [weight * row.heat for weight, row in parts if row.heat is not None]
    share = probability / most.probability if most.probability > 0 else 0.0
    return most._replace(
        probability=probability,
        heat=math.fsum(heats) if heats else None,
        joints=tuple(_scaled(joint, probability, share) for joint in most.joints),
    )


def _scaled(joint: Place, probability: float, share: float) -> Place:
    return joint._replace(probability=probability, heat=None if joint.heat is None else joint.heat * share)


def _figures(parts: Sequence[tuple[float, Sequence[float]]]) -> tuple[float, ...]:
    """Means and standard deviations, one behind the other, of a mixture."""
    out: list[float] = []
    for place in range(0, len(parts[0][1]), 2):
        mean = math.fsum(weight * row[place] for weight, row in parts)
        square = math.fsum(weight * (row[place + 1] ** 2 + (row[place] - mean) ** 2) for weight, row in parts)
        out += [mean, math.sqrt(square)]
    return tuple(out)


def whole(found: Mapping[int, Diagnosis], counts: Sequence[int]) -> list[Diagnosis]:
    """One diagnosis a problem, of ``counts`` scales each, one behind the other."""
    out, first = [], 0
    for count in counts:
        out.append(mixed([found[number] for number in range(first, first + count)]))
        first += count
    return out
