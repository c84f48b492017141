"""
What each atom says of readings not taken yet: Gaussians given all that was read.

Imagined are the currents of the round with the most current. At ``level`` times these a mean is
``steady + level mean`` and a variance ``counts + clamp + level² variance``: counts do not grow with the current, neither
does what a semiconductor loses.

Written throughout: b problems, a atoms, n rows read, N rows with the imagined ones, c candidates of one row (the single
readings, a taped length for each branch, a probe temperature), k rows of the round that is read once more, d columns
of shared doubts.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.atoms import Atoms
from rules.diagnosis.block import Block, model_of
from rules.diagnosis.candidates import AGAIN, SINGLE, Posed
from rules.diagnosis.doubtful import rows_of_slips, several_off, typed_off
from rules.diagnosis.extra import moved_everywhere
from rules.diagnosis.gaussian import cholesky, forward
from rules.diagnosis.judge import Judged
from rules.diagnosis.shape import Floats

FAR = 10.0
"""A reading that may be off by anything has this many times the doubt that half of all slips keep within."""
LEAST = 1e-18
"""Least variance of an outcome; only what no doubt touches has it. [V²]"""


@dataclass(frozen=True, slots=True, eq=False)
class Outlook:
    """Outcomes of candidates under each atom."""

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
    """All rows under each atom, before anything is read: R = N + branches + 1."""

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


def outlook_of(judged: Judged, block: Block, atoms: Atoms, posed: Sequence[Posed]) -> Outlook:
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
    """
    rows = _rows(block, atoms, posed)
    read = judged.block.shape.rows
    shift, off, doubt = _slipped(judged, atoms)
    columns, own = rows.columns, rows.own[:, None]
    within, ahead = columns[:, :, :read], columns[:, :, read:]
    covariance = own[..., :read, :read] + within @ np.swapaxes(within, -1, -2)
    covariance += off[..., None] * off[..., None, :] + np.eye(read) * doubt[..., None]
    cross = own[..., :read, read:] + within @ np.swapaxes(ahead, -1, -2)
    residual = block.shown[:, None, :read] - rows.mean[..., :read] + shift
    right = [cross, residual[..., None], rows.direction[..., :read, None]]
    white = forward(cholesky(covariance), np.concatenate(right, axis=-1))
    known = white[..., :-2]
    drawn = np.swapaxes(known, -1, -2) @ white[..., -2:]
    steady = rows.steady[..., read:]
    mean = rows.mean[..., read:] + drawn[..., 0] - steady
    apart = (rows.direction[..., read:] - drawn[..., 1]) * atoms.smoothed[..., None]
    single, again = _places(posed[0], read, rows.own.shape[1])
    clamped = ahead * rows.clamp
    # neither a length nor a temperature grows with the current
    grows = np.arange(mean.shape[-1]) < block.shape.rows - read
    # with several things wrong nothing is known of what is not read either
    unknown = doubt.max(axis=-1)[..., None]
    variance = np.diagonal(own, axis1=-2, axis2=-1)[..., read:] + (ahead**2).sum(axis=-1) - (known**2).sum(axis=-2)
    counts, clamp = np.diagonal(rows.counts, axis1=-2, axis2=-1)[:, read:], (clamped**2).sum(axis=-1)
    variance = variance + apart**2 + unknown * grows - counts[:, None] - clamp
    clamp = np.where(grows, clamp, clamp + np.maximum(variance, 0.0))
    steady, mean = np.where(grows, steady, steady + mean), np.where(grows, mean, 0.0)
    variance = np.where(grows, np.maximum(variance, LEAST), 0.0)
    some = ahead[:, :, again], known[..., again], apart[..., again, None], clamped[:, :, again]
    shared, found, spread, counted = some
    square = [part @ np.swapaxes(part, -1, -2) for part in (shared, spread, counted)]
    at = np.array(again, dtype=np.int64) + read
    fixed = rows.counts[:, None][..., at[:, None], at] + square[2]
    whole = own[..., at[:, None], at] + square[0] + square[1] - np.swapaxes(found, -1, -2) @ found
    whole = whole + np.eye(len(again)) * (unknown[..., None] + LEAST)
    return Outlook(
        mean=np.swapaxes(mean[..., single], 1, 2),
        steady=np.swapaxes(steady[..., single], 1, 2),
        variance=np.swapaxes(variance[..., single], 1, 2),
        clamp=np.swapaxes(clamp[..., single], 1, 2),
        counts=counts[:, single],
        again_mean=mean[..., again],
        again_steady=steady[..., again],
        again_covariance=whole - fixed,
        again_fixed=fixed,
    )


