"""
Integrals over the size of a cause: where the density is, its sum, its moments and its quantiles.

A size is drawn evenly over its coordinate: the logarithm of a resistance, an offset in volts. Readings may be
so sharp that the density is thousands of times narrower than the range, so it is looked for in steps that
each keep what matters, and summed with Gauss-Legendre nodes over what is left.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from rules.diagnosis.shape import Floats, Integers

Chosen: TypeAlias = NDArray[np.bool_] | tuple[slice, ...]
"""Which of several densities."""
LogDensity: TypeAlias = Callable[[Floats, Integers], Floats]
"""From coordinates (k, nodes) of some densities, and which they are (k,), to log densities (k, nodes)."""

SEARCHED = 12
"""Nodes of each step of the search."""
STEPS = 9
"""More than any density needs that floats can hold."""
ENOUGH = 5
"""Kept nodes with which the search has found the density: it then spans at most 14 standard deviations."""
KEPT = 16.0
"""Natural logarithms below the best within which a node is kept, with one neighbour on each side."""
NODES = 32
"""Gauss-Legendre nodes of the sum."""
FINE = 64
"""Steps in which the cumulative density is laid out."""


def _legendre() -> tuple[Floats, Floats, Floats, Floats]:
    """
    Nodes and weights on 0 to 1, and what turns densities at them into the density at each fine step and its
    integral up to there.
    """
    nodes, weights = np.polynomial.legendre.leggauss(NODES)
    # discrete orthogonality gives the coefficients of the interpolating series without solving
    series = (np.polynomial.legendre.legvander(nodes, NODES - 1) * weights[:, None]).T
    series *= (2 * np.arange(NODES)[:, None] + 1) / 2
    basis = np.polynomial.legendre.legvander(2 * UNIT_STEPS - 1, NODES)
    integral = np.empty((FINE + 1, NODES))
    integral[:, 0] = UNIT_STEPS
    for order in range(1, NODES):
        integral[:, order] = (basis[:, order + 1] - basis[:, order - 1]) / (2 * (2 * order + 1))
    return (nodes + 1) / 2, weights / 2, (basis[:, :NODES] @ series).T, (integral @ series).T


UNIT_STEPS = np.linspace(0, 1, FINE + 1)
UNIT_NODES, UNIT_WEIGHTS, AT_STEPS, BELOW_STEPS = _legendre()


@dataclass(frozen=True, slots=True, eq=False)
class Density:
    """The normalised density of a size, given its cause: arrays (...) and (..., nodes) over the coordinate."""

    low: Floats
    """Where what matters begins."""
    width: Floats
    log_evidence: Floats
    """Log of the mean of the likelihood over the size's range."""
    share: Floats
    """(..., nodes): probability that each node stands for."""

    @property
    def nodes(self) -> Floats:
        return self.low[..., None] + self.width[..., None] * UNIT_NODES

    def __getitem__(self, some: Chosen) -> Density:
        """Some of the densities."""
        return Density(self.low[some], self.width[some], self.log_evidence[some], self.share[some])

    def shaped(self, *shape: int) -> Density:
        """The same densities in an array of another shape."""
        low, width, evidence = (array.reshape(shape) for array in (self.low, self.width, self.log_evidence))
        return Density(low, width, evidence, self.share.reshape(*shape, NODES))

    def transposed(self) -> Density:
        """The same densities, their first two axes in the other order."""
        low, width, evidence = (array.T for array in (self.low, self.width, self.log_evidence))
        return Density(low, width, evidence, np.swapaxes(self.share, 0, 1))

    def cumulative(self) -> Cumulative:
        """The probability below each of some fine steps over what matters."""
        density = self.share / UNIT_WEIGHTS
        below = np.maximum.accumulate(np.clip(density @ BELOW_STEPS, 0.0, 1.0), axis=-1)
        below[..., -1] = 1.0
        return Cumulative(self.low, self.width, below, density @ AT_STEPS / FINE)

    def moments(self, of: Callable[[Floats], Floats]) -> tuple[Floats, Floats]:
        """Mean (...) of a function of the coordinate, and of its square."""
        values = of(self.nodes)
        mean = np.einsum("...n,...n->...", self.share, values)
        values *= values
        return mean, np.einsum("...n,...n->...", self.share, values)


