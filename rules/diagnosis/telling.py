"""
Which check tells what is behind a common error: a second meter, one taped length, one probed temperature.

A check sees the size of one habit, with a noise of its own. It is worth what it is expected to take from the
entropy of whether that habit is the one.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from itertools import pairwise

import numpy as np

from rules.diagnosis.common_error import TOLD, CommonError, Explanation
from rules.diagnosis.habits import CABLE, CURRENT, LENGTH, RESISTANCE, TEMPERATURE, VOLTAGE, ZERO, expected
from rules.diagnosis.shape import Floats
from rules.limits import Limits

NODES = 101
"""Gauss-Legendre nodes between each two feet of the densities."""
REACH = 7.0
"""Standard deviations that the sum over what a check may show reaches beyond both means."""
TELLS = 3.0
"""Standard uncertainties of a check, repeated, that the size it looks for should make."""
MOST_REPEATED = 5
ZERO_SEEN = 0.05
"""Noise of a clamp's zero, read with nothing in its jaws, over the size that is expected of it."""
ALIKE = 1e-6
"""Difference in worth that counts as none; the earlier kind of check is then the easier."""


@dataclass(frozen=True, slots=True)
class Check:
    """What to look at."""

    explanation: Explanation
    repeated: int
    """On so many circuits: each has an error of its own."""
    bits: float
    """Expected fall in entropy."""

    @property
    def words(self) -> str:
        """What to do."""
        habit, one = self.explanation.habit, self.repeated == 1
        of = habit.words
        some = "one of these circuits" if one else f"{self.repeated} of these circuits"
        return {
            VOLTAGE: f"Read {some} with another voltmeter on the same clips as {of}.",
            CURRENT: f"Put another clamp around the same conductor as {of}, in {some}, at the same moment.",
            ZERO: f"Read the {of} with its jaws closed around nothing, away from any conductor.",
            RESISTANCE: f"Read {some} with another ohmmeter at the same places as {of}.",
            TEMPERATURE: f"Read the conductor's temperature with a probe in {some}: {of}.",
            LENGTH: f"Tape {'one' if one else self.repeated} of the {of}.",
            CABLE: f"Read the resistance of {'a taped length' if one else f'{self.repeated} taped lengths'} of {of}, isolated.",
        }[habit.kind]


def most_telling(error: CommonError, limits: Limits) -> Check:
    """The check that is expected to tell most of what is behind a common error."""
    checks = [_check(one, limits) for one in error.explanations if one.probability >= TOLD]
    best = max(check.bits for check in checks)
    return next(check for check in _easiest_first(checks) if check.bits >= best - ALIKE)


def _easiest_first(checks: Sequence[Check]) -> list[Check]:
    order = (ZERO, VOLTAGE, CURRENT, RESISTANCE, TEMPERATURE, LENGTH, CABLE)
    return sorted(checks, key=lambda check: (order.index(check.explanation.habit.kind), check.explanation.habit))


def _check(explanation: Explanation, limits: Limits) -> Check:
    noise, size = noise_of(explanation, limits), explanation.size
    repeated = min(max(math.ceil((TELLS * noise / max(abs(size.value), 1e-12)) ** 2), 1), MOST_REPEATED)
    bits = information(explanation.probability, size.value, size.u or 0.0, noise / math.sqrt(repeated))
    return Check(explanation, repeated, bits)


def noise_of(explanation: Explanation, limits: Limits) -> float:
    """Standard uncertainty of one check, in the habit's unit: of the better means and of the circuit itself."""
    habit = explanation.habit
    if habit.kind == ZERO:
        return ZERO_SEEN * expected(habit, limits).spread
    if habit.kind == TEMPERATURE:
        return math.hypot(limits[f"temperature_doubt.{habit.of}"], limits["temperature_doubt.probe"])
    tape = limits["length_doubt.tape"]
    if habit.kind == LENGTH:
        return math.hypot(limits[f"length_doubt.{habit.of}"], tape)
    if habit.kind == CABLE:
        return math.hypot(limits["resistance_doubt.relative"], tape)
    return math.sqrt(2) * explanation.specified_u


@cache
def _legendre() -> tuple[Floats, Floats]:
    nodes, weights = np.polynomial.legendre.leggauss(NODES)
    return nodes, weights


def information(probability: float, size: float, size_u: float, noise: float) -> float:
    """
    Expected fall in entropy by one look at a size that is zero, or else about a value.

    Parameters
    ----------
    probability : float
        That it is not zero, at most one.
    size, size_u : float
        Where it is not zero: mean and standard uncertainty.
    noise : float
        Standard uncertainty of the look.

    Returns
    -------
    float
        Between 0 and the entropy of ``probability``. [bit]

    Examples
    --------
    >>> round(information(0.5, 0.06, 0.005, 0.001), 3), round(information(0.5, 0.06, 0.005, 0.6), 3)
    (1.0, 0.002)
    >>> abs(round(information(1.0000000000000002, 0.1, 0.01, 0.004), 6))
    0.0
    """
    probability = min(probability, 1.0)  # a sum of shares may pass it by rounding
    narrow = max(noise, 1e-6 * abs(size), 1e-12)
    wide = math.hypot(size_u, narrow)
    low, high = min(-REACH * narrow, size - REACH * wide), max(REACH * narrow, size + REACH * wide)
    # an edge at the foot of each density: nodes lie close where one is narrow
    nodes, weights = _legendre()
    feet = (mean + side * REACH * u for mean, u in ((0.0, narrow), (size, wide)) for side in (-1, 1))
    edges = sorted({low, high, *feet})
    total = 0.0
    for start, end in pairwise(edges):
        shown = start + (end - start) * (nodes + 1) / 2
        densities = [
            share * np.exp(-0.5 * ((shown - mean) / u) ** 2) / (u * math.sqrt(2 * math.pi))
            for share, mean, u in ((probability, size, wide), (1 - probability, 0.0, narrow))
        ]
        both = densities[0] + densities[1]
        for share, density in zip((probability, 1 - probability), densities, strict=True):
            seen = density > 1e-300
            ratio = density[seen] / (share * both[seen])
            total += float((weights[seen] * density[seen] * np.log2(ratio)).sum()) * (end - start) / 2
    return max(total, 0.0)
