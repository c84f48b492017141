"""
Bad connections at two places at once, as far as the readings separate the places.

With two resistances the mean moves in a plane, so that the best pair of sizes follows from a few scalars. The pair
that explains most is looked at again with the covariance that its resistances bring; where it is not negligible,
both sizes are then summed over, one within the other.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, fields, replace

import numpy as np
from numpy.typing import NDArray

from rules.diagnosis.block import Block, Model, model_of
from rules.diagnosis.extra import ranges
from rules.diagnosis.gaussian import Whitener, whitener
from rules.diagnosis.hypotheses import BAD_CONNECTION, Hypotheses, Hypothesis
from rules.diagnosis.quadrature import KEPT, UNIT_NODES, UNIT_WEIGHTS, Density, integrated
from rules.diagnosis.shape import Floats, Integers

TWO_PLACES = "two places"
AGAIN = 3
"""How often the best pair is looked at with the covariance of its sizes: they have then settled."""
MATTERS = 7.0
"""Natural logarithms below the best hypothesis from which a pair is summed over properly."""


@dataclass(frozen=True, slots=True, eq=False)
class Plane:
    """Log density of the rows over two resistances: a quadratic about a point. Arrays (b, ...)."""

    at: Floats
    """(b, 2): the point, above zero. [ohm]"""
    pull: Floats
    """(b, 2): slope there. [1/ohm]"""
    curve: Floats
    """(b, 2, 2): less its second derivatives. [1/ohm²]"""
    log_density: Floats
    """(b,): at the point."""
    low: Floats
    high: Floats
    """(b, 2): ranges of the logarithms of both."""

    def within(self, first: int) -> Density:
        """The density of one of the two resistances, the other summed over."""
        second = 1 - first
        order = [first, second]
        curve, pull = self.curve[:, order][:, :, order], self.pull[:, order]
        low, high = (np.exp(edge[:, second]) - self.at[:, second] for edge in (self.low, self.high))
        width = (self.high - self.low)[:, second]
        bend = np.maximum(curve[:, 1, 1], 1e-300)

        def given(coordinate: Floats, which: Integers) -> Floats:
            """Log density with the one at some sizes (k, nodes), the other summed over."""
            column = (which, None)
            x, at = np.exp(coordinate) - self.at[:, first][column], self.at[:, second][column]
            slope = pull[:, 1][column] - curve[:, 0, 1][column] * x
            # along the other the log density is a parabola: where it matters is known without looking
            top = slope / bend[column]
            best = np.clip(top, low[column], high[column])
            reach = np.sqrt((best - top) ** 2 + 2 * KEPT / bend[column])
            start = np.log(np.maximum(top - reach, low[column]) + at)
            span = np.log(np.minimum(top + reach, high[column]) + at) - start
            apart = np.exp(start[..., None] + span[..., None] * UNIT_NODES) - (at + top)[..., None]
            apart *= apart
            apart -= ((best - top) ** 2)[..., None]
            apart *= -0.5 * bend[which, None, None]
            total = (np.exp(apart, out=apart) @ UNIT_WEIGHTS) * span / width[column]
            of_one = x * (pull[:, 0][column] - 0.5 * curve[:, 0, 0][column] * x)
            found: Floats = of_one + best * (slope - 0.5 * bend[column] * best) + np.log(total)
            return found

        return integrated(given, self.low[:, first], self.high[:, first])


@dataclass(frozen=True, slots=True, eq=False)
class Pairs:
    """The best pair of each problem; none where there are not two places to tell apart."""

    hypotheses: Hypotheses
    places: Integers
    """(b, 2)"""
    plane: Plane | None
    log_weight: Floats
    """(b,): log of the pair's share among all pairs."""
    ohm: Floats
    """(b, 2): medians of both extra resistances where they were summed over, else the best. [ohm]"""
    ohm_u: Floats
    """(b, 2): standard deviations. [ohm]"""
    bounds: Floats
    """(b, 2, 2): of each, the central 95 %. [ohm]"""


