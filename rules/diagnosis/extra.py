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
from rules.diagnosis.shape import Floats, Shape


@dataclass(frozen=True, slots=True, eq=False)
class Line:
    """
    Rows along the size of an extra, in scalars: arrays (b, places, …) of inner products under the inverse of the
    covariance that does not change. With p columns that do.
    """

    logarithmic: Floats
    """(places,): 1 where the coordinate is the logarithm of the size, 0 where it is the size."""
    constant: Floats
    """(b, places): log density but for what follows."""
    rr: Floats
    rw: Floats
    ww: Floats
    """(b, places): of residual and direction."""
    aa: Floats
    ab: Floats
    bb: Floats
    """(b, places, p, p): of the columns, ``a + size b``; ``ab`` is symmetric already."""
    ar: Floats
    aw: Floats
    br: Floats
    bw: Floats
    """(b, places, p)"""

    def size(self, coordinate: Floats) -> Floats:
        """The size at a coordinate (b, places, …)."""
        logarithmic = self.logarithmic.reshape(-1, *(1,) * (coordinate.ndim - 2))
        return np.where(logarithmic > 0, np.exp(coordinate * logarithmic), coordinate)

    def log_density(self, coordinate: Floats) -> Floats:
        """Log density of the rows (b, places, nodes) at coordinates of the size."""
        size = self.size(coordinate)
        identity = np.eye(self.ar.shape[-1])
        log_scale, taken_up = along(
            size, (self.aa + identity, self.ab, self.bb), (self.ar, self.br - self.aw, -self.bw)
        )
        quadratic = self.rr[..., None] + size * (size * self.ww[..., None] - 2 * self.rw[..., None])
        return self.constant[..., None] - 0.5 * (quadratic - taken_up + log_scale)


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
    most, order = int(touched.sum(axis=1).max(initial=0)), np.argsort(-touched, axis=1, kind="stable")
    chosen, used = order[:, :most], np.take_along_axis(touched, order, axis=1)[:, :most]
    places = np.arange(len(touched))[:, None]
    a = np.swapaxes(shared[:, :, chosen], 1, 2) * used[:, None, :]
    b = np.swapaxes(moving[:, places, chosen], -1, -2) * used[:, None, :]
    residual = np.broadcast_to((block.shown - recorded.whole_mean[:, 0])[:, None], direction.shape)
    right = np.concatenate([residual[..., None], direction[..., None], a, b], axis=-1)
    lower = cholesky(covariance)
    white = forward(lower, right)
    gram = np.swapaxes(white, -1, -2) @ white
    first, second = slice(2, 2 + most), slice(2 + most, 2 + 2 * most)
    mixed = gram[..., first, second]
    return Line(
        logarithmic=np.array([1.0] * len(shape.places) + [0.0] * len(shape.offsets)),
        constant=-0.5 * (log_determinant(lower) + shape.rows * LOG_2PI),
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
    return np.concatenate([of_places, of_offsets]).astype(float)


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
    return line, integrated(line.log_density, *ranges(block))