def _places(posed: Posed, read: int, rows: int) -> tuple[list[int], list[int]]:
    """Among the rows behind those read: candidates of one row, and the round that is read once more."""
    again = [row - read for row in posed.rows_of(AGAIN)]
    return [row for row in range(rows - read) if row not in again], again


def _rows(block: Block, atoms: Atoms, posed: Sequence[Posed]) -> _Rows:
    """All rows, the lengths and the temperature last."""
    shape = block.shape
    number = np.arange(len(block))[:, None]
    model = model_of(block, block.conductor[:, None] * atoms.ratios, block.conductor_slope[:, None] * atoms.ratios)
    direction, moving = moved_everywhere(block)
    of_extra, size = direction[number, atoms.extra], atoms.size[..., None]
    shared = model.whole_shared[number, atoms.conductor]
    shared = shared + size[..., None] * np.swapaxes(moving[number, atoms.extra], -1, -2)
    columns = np.concatenate([shared, model.conductor_columns[number, atoms.conductor]], axis=-1)
    mean = model.whole_mean[number, atoms.conductor] + size * of_extra
    steady = np.where(atoms.extra[..., None] >= len(shape.places), size * of_extra, 0.0)
    along = np.where(size > 0, of_extra, model.conductor_mean[:, :1])
    branches, first = len(shape.signature.branches), shared.shape[-1]
    # a tape tells by how much a length errs; what it says of a wrong length is reckoned apart (``options``)
    extended = np.zeros((*mean.shape[:2], branches + 1, columns.shape[-1]))
    extended[:, :, range(branches), first + np.arange(branches)] = block.length_u[:, None]
    extended[:, :, branches, first + branches] = 1.0
    left = np.array([0.5 if each.probed is None else each.probed[1] for each in posed])
    meters = np.full((len(block), branches + 1), block.limits["length_doubt.tape"] ** 2)
    meters[:, branches] = left / (1 - left)
    counts = (shape.difference * block.variance[:, None]) @ shape.difference.T
    counts = _bordered(counts, meters)
    nothing = np.zeros((*mean.shape[:2], branches + 1))
    clamp = np.zeros(columns.shape[-1])
    imagined = posed[0].imagined
    for read, said in zip(shape.signature.current_readings, imagined.current_readings, strict=True):
        clamp[shape.signature.gains + read.own] = said.round in (SINGLE, AGAIN)
    return _Rows(
        mean=np.concatenate([mean, nothing], axis=-1),
        steady=np.concatenate([steady, nothing], axis=-1),
        columns=np.concatenate([columns, extended], axis=2),
        direction=np.concatenate([along, nothing], axis=-1),
        own=_bordered(block.own, meters),
        counts=counts,
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
    residual, observations, currents, swapped, turned = rows_of_slips(block, judged.recorded)
    off = np.concatenate([observations, currents], axis=2) * (FAR * typed_off(block))[:, None]
    count, rows = residual.shape
    readings, pairs = off.shape[2], swapped.shape[2]
    slips = readings + pairs + 2  # the last two: the clamp the other way round, several things
    shift, along, doubt = (np.zeros((count, slips + 1, rows)) for _ in range(3))  # the last row: no slip
    along[:, :readings] = np.swapaxes(off, 1, 2)
    shift[:, readings : readings + pairs] = np.swapaxes(swapped, 1, 2)
    shift[:, readings + pairs] = turned - residual
    doubt[:, readings + pairs + 1] = several_off(block) ** 2
    number = np.arange(count)[:, None]
    return shift[number, atoms.slip], along[number, atoms.slip], doubt[number, atoms.slip]