def pairs(block: Block, recorded: Model, white: Whitener) -> Pairs:
    """
    Evidence of bad connections at two places, by Laplace's approximation.

    Parameters
    ----------
    recorded : Model
        With everything as recorded: (b, 1, …).
    white : Whitener
        Of its covariance: (b, …).
    """
    shape, size = block.shape, len(block)
    count = len(shape.places)
    if count < 2:
        none = np.zeros((size, 0))
        zeros = np.zeros((size, 2))
        nothing = Hypotheses((), none, none)
        return Pairs(nothing, zeros.astype(np.int64), None, none, zeros, zeros, np.zeros((size, 2, 2)))
    first, second = np.triu_indices(count, 1)
    share = np.array([place.share for place in shape.places])
    weight = share[first] * share[second] / (share[first] * share[second]).sum()
    through = block.carried[:, 0][..., shape.place_element]
    residual = block.shown - recorded.whole_mean[:, 0]
    gram = _gram(white, residual, through)
    curve, pull = gram[:, 1:, 1:], gram[:, 0, 1:]
    ohm, gain = _best(
        curve[:, first, first], curve[:, first, second], curve[:, second, second], pull[:, first], pull[:, second]
    )
    low, high = (edge[:, :count] for edge in ranges(block))
    largest = np.exp(np.stack([high[:, first], high[:, second]]))
    inside: NDArray[np.bool_] = np.all((ohm > 0) & (ohm <= largest), axis=0)
    best = np.where(inside, gain + np.log(weight), -np.inf).argmax(axis=1)
    rows = np.arange(size)
    chosen = np.stack([first[best], second[best]], axis=1)
    edges = [np.take_along_axis(edge, chosen, axis=1) for edge in (low, high)]
    start = np.clip(ohm[:, rows, best].T, *(np.exp(edge) for edge in edges))
    plane = _plane(block, chosen, start, *edges)
    for _ in range(AGAIN - 1):
        moved, _ = _best(
            plane.curve[:, 0, 0], plane.curve[:, 0, 1], plane.curve[:, 1, 1], plane.pull[:, 0], plane.pull[:, 1]
        )
        plane = _plane(block, chosen, np.clip(plane.at + moved.T, *(np.exp(edge) for edge in edges)), *edges)
    sd = 1 / np.sqrt(np.maximum(np.diagonal(plane.curve, axis1=1, axis2=2), 1e-300))
    # the share of a range that a resistance leaves open is at most all of it
    open_ = np.minimum(np.log(math.sqrt(2 * math.pi) * sd / plane.at / (edges[1] - edges[0])), 0.0).sum(axis=1)
    log_weight = np.log(weight[best])
    evidence = plane.log_density + open_ + log_weight
    possible = inside[rows, best]
    hypotheses = Hypotheses(
        (Hypothesis(BAD_CONNECTION, TWO_PLACES),),
        np.where(possible, block.limits["bad_connection.two_share"], 0.0)[:, None],
        np.where(possible, evidence, 0.0)[:, None],
    )
    return Pairs(hypotheses, chosen, plane, log_weight, plane.at, sd, np.stack([plane.at] * 2, axis=-1))


def summed(found: Pairs, some: Integers) -> tuple[Floats, Pairs]:
    """
    The same with both resistances summed over in some problems.

    Returns
    -------
    array (some,)
        What it adds to their log evidence.
    Pairs
        With medians, standard deviations and bounds there.
    """
    plane = found.plane
    if plane is None or not len(some):
        return np.zeros(len(some)), found
    part = Plane(*(getattr(plane, entry.name)[some] for entry in fields(Plane)))
    densities = [part.within(0), part.within(1)]
    evidence = part.log_density + densities[0].log_evidence + found.log_weight[some]
    ohm, u, bounds = found.ohm.copy(), found.ohm_u.copy(), found.bounds.copy()
    for number, density in enumerate(densities):
        mean, square = density.moments(np.exp)
        low, middle, high = (np.exp(edge) for edge in density.cumulative().quantiles(0.025, 0.5, 0.975))
        ohm[some, number] = middle
        u[some, number] = np.sqrt(np.maximum(square - mean**2, 0.0))
        bounds[some, number] = np.stack([low, high], axis=-1)
    return evidence - found.hypotheses.log_evidence[some, 0], replace(found, ohm=ohm, ohm_u=u, bounds=bounds)


def _best(aa: Floats, ab: Floats, bb: Floats, a: Floats, b: Floats) -> tuple[Floats, Floats]:
    """Sizes (2, ...) at which a quadratic is highest, and what they gain in log density."""
    determinant = aa * bb - ab**2
    known = determinant > 1e-12 * aa * bb
    safe = np.where(known, determinant, 1.0)
    sizes = np.where(known, np.stack([bb * a - ab * b, aa * b - ab * a]) / safe, 0.0)
    return sizes, 0.5 * (a * sizes[0] + b * sizes[1])


def _plane(block: Block, chosen: Integers, ohm: Floats, low: Floats, high: Floats) -> Plane:
    """The plane of one pair a problem about some sizes (b, 2), with the covariance that these bring."""
    shape = block.shape
    rows = np.arange(len(block))[:, None]
    elements = shape.place_element[chosen]
    others = block.others.copy()
    np.add.at(others, (rows, elements - shape.conductors.stop), ohm)
    model = model_of(replace(block, others=others), block.conductor[:, None], block.conductor_slope[:, None])
    through = np.take_along_axis(block.carried[:, 0], elements[:, None, :], axis=2)
    residual = block.shown - model.whole_mean[:, 0]
    white = whitener(model.covariance[:, 0])
    gram = _gram(white, residual, through)
    density = white.log_scale - 0.5 * gram[:, 0, 0]
    return Plane(ohm, gram[:, 0, 1:], gram[:, 1:, 1:], density, low, high)


def _gram(white: Whitener, residual: Floats, through: Floats) -> Floats:
    """Inner products (b, 1 + k, 1 + k) of the residual (b, n) and some directions (b, n, k)."""
    whitened = white.inverse @ np.concatenate([residual[..., None], through], axis=-1)
    found: Floats = np.swapaxes(whitened, 1, 2) @ whitened
    return found
