"""
Causes that hold for all conductors of a circuit alike: another size, another metal, another length.

Each is a factor on the resistance of the runs. A few are single values; a route of unknown length and a
parallel path are spread evenly over a range, along which the log evidence is so smooth that a polynomial
through a dozen Chebyshev nodes stands for it.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from rules.diagnosis.block import Block, Model, model_of, taken
from rules.diagnosis.conductors import ALTERNATIVES
from rules.diagnosis.gaussian import LOG_2PI, along, log_density
from rules.diagnosis.hypotheses import DOUBTFUL, LONGER, OTHER_METAL, SMALLER, Hypotheses, Hypothesis, normalised
from rules.diagnosis.shape import Floats

FEET_IN_A_METRE = 1 / 0.3048
CHEBYSHEV = 12
"""Nodes along a range of factors; with the general profile's doubts the error in log evidence stays below 1e-6."""
EVEN = 1e-12
"""Largest difference between the ratios of a circuit's conductors that counts as none."""
SUMMED = 128
"""Nodes of the sum over a range: a standard deviation of 2 % holds two of them."""

FACTORS = (
    Hypothesis(LONGER, "a loop entered as one way", (2,)),
    Hypothesis(LONGER, "feet entered as metres"),
    Hypothesis(DOUBTFUL, "length_as_loop"),
    Hypothesis(DOUBTFUL, "metres_for_feet"),
)
SINGLE_FACTORS = np.array([2.0, FEET_IN_A_METRE, 0.5, 0.3048])
"""Of ``FACTORS``: what the true length is over the recorded one."""


@dataclass(frozen=True, slots=True, eq=False)
class Range:
    """Nodes on a range of factors and what turns log evidences there into a mean over the range."""

    nodes: Floats
    """(CHEBYSHEV,)"""
    interpolation: Floats
    """(CHEBYSHEV, SUMMED)"""
    factors: Floats
    weights: Floats
    """(SUMMED,): the second sum to one."""


@lru_cache(maxsize=64)
def range_of(low: float, high: float) -> Range:
    """A range of factors, even over the factor itself."""
    angles = (2 * np.arange(CHEBYSHEV) + 1) / (2 * CHEBYSHEV) * np.pi
    places = np.cos(angles)
    centre, half = (np.log(high) + np.log(low)) / 2, (np.log(high) - np.log(low)) / 2
    nodes, weights = np.polynomial.legendre.leggauss(SUMMED)
    factors = low + (nodes + 1) / 2 * (high - low)
    apart = ((np.log(factors) - centre) / half)[None, :] - places[:, None]
    apart[apart == 0] = 1e-300
    barycentric = ((-1.0) ** np.arange(CHEBYSHEV) * np.sin(angles))[:, None] / apart
    return Range(np.exp(centre + half * places), barycentric / barycentric.sum(axis=0), factors, weights / 2)


@dataclass(frozen=True, slots=True, eq=False)
class ConductorCauses:
    """Hypotheses about all conductors, with what they say of the resistance of each run."""

    hypotheses: Hypotheses
    factor: Floats
    """(b, h, branches): mean of a run's conductor resistance over the recorded one, given the hypothesis."""
    factor_square: Floats
    """(b, h, branches): mean of its square."""


