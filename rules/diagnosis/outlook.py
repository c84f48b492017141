"""
What each atom says of readings not taken yet: Gaussians given all that was read.

Imagined are the currents of the round with the most current. At ``level`` times these a mean is
``steady + level mean`` and a variance ``counts + clamp + level² variance``: counts do not grow with the current, neither
does what a semiconductor loses.

Written throughout: b problems, a atoms, n rows read, N rows with the imagined ones, c candidates of one row that are
looked at (of the single readings, a taped length for each branch, a probe temperature), k rows of the round that is read
once more, d columns of shared doubts.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.atoms import Atoms
from rules.diagnosis.block import Block, model_of
from rules.diagnosis.candidates import AGAIN, SINGLE, Posed
from rules.diagnosis.doubtful import rows_of_slips, several_off, swapped_by, typed_off
from rules.diagnosis.extra import moved_everywhere
from rules.diagnosis.gaussian import whitener
from rules.diagnosis.judge import Judged
from rules.diagnosis.shape import Floats, Integers

FAR = 10.0
"""A reading that may be off by anything has this many times the doubt that half of all slips keep within."""
LEAST = 1e-18
"""Least variance of an outcome; only what no doubt touches has it. [V²]"""


@dataclass(frozen=True, slots=True, eq=False)
class Outlook:
    """Outcomes of candidates under each atom."""

    candidate: Integers
    """(b, c): which of all candidates each is: the single readings, then lengths, then the temperature."""
    mean: Floats
    steady: Floats
    variance: Floats
    clamp: Floats
    """(b, c, a)"""
    counts: Floats
    """(b, c): of the meter that reads it."""
    again_mean: Floats
    again_steady: Floats
    """(b, a, k)"""
    again_covariance: Floats
    again_fixed: Floats
    """(b, a, k, k): what grows with the current, and what does not."""


@dataclass(frozen=True, slots=True, eq=False)
class _Rows:
    """The rows read, then those looked at, under each atom, before anything is read: R = n + c + k."""

    mean: Floats
    """(b, a, R)"""
    steady: Floats
    """(b, a, R): the part that does not grow with the current."""
    columns: Floats
    """(b, a, R, d): of doubts that rows share."""
    direction: Floats
    """(b, a, R): what the mean gains with the size that an atom stands at."""
    own: Floats
    """(b, R, R): covariance of the rest."""
    counts: Floats
    """(b, R, R): of it, the counts."""
    clamp: Floats
    """(d,): 1 for the columns of the imagined clamp's own counts."""


