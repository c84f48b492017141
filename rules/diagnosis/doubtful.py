"""
A reading or the record is doubtful: slips that leave the circuit as recorded.

One reading may be off by anything (a Cauchy density over how far) or by a slip that people make (a decimal place,
milli, the sign: a narrow density about what it makes of the value that was meant), two voltages may stand at each
other's points, the clamp may have been held the other way round, or several things may be wrong at once. How far a
reading is off is summed over in closed form: the mean moves in a straight line with it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.block import Block, Model, model_of
from rules.diagnosis.gaussian import LOG_2PI, Whitener, log_density, whitener
from rules.diagnosis.hypotheses import DOUBTFUL, Hypotheses, Hypothesis
from rules.diagnosis.shape import Floats, Integers

RATIOS = {
    10.0: "a decimal place",
    0.1: "a decimal place",
    100.0: "two decimal places",
    0.01: "two decimal places",
    1000.0: "milli left out or added",
    0.001: "milli left out or added",
    -1.0: "the sign",
}
"""What was meant over what was entered, and how it comes about."""
NEAR = 0.02
"""How closely, relative, such a slip is taken to give the value."""
_RATIOS = np.array(list(RATIOS))

ONE_READING, CURRENT_READING = "one_reading", "one_current"
SWAPPED, REVERSED, SEVERAL = "swapped_points", "clamp_reversed", "several_things"


@dataclass(frozen=True, slots=True, eq=False)
class Slips:
    """Hypotheses of slips, and how far each reading would be off."""

    hypotheses: Hypotheses
    off: Floats
    """(b, readings): what was meant less what was entered; observations first, then current readings."""


def slips(block: Block, recorded: Model, white: Whitener) -> Slips:
    """
    Evidence of every slip.

    Parameters
    ----------
    recorded : Model
        With everything as recorded: (b, 1, …).
    white : Whitener
        Of its covariance: (b, …).
    """
    shape, limits = block.shape, block.limits
    covariance, own = recorded.covariance[:, 0], shape.signature.current_readings
    residual, observations, currents, turned = rows_of_slips(block, recorded)
    right = [residual[..., None], turned[..., None], observations, currents]
    whitened, scale = white.inverse @ np.concatenate(right, axis=-1), white.log_scale
    base, readings = whitened[:, :, 0], observations.shape[-1] + currents.shape[-1]
    entered = np.concatenate([block.value[:, shape.read], block.reading_a], axis=1)
    evidence, off = _off(base, whitened[:, :, 2:], scale, entered, typed_off(block), len(shape.read))
    evidence, off = _looked_at_again(block, recorded, currents, evidence, off)
    both = np.concatenate([_swapped(block, whitened), (whitened[:, :, 1:2] ** 2).sum(axis=1)], axis=1)
    others = scale[:, None] - 0.5 * both
    several = covariance + np.eye(shape.rows) * several_off(block)[:, :, None] ** 2
    found = np.concatenate([evidence, others, log_density(residual, several)[:, None]], axis=1)
    names = [Hypothesis(DOUBTFUL, ONE_READING, (int(number),)) for number in shape.read]
    names += [Hypothesis(DOUBTFUL, CURRENT_READING, (number,)) for number in range(len(own))]
    names += [Hypothesis(DOUBTFUL, SWAPPED, pair) for pair in shape.signature.swaps]
    names += [Hypothesis(DOUBTFUL, REVERSED), Hypothesis(DOUBTFUL, SEVERAL)]
    of_kind = {ONE_READING: readings, CURRENT_READING: readings, SWAPPED: len(shape.signature.swaps)}
    share = [
        limits["doubtful." + (ONE_READING if name.what == CURRENT_READING else name.what)] / of_kind.get(name.what, 1)
        for name in names
    ]
    weights = np.array(share) * np.where([name.what == REVERSED and not own for name in names], 0.0, 1.0)
    return Slips(Hypotheses(tuple(names), weights[None], found), off)


def rows_of_slips(block: Block, recorded: Model) -> tuple[Floats, Floats, Floats, Floats]:
    """
    What a slip does to the rows, measured less computed.

    Returns
    -------
    tuple of arrays
        The residual as it stands (b, n); what one volt or ampere more, meant than entered, takes off it, for each
        observation (b, n, observations) and each current reading (b, n, currents); the residual if the clamp was held
        the other way round (b, n).
    """
    shape = block.shape
    mean = recorded.whole_mean[:, 0]
    observations = np.broadcast_to(-shape.difference[:, shape.read], (len(block), shape.rows, len(shape.read)))
    gains, own = shape.signature.gains, [read.own for read in shape.signature.current_readings]
    currents = recorded.whole_shared[:, 0][:, :, [gains + source for source in own]] / block.reading_u[:, None]
    live = np.where(shape.row_state == shape.signature.states, 1.0, -1.0)
    return block.shown - mean, observations, currents, live * block.shown - mean


def swapped_by(block: Block) -> tuple[Integers, Floats]:
    """The observations of two voltages that may stand at each other's points (pairs, 2), and what lies between (b, pairs)."""
    pairs = np.array(block.shape.signature.swaps, dtype=np.int64).reshape(-1, 2)
    return pairs, block.value[:, pairs[:, 1]] - block.value[:, pairs[:, 0]]


def _swapped(block: Block, whitened: Floats) -> Floats:
    """
    (b, pairs): square of the white residual if two voltages stood at each other's points.

    A volt more at an observation moves the white residual by ``-g`` of that observation; with ``G`` the inner
    products of residual and ``g`` the square follows from four of them for each pair.
    """
    pairs, apart = swapped_by(block)
    columns = whitened[:, :, [0, *range(2, 2 + len(block.shape.read))]]
    gram = np.swapaxes(columns, 1, 2) @ columns
    first, second = (1 + np.searchsorted(block.shape.read, pairs)).T
    across = gram[:, 0, first] - gram[:, 0, second]
    square = gram[:, first, first] + gram[:, second, second] - 2 * gram[:, first, second]
    found: Floats = gram[:, :1, 0] + apart * (apart * square - 2 * across)
    return found


