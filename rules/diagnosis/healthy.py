"""
Healthy terminations that a joint reading sees by themselves: log-normal, not Gaussian.

Among the many resistances of a drop a log-normal termination counts well enough by its mean and variance. Read
across itself it does not: one healthy joint in fifty lies where a Gaussian of that variance has nothing. For
each such termination the ratio of both densities of what was read corrects every hypothesis that takes it as healthy.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.block import Block
from rules.diagnosis.doubtful import CURRENT_READING, ONE_READING, REVERSED, SEVERAL
from rules.diagnosis.gaussian import LOG_2PI
from rules.diagnosis.hypotheses import BAD_CONNECTION, Hypothesis
from rules.diagnosis.problem import TERMINATIONS
from rules.diagnosis.quadrature import integrated
from rules.diagnosis.shape import Floats, Integers, Shape

SPAN = (-6.0, 14.0)
"""Logarithmic standard deviations about the median within which a healthy termination is looked for."""


@dataclass(frozen=True, slots=True, eq=False)
class Healthy:
    """Corrections of log evidence: b problems, j terminations read by themselves."""

    elements: tuple[int, ...]
    """(j,)"""
    rows: tuple[tuple[int, ...], ...]
    """(j,): rows that see each alone."""
    log_ratio: Floats
    """(b, j): log-normal over Gaussian."""


def healthy(block: Block) -> Healthy:
    """The corrections of a block; none where no joint was read."""
    seen = _seen(block.shape)
    elements, rows = tuple(seen), tuple(tuple(numbers) for numbers in seen.values())
    if not seen:
        return Healthy((), (), np.zeros((len(block), 0)))
    ohm, variance = (
        np.stack(column, axis=1) for column in zip(*(_read(block, *entry) for entry in seen.items()), strict=True)
    )
    place = np.array(elements) - block.shape.conductors.stop
    mean, spread = block.others[:, place], block.others_u[:, place]
    log_sd = math.log(max(block.limits["termination.geometric_sd"], 1 + 1e-9))
    centre = np.log(mean) - log_sd**2 / 2

    flat = [np.ascontiguousarray(array).ravel() for array in (ohm, variance, centre)]

    def log_normal(coordinate: Floats, which: Integers) -> Floats:
        read, spread_, middle = (array[which, None] for array in flat)
        squares: Floats = (read - np.exp(coordinate)) ** 2 / spread_ + ((coordinate - middle) / log_sd) ** 2
        return -0.5 * squares

    low, high = flat[2] + SPAN[0] * log_sd, flat[2] + SPAN[1] * log_sd
    exact = integrated(log_normal, low, high).log_evidence.reshape(ohm.shape) + math.log(
        (SPAN[1] - SPAN[0]) / math.sqrt(2 * math.pi)
    )
    exact -= 0.5 * (LOG_2PI + np.log(variance))
    whole = variance + spread**2
    gaussian = -0.5 * ((ohm - mean) ** 2 / whole + LOG_2PI + np.log(whole))
    return Healthy(elements, rows, exact - gaussian)


def corrected(block: Block, names: tuple[Hypothesis, ...], evidence: Floats, pair: Integers) -> Floats:
    """
    Log evidence (b, h) with the corrections of all terminations that each hypothesis takes as healthy and rightly read.

    Parameters
    ----------
    pair : array (b, 2)
        Elements of the pair that the hypothesis of two bad connections is about.
    """
    found = healthy(block)
    if not found.elements:
        return evidence
    out: Floats = evidence + found.log_ratio.sum(axis=1)[:, None]
    for number, name in enumerate(names):
        if name.cause == BAD_CONNECTION and not name.which:
            given_up = np.array([(pair == element).any(axis=1) for element in found.elements]).T
            out[:, number] -= (found.log_ratio * given_up).sum(axis=1)
        else:
            out[:, number] -= found.log_ratio[:, _given_up(block.shape, found, name)].sum(axis=1)
    return out


def _given_up(shape: Shape, found: Healthy, name: Hypothesis) -> list[int]:
    """Terminations that a hypothesis does not take as healthy, or not as rightly read."""
    rows = shape.signature.rows
    if name.what in (SEVERAL, REVERSED):
        return list(range(len(found.elements)))
    if name.what == ONE_READING:
        return [j for j, seen in enumerate(found.rows) if any(name.which[0] in dict(rows[row].shown) for row in seen)]
    if name.what == CURRENT_READING:
        own = shape.signature.current_readings[name.which[0]].own
        touched = {shape.signature.slots[slot] for slot, source in shape.signature.errors if source == own}
        carried = [{(rows[row].state, branch) for row in seen for branch, _ in rows[row].path} for seen in found.rows]
        return [j for j, slots in enumerate(carried) if slots & touched]
    if name.cause == BAD_CONNECTION:
        element = int(shape.place_element[name.which[0]])
        return [j for j, seen in enumerate(found.elements) if seen == element]
    return []


def _seen(shape: Shape) -> dict[int, list[int]]:
    """Rows by the element of the one termination that they see."""
    seen: dict[int, list[int]] = {}
    for number, row in enumerate(shape.signature.rows):
        if row.part in TERMINATIONS:
            (element,) = np.flatnonzero(shape.coefficient[number]).tolist()
            if shape.termination_of[element - shape.conductors.stop].sum() == 1:
                seen.setdefault(element, []).append(number)
    return seen


def _read(block: Block, element: int, rows: list[int]) -> tuple[Floats, Floats]:
    """A termination's resistance as its own rows say, and its variance (b,)."""
    amps = block.carried[:, 0, rows, element]
    counts = (np.abs(block.shape.difference[rows]) @ block.variance.T).T
    weight = amps**2 / counts
    total = np.maximum(weight.sum(axis=1), 1e-30)
    ohm = (weight * block.shown[:, rows] / np.where(amps == 0, 1.0, amps)).sum(axis=1) / total
    gain = ((block.gain_u**2) @ block.shape.gain_rows)[:, rows[0]]
    current = (block.carried[:, 1:, rows, element] ** 2).sum(axis=1)
    relative = gain + (weight * current / np.where(amps == 0, 1.0, amps**2)).sum(axis=1) / total
    return ohm, 1 / total + relative * ohm**2
