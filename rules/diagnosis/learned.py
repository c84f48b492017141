"""What the readings support about each branch, over all causes: extra resistance, another conductor, an offset."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from rules.diagnosis.hypotheses import SEMICONDUCTOR
from rules.diagnosis.judge import Judged
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import Floats

NOTHING = 1e-15
"""Mean product of two resistances that no voltage would feel. [ohm²]"""


@dataclass(frozen=True, slots=True)
class Learned:
    """Posterior means over all causes about one branch, with standard deviations."""

    extra_ohm: float
    extra_u: float
    factor: float
    """Resistance of the conductors over the recorded one."""
    factor_u: float
    offset_v: float
    """Lost in a semiconductor at its start."""
    offset_u: float


@dataclass(frozen=True, slots=True)
class Together:
    """Two extra resistances that hold at the same time."""

    run_ids: tuple[str, str]
    """Empty for the device."""
    mean_product: float
    """Probability times the product of both. [ohm²]"""


def learned(judged: Judged) -> list[tuple[tuple[float, ...], ...]]:
    """By problem and branch: the fields of ``Learned``."""
    figures = np.stack([*_extra(judged), *_factor(judged), *_offset(judged)], axis=-1)
    return [tuple(map(tuple, of_branches)) for of_branches in figures.tolist()]


def _extra(judged: Judged) -> tuple[Floats, Floats]:
    """Mean and standard deviation of the extra resistance of each branch (b, branches)."""
    shape, size = judged.block.shape, len(judged.block)
    count = len(shape.places)
    at = np.zeros((count, len(shape.signature.branches)))
    at[np.arange(count), [place.branch for place in shape.places]] = 1.0
    mean, square = ((judged.of_places * moment) @ at for moment in judged.density[:, :count].moments(np.exp))
    if judged.pairs.hypotheses.names:
        rows = np.arange(size)[:, None]
        branches = np.array([place.branch for place in shape.places])[judged.pairs.places]
        ohm, u = judged.pairs.ohm, judged.pairs.ohm_u
        np.add.at(mean, (rows, branches), judged.of_pair[:, None] * ohm)
        np.add.at(square, (rows, branches), judged.of_pair[:, None] * (ohm**2 + u**2))
    return mean, _spread(square, mean)


def _factor(judged: Judged) -> tuple[Floats, Floats]:
    """Mean and standard deviation of the conductors' factor (b, branches)."""
    names = judged.conductors.hypotheses.names
    first = judged.hypotheses.names.index(names[0])
    weight = judged.posterior[:, first : first + len(names), None]
    change = (weight * (judged.conductors.factor - 1)).sum(axis=1)
    square = (weight * (judged.conductors.factor_square - 2 * judged.conductors.factor + 1)).sum(axis=1)
    return 1 + change, _spread(square, change)


def _offset(judged: Judged) -> tuple[Floats, Floats]:
    """Mean and standard deviation of the voltage lost in a semiconductor (b, branches)."""
    shape = judged.block.shape
    count, offsets = len(shape.places), range(len(shape.offsets))
    start = np.zeros((len(shape.offsets), len(shape.signature.branches)))
    start[offsets, [shape.offset_branch(number) for number in offsets]] = 1.0
    of_offsets = judged.posterior[:, judged.of_cause(SEMICONDUCTOR)]
    # the coordinate of an offset is the voltage itself
    mean, square = ((of_offsets * moment) @ start for moment in judged.density[:, count:].moments(lambda u: u))
    return mean, _spread(square, mean)


def together(judged: Judged, problems: list[Problem]) -> list[Together | None]:
    """The pair of each problem; ``None`` where the readings do not tell two places apart."""
    if not judged.pairs.hypotheses.names:
        return [None] * len(problems)
    products = (judged.of_pair * judged.pairs.ohm.prod(axis=1)).tolist()
    branches = [place.branch for place in judged.block.shape.places]
    return [
        Together((problem.run_ids[branches[first]], problem.run_ids[branches[second]]), product)
        if product > NOTHING
        else None
        for problem, (first, second), product in zip(problems, judged.pairs.places.tolist(), products, strict=True)
    ]


def _spread(square: Floats, mean: Floats) -> Floats:
    found: Floats = np.sqrt(np.maximum(square - mean**2, 0.0))
    return found