def outlook_of(judged: Judged, block: Block, atoms: Atoms, posed: Sequence[Posed], candidate: Integers) -> Outlook:
    """
    Outcomes under each atom.

    Parameters
    ----------
    judged : Judged
        By what was read.
    block : Block
        The same problems with the imagined readings.
    posed : sequence of Posed
        The batch; what is imagined has the same structure in all of them.
    candidate : array (b, c)
        The candidates that are looked at.
    """
    read, single, again = judged.block.shape.rows, np.array(posed[0].rows_of(SINGLE)), posed[0].rows_of(AGAIN)
    # among all rows the lengths and the temperature stand last
    is_reading = candidate < len(single)
    places = np.where(is_reading, candidate, candidate - len(single) + block.shape.rows)
    places[is_reading] = single[candidate[is_reading]]
    every = [np.broadcast_to(np.array(some, dtype=np.int64), (len(block), len(some))) for some in (range(read), again)]
    rows = _rows(block, atoms, posed, np.concatenate([every[0], places, every[1]], axis=1))
    one, once_more = slice(0, candidate.shape[1]), slice(candidate.shape[1], None)
    shift, off, doubt = _slipped(judged, atoms)
    columns, own = rows.columns, rows.own[:, None]
    within, ahead = columns[:, :, :read], columns[:, :, read:]
    covariance = own[..., :read, :read] + within @ np.swapaxes(within, -1, -2)
    covariance += off[..., None] * off[..., None, :] + np.eye(read) * doubt[..., None]
    cross = own[..., :read, read:] + within @ np.swapaxes(ahead, -1, -2)
    residual = block.shown[:, None, :read] - rows.mean[..., :read] + shift
    right = [cross, residual[..., None], rows.direction[..., :read, None]]
    white = whitener(covariance).inverse @ np.concatenate(right, axis=-1)
    known = white[..., :-2]
    drawn = np.swapaxes(known, -1, -2) @ white[..., -2:]
    steady = rows.steady[..., read:]
    mean = rows.mean[..., read:] + drawn[..., 0] - steady
    apart = (rows.direction[..., read:] - drawn[..., 1]) * atoms.smoothed[..., None]
    clamped = ahead * rows.clamp
    # neither a length nor a temperature grows with the current
    grows = np.concatenate([is_reading, every[1] >= 0], axis=1)[:, None]
    # with several things wrong nothing is known of what is not read either
    unknown = doubt.max(axis=-1)[..., None]
    variance = np.diagonal(own, axis1=-2, axis2=-1)[..., read:] + (ahead**2).sum(axis=-1) - (known**2).sum(axis=-2)
    counts, clamp = np.diagonal(rows.counts, axis1=-2, axis2=-1)[:, read:], (clamped**2).sum(axis=-1)
    variance = variance + apart**2 + unknown * grows - counts[:, None] - clamp
    clamp = np.where(grows, clamp, clamp + np.maximum(variance, 0.0))
    steady, mean = np.where(grows, steady, steady + mean), np.where(grows, mean, 0.0)
    variance = np.where(grows, np.maximum(variance, LEAST), 0.0)
    shared, found, counted = ahead[:, :, once_more], known[..., once_more], clamped[:, :, once_more]
    spread = apart[..., once_more, None]
    square = [part @ np.swapaxes(part, -1, -2) for part in (shared, spread, counted)]
    of_again = slice(read + candidate.shape[1], None)
    fixed = rows.counts[:, None, of_again, of_again] + square[2]
    whole = own[..., of_again, of_again] + square[0] + square[1] - np.swapaxes(found, -1, -2) @ found
    whole = whole + np.eye(len(again)) * (unknown[..., None] + LEAST)
    return Outlook(
        candidate=candidate,
        mean=np.swapaxes(mean[..., one], 1, 2),
        steady=np.swapaxes(steady[..., one], 1, 2),
        variance=np.swapaxes(variance[..., one], 1, 2),
        clamp=np.swapaxes(clamp[..., one], 1, 2),
        counts=counts[:, one],
        again_mean=mean[..., once_more],
        again_steady=steady[..., once_more],
        again_covariance=whole - fixed,
        again_fixed=fixed,
    )