@dataclass(frozen=True, slots=True, eq=False)
class Cumulative:
    """A density laid out in steps: between two of them the cubic that has its values and slopes there."""

    low: Floats
    width: Floats
    below: Floats
    """(..., fine steps): probability below each; it never falls."""
    slopes: Floats
    """(..., fine steps): probability a step."""

    def quantiles(self, *shares: float) -> list[Floats]:
        """The coordinates (...) below which these shares of the probability lie."""
        found = []
        for share in shares:
            step = np.clip((self.below <= share).sum(axis=-1) - 1, 0, FINE - 1)[..., None]
            here = np.take_along_axis(self.below, step, axis=-1)[..., 0]
            rise = np.maximum(np.take_along_axis(self.below, step + 1, axis=-1)[..., 0] - here, 1e-300)
            start = np.take_along_axis(self.slopes, step, axis=-1)[..., 0] / rise
            end = np.take_along_axis(self.slopes, step + 1, axis=-1)[..., 0] / rise
            place = step[..., 0] + _along((share - here) / rise, start, end)
            found.append(self.low + self.width * place / FINE)
        return found

    def above(self, coordinate: Floats) -> Floats:
        """Probability (...) that the size lies above a coordinate (...)."""
        place = np.nan_to_num((coordinate - self.low) / self.width * FINE, neginf=0.0, posinf=FINE)
        step = np.clip(np.floor(place), 0, FINE - 1).astype(np.int64)[..., None]
        here = np.take_along_axis(self.below, step, axis=-1)[..., 0]
        rise = np.take_along_axis(self.below, step + 1, axis=-1)[..., 0] - here
        found: Floats = 1 - (here + rise * np.clip(place - step[..., 0], 0.0, 1.0))
        return found


def _along(wanted: Floats, start: Floats, end: Floats) -> Floats:
    """Where between two steps a cubic with these end slopes reaches a share of the rise between them."""
    place = wanted
    for _ in range(4):
        rise = place * (start + place * ((3 - 2 * start - end) + place * (start + end - 2)))
        slope = start + place * (2 * (3 - 2 * start - end) + 3 * place * (start + end - 2))
        place = np.clip(place - (rise - wanted) / np.maximum(slope, 0.05), 0.0, 1.0)
    return place


def integrated(log_density: LogDensity, low: Floats, high: Floats) -> Density:
    """
    Densities of sizes that are even over their coordinate before anything is read.

    Parameters
    ----------
    log_density : callable
        Log likelihood of what was read; only those densities are asked for that are not found yet.
    low, high : array (n,)
        Each coordinate's range.

    Examples
    --------
    A likelihood of standard deviation 0.01 within a range of 10:

    >>> found = integrated(lambda u, _: -0.5 * ((u - 3) / 0.01) ** 2, np.array([0.0]), np.array([10.0]))
    >>> float(np.exp(found.log_evidence[0]) * 10 / 0.01 / np.sqrt(2 * np.pi)).__round__(8)
    1.0
    >>> [round(float(low[0]), 4) for low in found.cumulative().quantiles(0.025, 0.5, 0.975)]
    [2.9804, 3.0, 3.0196]
    """
    full = high - low
    left, width = low.copy(), full.copy()
    grid = np.linspace(0, 1, SEARCHED)
    everything = sought = np.arange(len(low))
    for _ in range(STEPS):
        start, span = left[sought], width[sought]
        found = log_density(start[:, None] + span[:, None] * grid, sought)
        kept = found >= found.max(axis=1, keepdims=True) - KEPT
        first = np.maximum(kept.argmax(axis=1) - 1, 0)
        last = np.minimum(SEARCHED - kept[:, ::-1].argmax(axis=1), SEARCHED - 1)
        left[sought], width[sought] = start + span * grid[first], span * (grid[last] - grid[first])
        sought = sought[kept.sum(axis=1) < ENOUGH]
        if not len(sought):
            break
    found = log_density(left[:, None] + width[:, None] * UNIT_NODES, everything)
    best = found.max(axis=1)
    share = np.exp(found - best[:, None]) * UNIT_WEIGHTS
    total = share.sum(axis=1)
    return Density(left, width, best + np.log(total * width / full), share / total[:, None])
