"""
Causes that add to the rows in one place: a bad connection (a resistance) and a semiconductor (a voltage).

Along its size only the rows that its path holds move: their mean in a straight line, their covariance through the
gains and sources of current that act on them. The Gaussian of all other rows never changes, so that the evidence at
each size is that of the few rows t that move, given the others u. With everything as recorded let ``r`` be the
residual, ``A`` the columns that move and ``Q`` the inverse of the covariance; a size ``x`` moves the mean by ``x w``
and the columns by ``x B``. With ``V = Q_tt⁻¹``, ``c = V (Q r)_t`` and ``J = (Q A)_t Bᵀ``

    given u, row t is a Gaussian of mean ``x (w + B (AᵀQ r - (Q A)_tᵀ c)) - c`` about what was read and of covariance
    ``V + x (V J + JᵀV) + x² (B (I - AᵀQ A) Bᵀ + JᵀV J)``:

one factorisation serves all places. Where a place moves more rows than it has columns, a few sums of rows stand for them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.block import Block, Model
from rules.diagnosis.gaussian import Whitener, along
from rules.diagnosis.quadrature import Density, integrated
from rules.diagnosis.shape import Floats, Integers


@dataclass(frozen=True, slots=True, eq=False)
class Line:
    """What was read along the sizes of extras, places of a bad connection before those of a semiconductor: k in all."""

    logarithmic: int
    """How many of them have the logarithm of the size as their coordinate: the first; the others the size."""
    constant: Floats
    """(k,): log density but for the rows that move."""
    matrix: tuple[Floats, Floats, Floats]
    """(k, m, m): covariance of the rows that move; what stands before 1, size and size²."""
    vector: tuple[Floats, Floats]
    """(k, m): their residual; what stands before 1 and size."""

    def log_density(self, coordinate: Floats, which: Integers) -> Floats:
        """Log density of the rows (…, nodes) at coordinates of the size of some of the extras, given in order."""
        logarithmic = int(np.searchsorted(which, self.logarithmic))
        size = np.concatenate([np.exp(coordinate[:logarithmic]), coordinate[logarithmic:]])
        log_scale, quadratic = along(size, [m[which] for m in self.matrix], [v[which] for v in self.vector])
        log_scale += quadratic
        log_scale *= -0.5
        log_scale += self.constant[which, None]
        return log_scale


def moved(block: Block, rows: Integers) -> tuple[Floats, Floats]:
    """
    What a unit of each extra adds: the places of a bad connection, then those of a semiconductor.

    Parameters
    ----------
    rows : array (places and offsets, m)
        The rows that are asked for.

    Returns
    -------
    tuple of arrays
        To the rows' means (b, places and offsets, m), and to the columns of their shared doubts (b, places and
        offsets, gains + s, m).
    """
    shape, count = block.shape, len(block.shape.places)
    sense = np.where(np.abs(block.amps) > 2 * block.amps_u, np.sign(block.amps), 0.0)
    sense = np.concatenate([sense, np.zeros((len(block), 1))], axis=1)  # slot -1: it does not enter
    of_offsets = rows[count:]
    offsets = np.take_along_axis(shape.offset_rows, of_offsets, axis=1)
    offsets = offsets * sense[:, np.take_along_axis(shape.offset_slot, of_offsets, axis=1)]
    through = block.carried[:, :, rows[:count], shape.place_element[:, None]].transpose(0, 2, 1, 3)
    direction = np.concatenate([through[:, :, 0], offsets], axis=1)
    gains = block.gain_u[:, None, :, None] * shape.gain_rows[:, rows].transpose(1, 0, 2) * direction[:, :, None]
    sources = np.zeros((*direction.shape[:2], shape.signature.sources, rows.shape[1]))
    sources[:, :count] = through[:, :, 1:]
    if shape.signature.common:
        common = block.common_rows[:, :, rows].transpose(0, 2, 1, 3)
        sources[:, :, -shape.signature.common :] += common * direction[:, :, None]
    return direction, np.concatenate([gains, sources], axis=2)


def moved_everywhere(block: Block) -> tuple[Floats, Floats]:
    """What a unit of each extra adds to all rows, as ``moved``."""
    shape = block.shape
    return moved(block, np.broadcast_to(np.arange(shape.rows), (len(shape.places) + len(shape.offsets), shape.rows)))


def line_of(block: Block, recorded: Model, white: Whitener) -> Line:
    """
    The line of each place of a bad connection, then of a semiconductor, of all problems.

    Parameters
    ----------
    recorded : Model
        With everything as recorded: (b, 1, …).
    white : Whitener
        Of its covariance: (b, …).
    """
    shape = block.shape
    rows, columns = shape.moved_rows, shape.moving_columns
    places = np.arange(len(rows))[:, None]
    direction, moving = moved(block, rows)
    moving = np.swapaxes(moving[:, places, columns], -1, -2)
    shared, precision = recorded.whole_shared[:, 0], white.precision
    residual = block.shown - recorded.whole_mean[:, 0]
    pull, held = precision @ residual[..., None], precision @ shared
    square = (np.swapaxes(shared, -1, -2) @ held)[:, columns[:, :, None], columns[:, None, :]]
    pulled = (np.swapaxes(shared, -1, -2) @ pull)[:, columns, 0]
    held = held[:, :, columns].transpose(0, 2, 1, 3)
    if rows.shape[1] > 1 + columns.shape[1]:
        # the rows move only within the span of the direction and the columns
        whole = _whole(np.concatenate([direction[..., None], moving], axis=-1), rows, shape.rows)
        basis = np.swapaxes(np.linalg.qr(whole).Q, -1, -2)
        of_rows = np.take_along_axis(basis, rows[None, :, None, :], axis=-1)
        direction, moving = (of_rows @ direction[..., None])[..., 0], of_rows @ moving
        pull_t, held_t = basis @ pull[:, None], basis @ held
        inner = basis @ precision[:, None] @ np.swapaxes(basis, -1, -2)
    else:
        pull_t, held_t = pull[:, rows], held[:, places, rows]
        inner = precision[:, rows[:, :, None], rows[:, None, :]]
    spread = np.linalg.inv(inner) if inner.shape[-1] > 1 else 1 / inner
    centre = spread @ pull_t
    slope = moving @ (pulled[..., None] - np.swapaxes(held_t, -1, -2) @ centre)
    crossed = held_t @ np.swapaxes(moving, -1, -2)
    linear = spread @ crossed
    square = (moving - moving @ square) @ np.swapaxes(moving, -1, -2) + np.swapaxes(crossed, -1, -2) @ linear
    of_moved = (centre * pull_t).sum(axis=(-2, -1)) - np.linalg.slogdet(inner)[1]
    constant = white.log_density(residual)[:, None] + 0.5 * of_moved

    def of_all(array: Floats) -> Floats:
        """Of all problems by place: (k, …)."""
        return np.swapaxes(array, 0, 1).reshape(array.shape[0] * array.shape[1], *array.shape[2:])

    return Line(
        logarithmic=len(block) * len(shape.places),
        constant=of_all(constant),
        matrix=(of_all(spread), of_all(linear + np.swapaxes(linear, -1, -2)), of_all(square)),
        vector=(of_all(centre[..., 0]), of_all(-direction - slope[..., 0])),
    )


def _whole(moving: Floats, rows: Integers, count: int) -> Floats:
    """Columns of the rows that move (b, places, m, q) as columns of all rows (b, places, n, q)."""
    whole = np.zeros((*moving.shape[:2], count, moving.shape[-1]))
    whole[:, np.arange(len(rows))[:, None], rows] = moving
    return whole


def ranges(block: Block) -> tuple[Floats, Floats]:
    """Lowest and highest coordinate of each place's size, (b, places and offsets)."""
    shape, limits = block.shape, block.limits
    scale = np.log(block.extra_scale[:, [place.branch for place in shape.places]])
    offsets = np.ones((len(block), len(shape.offsets)))
    low = [scale + math.log(limits["bad_connection.low_ohm"]), offsets * limits["series_semiconductor.low_v"]]
    high = [scale + math.log(limits["bad_connection.high_ohm"]), offsets * limits["series_semiconductor.high_v"]]
    return np.concatenate(low, axis=1), np.concatenate(high, axis=1)


def extras(block: Block, recorded: Model, white: Whitener) -> Density:
    """Densities (b, places and offsets) of the sizes of a bad connection, then of a semiconductor."""
    line = line_of(block, recorded, white)
    low, high = (edge.T for edge in ranges(block))
    found = integrated(line.log_density, low.ravel(), high.ravel())
    return found.shaped(*low.shape).transposed()