def _rows(block: Block, atoms: Atoms, posed: Sequence[Posed], rows: Integers) -> _Rows:
    """Some rows (b, R) of all, the lengths and the temperature being the last of those."""
    shape = block.shape
    number, atom = np.arange(len(block))[:, None], np.arange(len(block))[:, None, None]
    beyond = rows[0] >= shape.rows  # of one kind in all problems
    at = np.where(beyond, 0, rows)[:, None]
    used, which = np.unique(atoms.conductor, return_inverse=True)
    ratios = atoms.ratios[:, used]
    model = model_of(block, block.conductor[:, None] * ratios, block.conductor_slope[:, None] * ratios)
    recorded = model_of(block, block.conductor[:, None], block.conductor_slope[:, None])
    direction, moving = moved_everywhere(block)
    extra, size = atoms.extra[..., None], atoms.size[..., None]
    conductor = which.reshape(atoms.conductor.shape)[..., None]
    of_extra = direction[atom, extra, at]
    first, branches = moving.shape[2], len(shape.signature.branches)
    columns = np.empty((*of_extra.shape, first + branches + 2))
    columns[..., :first] = np.swapaxes(moving, -1, -2)[atom, extra, at]
    columns[..., :first] *= size[..., None]
    columns[..., :first] += model.whole_shared[atom, conductor, at]
    columns[..., first:] = model.conductor_columns[atom, conductor, at]
    mean = model.whole_mean[atom, conductor, at] + size * of_extra
    steady = np.where(extra >= len(shape.places), size * of_extra, 0.0)
    along = np.where(size > 0, of_extra, recorded.conductor_mean[atom, 0, at])
    for array in (columns, mean, steady, along):
        array[:, :, beyond] = 0.0
    # a tape tells by how much a length errs; what it says of a wrong length is reckoned apart (``options``)
    extended = np.zeros((len(block), branches + 1, branches + 1))
    extended[:, range(branches), range(branches)] = block.length_u
    extended[:, branches, branches] = 1.0
    columns[:, :, beyond, first : first + branches + 1] = extended[number, rows[:, beyond] - shape.rows][:, None]
    left = np.array([0.5 if each.probed is None else each.probed[1] for each in posed])
    meters = np.full((len(block), branches + 1), block.limits["length_doubt.tape"] ** 2)
    meters[:, branches] = left / (1 - left)
    counts = (shape.difference * block.variance[:, None]) @ shape.difference.T
    clamp = np.zeros(columns.shape[-1])
    imagined = posed[0].imagined
    for read, said in zip(shape.signature.current_readings, imagined.current_readings, strict=True):
        clamp[shape.signature.gains + read.own] = said.round in (SINGLE, AGAIN)
    return _Rows(
        mean=mean,
        steady=steady,
        columns=columns,
        direction=along,
        own=_bordered(block.own, meters)[atom, rows[:, :, None], rows[:, None]],
        counts=_bordered(counts, meters)[atom, rows[:, :, None], rows[:, None]],
        clamp=clamp,
    )


def _bordered(matrix: Floats, diagonal: Floats) -> Floats:
    """Matrices (b, n, n) with independent rows behind them (b, more)."""
    count, rows, more = len(matrix), matrix.shape[1], diagonal.shape[1]
    whole = np.zeros((count, rows + more, rows + more))
    whole[:, :rows, :rows] = matrix
    whole[:, range(rows, rows + more), range(rows, rows + more)] = diagonal
    return whole


def _slipped(judged: Judged, atoms: Atoms) -> tuple[Floats, Floats, Floats]:
    """What each atom's slip adds to the rows read, along what it may be off, and the variance that it adds (b, a, n)."""
    block = judged.block
    residual, observations, currents, turned = rows_of_slips(block, judged.recorded)
    off = np.concatenate([observations, currents], axis=2) * (FAR * typed_off(block))[:, None]
    pairs, apart = swapped_by(block)
    count, rows = residual.shape
    number, readings = np.arange(count)[:, None], off.shape[2]
    # of all slips: the readings, the pairs, the clamp the other way round, several things; and none
    of_reading = (atoms.slip >= 0) & (atoms.slip < readings)
    of_pair = (atoms.slip >= readings) & (atoms.slip < readings + len(pairs))
    reading, pair = np.where(of_reading, atoms.slip, 0), np.where(of_pair, atoms.slip - readings, 0)
    along = np.where(of_reading[..., None], np.swapaxes(off, 1, 2)[number, reading], 0.0)
    shift = np.zeros((*atoms.slip.shape, rows))
    if len(pairs):
        columns = block.shape.difference.T[pairs[:, 0]] - block.shape.difference.T[pairs[:, 1]]
        shift = np.where(of_pair[..., None], columns[pair] * apart[number, pair][..., None], 0.0)
    shift += np.where(atoms.slip == readings + len(pairs), 1.0, 0.0)[..., None] * (turned - residual)[:, None]
    several = np.where(atoms.slip == readings + len(pairs) + 1, 1.0, 0.0)[..., None]
    return shift, along, several * several_off(block)[:, None] ** 2