def conductor_causes(block: Block, recorded: Model) -> ConductorCauses:
    """
    Smaller conductor, other metal, longer route, and what a record of too much resistance may be.

    Parameters
    ----------
    recorded : Model
        With everything as recorded: (b, 1, …).
    """
    limits = block.limits
    spread = (
        range_of(limits["longer_route.low_factor"], limits["longer_route.high_factor"]),
        range_of(limits["slip.parallel_low"], limits["slip.parallel_high"]),
    )
    single = np.concatenate([SINGLE_FACTORS, *(part.nodes for part in spread)])
    ratio = ratios_of(block)
    count, branches = len(ALTERNATIVES), len(block.shape.signature.branches)
    read = ratio[:, :, block.shape.reached[block.shape.element_branch[block.shape.conductors]]]
    lowest, highest = read.min(axis=2, initial=np.inf), read.max(axis=2, initial=0.0)
    alike = np.where(read.shape[2] > 0, highest, 1.0)
    factors = np.concatenate([alike, np.broadcast_to(single, (len(block), len(single)))], axis=1)
    found = _along_factor(block, recorded, factors)
    uneven = (highest - lowest).max(axis=1) > EVEN
    if uneven.any():
        some, of_some = taken(block, uneven), ratio[uneven]
        model = model_of(some, some.conductor[:, None] * of_some, some.conductor_slope[:, None] * of_some)
        found[uneven, :count] = log_density(some.shown[:, None] - model.whole_mean, model.covariance)
    split = count + len(SINGLE_FACTORS)
    names = (*_ALTERNATIVE_NAMES, *FACTORS, Hypothesis(LONGER, "a longer way"), Hypothesis(DOUBTFUL, "parallel_path"))
    evidence = np.empty((len(block), len(names)))
    mean = np.ones((len(block), len(names), branches))
    square = np.ones((len(block), len(names), branches))
    evidence[:, :split] = found[:, :split]
    mean[:, :count] = _of_runs(block, ratio)
    mean[:, count:split] = SINGLE_FACTORS[:, None]
    square[:, :split] = mean[:, :split] ** 2
    for number, part in enumerate(spread):
        start = split + number * CHEBYSHEV
        summed = _summed(found[:, start : start + CHEBYSHEV], part)
        evidence[:, split + number] = summed[0]
        mean[:, split + number], square[:, split + number] = summed[1][:, None], summed[2][:, None]
    return ConductorCauses(Hypotheses(names, _shares(block, names), evidence), mean, square)


def _along_factor(block: Block, recorded: Model, factors: Floats) -> Floats:
    """Log density (b, f) where all conductors have a factor (b, f) times their resistance."""
    shared, conductor_shared = recorded.shared[:, 0], recorded.conductor_shared[:, 0]
    mixed = shared @ np.swapaxes(conductor_shared, 1, 2)
    matrix = (
        recorded.own[:, 0] + shared @ np.swapaxes(shared, 1, 2),
        mixed + np.swapaxes(mixed, 1, 2),
        recorded.conductor_own[:, 0] + conductor_shared @ np.swapaxes(conductor_shared, 1, 2),
    )
    residual = block.shown - recorded.mean[:, 0]
    vector = (residual, -recorded.conductor_mean[:, 0])
    log_scale, quadratic = along(factors, matrix, vector)
    return -0.5 * (quadratic + log_scale + block.shape.rows * LOG_2PI)


_ALTERNATIVE_NAMES = tuple(
    Hypothesis(cause, what)
    for cause, what in zip((SMALLER, SMALLER, OTHER_METAL, OTHER_METAL, DOUBTFUL, DOUBTFUL), ALTERNATIVES, strict=True)
)


def ratios_of(block: Block) -> Floats:
    """(b, alternatives, e of conductors): resistance over the recorded one; 1 where there is none to compare."""
    recorded = np.broadcast_to(block.conductor[:, None], block.alternatives.shape)
    there = (block.alternatives > 0) & (recorded > 0)
    return np.divide(block.alternatives, recorded, out=np.ones_like(block.alternatives), where=there)


def _of_runs(block: Block, per_element: Floats) -> Floats:
    """(b, h, branches): factor of each run, its legs together; 1 for the device."""
    weight = block.conductor @ block.shape.run_of.T
    total = (per_element * block.conductor[:, None]) @ block.shape.run_of.T
    return np.divide(total, weight[:, None], out=np.ones_like(total), where=weight[:, None] > 0)


def _summed(found: Floats, part: Range) -> tuple[Floats, Floats, Floats]:
    """Log evidence of a range, and the first two moments of its factor (b,)."""
    along = found @ part.interpolation
    best = along.max(axis=1)
    density = np.exp(along - best[:, None]) * part.weights
    total = density.sum(axis=1)
    mean, square = (density @ part.factors) / total, (density @ part.factors**2) / total
    return best + np.log(total), mean, square


def _shares(block: Block, names: tuple[Hypothesis, ...]) -> Floats:
    """Share of each hypothesis of its cause's weight; those of a doubtful record as they stand in the profile."""
    limits = block.limits
    share = np.zeros((len(block), len(names)))
    possible = block.possible
    share[:, 0:2] = normalised(possible[:, 0:2])
    metals = np.array([limits["other_metal.copper_clad_aluminium"], limits["other_metal.aluminium"]])
    share[:, 2:4] = normalised(possible[:, 2:4] * metals)
    share[:, 4:6] = limits["doubtful.larger_conductor"] * normalised(possible[:, 4:6])
    for number, name in enumerate(names[6:], 6):
        share[:, number] = 1 / 3 if name.cause == LONGER else limits[f"doubtful.{name.what}"]
    return share