def typed_off(block: Block) -> Floats:
    """(b, readings): within how much half of all mistyped readings are."""
    shape, limits = block.shape, block.limits
    dead = {number for row in shape.signature.rows if row.state < 0 for number, _ in row.shown}
    volts = limits["slip.voltage_share"] * block.nominal_v[:, None]
    of_observations = np.where([number in dead for number in shape.read], limits["slip.resistance_ohm"], volts)
    largest = np.abs(block.reading_a).max(axis=1, initial=1e-3, keepdims=True)
    of_currents = limits["slip.current_share"] * largest * np.ones_like(block.reading_a)
    return np.concatenate([np.broadcast_to(of_observations, (len(block), len(shape.read))), of_currents], axis=1)


def several_off(block: Block) -> Floats:
    """(b, n): how far every drop may be off where several things are wrong."""
    dead = block.shape.row_state == block.shape.signature.states
    volts = block.limits["slip.several_share"] * block.nominal_v[:, None]
    return np.where(dead, block.limits["slip.resistance_ohm"], volts)


def _off(
    base: Floats, directions: Floats, scale: Floats, entered: Floats, typed: Floats, observations: int
) -> tuple[Floats, Floats]:
    """
    Log evidence of a shift along each direction, and its best size.

    The Gaussian's integral over the shift is exact; the Cauchy density is taken at the best size, since a
    meter's counts are far narrower. The observations come first, the current readings behind them.
    """
    within = np.einsum("bn,bnr->br", base, directions)
    square = np.maximum(np.einsum("bnr,bnr->br", directions, directions), 1e-300)
    off = within / square
    recorded = scale - 0.5 * (base**2).sum(axis=1)
    gained = 0.5 * within * off + 0.5 * (LOG_2PI - np.log(square))
    density = [
        slip_density(entered[:, some], off[:, some], 1 / square[:, some], typed[:, some], given)
        for some, given in ((slice(None, observations), False), (slice(observations, None), True))
    ]
    return recorded[:, None] + gained + np.log(np.concatenate(density, axis=1)), off


def slip_density(entered: Floats, off: Floats, variance: Floats, typed: Floats, given: bool) -> Floats:
    """
    Density of a mistake that takes one value for another.

    Parameters
    ----------
    entered : array
        What stands in the record.
    off : array
        What was meant less what was entered, as the other readings say.
    variance : array
        Of ``off``.
    typed : array
        Within how much half of all mistyped readings are.
    given : bool
        False for a voltage or resistance, which the record predicts: the density is over what might have been entered.
        True for a current, which the record does not predict: it is over what might have been meant.

    Returns
    -------
    array
        Half of it over any distance, half about the slips of ``RATIOS``; it integrates to one.
    """
    if given:
        centre = entered[..., None] * _RATIOS
        width = np.sqrt((NEAR * centre) ** 2 + variance[..., None])
        about = (np.exp(-0.5 * (((entered + off)[..., None] - centre) / width) ** 2) / width).mean(axis=-1)
    else:
        # both value and width over the ratio: the exponent is the same times the ratio, with one width for all
        meant = entered + off
        width = np.sqrt((NEAR * meant) ** 2 + variance)
        apart = (entered / width)[..., None] * _RATIOS - (meant / width)[..., None]
        about = np.exp(-0.5 * apart**2) @ np.abs(_RATIOS) / (len(RATIOS) * width)
    anything = 1 / (math.pi * typed * (1 + (off / typed) ** 2))
    density: Floats = (anything + about / math.sqrt(2 * math.pi)) / 2
    return density


def _looked_at_again(
    block: Block, recorded: Model, currents: Floats, evidence: Floats, off: Floats
) -> tuple[Floats, Floats]:
    """The current reading that explains most, judged with the doubt that its corrected current brings."""
    count = currents.shape[-1]
    if not count:
        return evidence, off
    start = evidence.shape[1] - count
    rows = np.arange(len(block))
    best = evidence[:, start:].argmax(axis=1)
    moved = off[rows, start + best]
    reads = np.array(block.shape.signature.current_readings)[best]
    one = block.carried[rows, 1 + reads[:, 0]] / block.reading_u[rows, best][:, None, None]
    carried = block.carried.copy()
    carried[:, 0] += moved[:, None, None] * one
    carried[rows, 1 + reads[:, 1]] += (moved * block.reading_gain_u[rows, best])[:, None, None] * one
    again = model_of(block, block.conductor[:, None], block.conductor_slope[:, None], carried)
    of_again = whitener(again.covariance[:, 0])
    white = of_again.inverse @ np.stack([block.shown - again.whole_mean[:, 0], currents[rows, :, best]], axis=-1)
    typed = typed_off(block)[rows, start + best]
    within = (white[:, :, 0] * white[:, :, 1]).sum(axis=1)
    square = np.maximum((white[:, :, 1] ** 2).sum(axis=1), 1e-300)
    further = within / square
    total = moved + further
    new = (
        of_again.log_scale
        - 0.5 * (white[:, :, 0] ** 2).sum(axis=1)
        + 0.5 * within * further
        + 0.5 * (LOG_2PI - np.log(square))
    )
    new += np.log(slip_density(block.reading_a[rows, best], total, 1 / square, typed, given=True))
    evidence, off = evidence.copy(), off.copy()
    evidence[rows, start + best], off[rows, start + best] = new, total
    return evidence, off
