"""
Causes that add to the rows in one place: a bad connection (a resistance) and a semiconductor (a voltage).

Along its size the mean moves in a straight line, and the covariance through a few columns alone: the gains of
the rows that it touches, and the doubts of the currents through it. What does not change is factored once a
place; then each size costs a handful of scalars (Woodbury's identity on those columns).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.block import Block, Model
from rules.diagnosis.gaussian import LOG_2PI, along, cholesky, forward, log_determinant
from rules.diagnosis.quadrature import Density, integrated
from rules.diagnosis.shape import Floats, Integers, Shape


@dataclass(frozen=True, slots=True, eq=False)
class Line:
    """
    Rows along the size of an extra, in scalars: arrays (k, …) of inner products under the inverse of the covariance
    that does not change, with p columns that do. There are k = b times places.
    """

    logarithmic: Floats
    """(k,): 1 where the coordinate is the logarithm of the size, 0 where it is the size."""
    constant: Floats
    """(k,): log density but for what follows."""
    rr: Floats
    rw: Floats
    ww: Floats
    """(k,): of residual and direction."""
    aa: Floats
    ab: Floats
    bb: Floats
    """(k, p, p): of the columns, ``a + size b``; ``ab`` is symmetric already."""
    ar: Floats
    aw: Floats
    br: Floats
    bw: Floats
    """(k, p)"""

    def log_density(self, coordinate: Floats, which: Integers) -> Floats:
        """Log density of the rows (…, nodes) at coordinates of the size of some of the extras."""
        logarithmic = self.logarithmic[which, None] > 0
        size = np.where(logarithmic, np.exp(np.where(logarithmic, coordinate, 0.0)), coordinate)
        identity = np.eye(self.ar.shape[-1])
        matrix = (self.aa[which] + identity, self.ab[which], self.bb[which])
        vector = (self.ar[which], self.br[which] - self.aw[which], -self.bw[which])
        log_scale, taken_up = along(size, matrix, vector)
        quadratic = self.rr[which, None] + size * (size * self.ww[which, None] - 2 * self.rw[which, None])
        return self.constant[which, None] - 0.5 * (quadratic - taken_up + log_scale)


def moved(block: Block) -> tuple[Floats, Floats]:
    """
    What a unit of each extra adds: the places of a bad connection, then those of a semiconductor.

    Returns
    -------
    tuple of arrays
        To the rows' means (b, places, n), and to the columns of their shared doubts (b, places, gains + s, n).
    """
    shape = block.shape
    sense = np.where(np.abs(block.amps) > 2 * block.amps_u, np.sign(block.amps), 0.0)
    sense = np.concatenate([sense, np.zeros((len(block), 1))], axis=1)  # slot -1: it does not enter
    offsets = shape.offset_rows * sense[:, shape.offset_slot]
    through = block.carried[..., shape.place_element]
    direction = np.concatenate([through[:, 0].transpose(0, 2, 1), offsets], axis=1)
    gains = block.gain_u[:, None, :, None] * shape.gain_rows * direction[:, :, None]
    sources = np.zeros((*direction.shape[:2], shape.signature.sources, shape.rows))
    sources[:, : len(shape.places)] = through[:, 1:].transpose(0, 3, 1, 2)
    if shape.signature.common:
        sources[:, :, -shape.signature.common :] += block.common_rows[:, None] * direction[:, :, None]
    return direction, np.concatenate([gains, sources], axis=2)


def line_of(block: Block, recorded: Model) -> Line:
    """
    The places of a bad connection, then those of a semiconductor.

    Parameters
    ----------
    recorded : Model
        With everything as recorded: (b, 1, …).
    """
    shape = block.shape
    direction, moving = moved(block)
    touched = _touched(shape)
    shared = recorded.whole_shared[:, 0]
    fixed = shared[:, None] * (1 - touched)[:, None]
    covariance = recorded.whole_own + fixed @ np.swapaxes(fixed, -1, -2)
    chosen, used = _columns(shape, touched)
    most = chosen.shape[1]
    places = np.arange(len(touched))[:, None]
    a = np.swapaxes(shared[:, :, chosen], 1, 2) * used[:, None, :]
    b = np.swapaxes(moving[:, places, chosen], -1, -2) * used[:, None, :]
    if shape.one_gain >= 0:
        # the gains of the one voltmeter and the one clamp act alike: one column, the first, stands for both
        count = len(shape.places)
        both = np.hypot(block.gain_u, block.reading_gain_u[:, :1])[:, :, None] * used[:count, :1]
        a[:, :count, :, 0] = recorded.whole_mean * both
        b[:, :count, :, 0] = direction[:, :count] * both
    residual = np.broadcast_to((block.shown - recorded.whole_mean[:, 0])[:, None], direction.shape)
    right = np.concatenate([residual[..., None], direction[..., None], a, b], axis=-1)
    lower = cholesky(covariance)
    white = forward(lower, right)
    gram = np.swapaxes(white, -1, -2) @ white
    first, second = slice(2, 2 + most), slice(2 + most, 2 + 2 * most)
    gram = gram.reshape(-1, *gram.shape[2:])
    mixed = gram[..., first, second]
    return Line(
        logarithmic=np.tile([1.0] * len(shape.places) + [0.0] * len(shape.offsets), len(block)),
        constant=-0.5 * (log_determinant(lower).ravel() + shape.rows * LOG_2PI),
        rr=gram[..., 0, 0],
        rw=gram[..., 0, 1],
        ww=gram[..., 1, 1],
        aa=gram[..., first, first],
        ab=mixed + np.swapaxes(mixed, -1, -2),
        bb=gram[..., second, second],
        ar=gram[..., first, 0],
        aw=gram[..., first, 1],
        br=gram[..., second, 0],
        bw=gram[..., second, 1],
    )


def _touched(shape: Shape) -> Floats:
    """(places, gains + s): 1 where a place moves the column of a gain or source."""
    of_places = np.concatenate([shape.place_gains, shape.place_sources], axis=1)
    of_offsets = np.concatenate(
        [shape.offset_gains, np.zeros((len(shape.offsets), shape.signature.sources), dtype=bool)], axis=1
    )
    touched = np.concatenate([of_places, of_offsets])
    touched[:, touched.shape[1] - shape.signature.common :] = True  # a column may move any row
    return touched.astype(float)


def _columns(shape: Shape, touched: Floats) -> tuple[Integers, Floats]:
    """Of each place: which columns move along its size, and 1 where one does (places, p)."""
    kept = touched.copy()
    if shape.one_gain >= 0:
        kept[: len(shape.places), shape.signature.gains + shape.one_gain] = 0.0
    order = np.argsort(-kept, axis=1, kind="stable")
    most = int(kept.sum(axis=1).max(initial=0))
    return order[:, :most], np.take_along_axis(kept, order, axis=1)[:, :most]


def ranges(block: Block) -> tuple[Floats, Floats]:
    """Lowest and highest coordinate of each place's size, (b, places and offsets)."""
    shape, limits = block.shape, block.limits
    scale = np.log(block.extra_scale[:, [place.branch for place in shape.places]])
    offsets = np.ones((len(block), len(shape.offsets)))
    low = [scale + math.log(limits["bad_connection.low_ohm"]), offsets * limits["series_semiconductor.low_v"]]
    high = [scale + math.log(limits["bad_connection.high_ohm"]), offsets * limits["series_semiconductor.high_v"]]
    return np.concatenate(low, axis=1), np.concatenate(high, axis=1)


def extras(block: Block, recorded: Model) -> tuple[Line, Density]:
    """Lines and densities of all places of a bad connection, then of a semiconductor."""
    line = line_of(block, recorded)
    low, high = ranges(block)
    return line, integrated(line.log_density, low.ravel(), high.ravel()).shaped(*low.shape)
