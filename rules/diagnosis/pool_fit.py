"""
A pool of circuits fitted: sizes of its habits, and how well a set of habits that err explains all readings.

Every circuit is either as recorded, and then a Gaussian of the sizes, or something else is wrong with it, which
says nothing of them: a mixture, fitted by expectation and maximisation, and summed around the best sizes by
Laplace's approximation.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from rules.diagnosis.pool import Pool
from rules.diagnosis.shape import Floats, Integers

MOST_STEPS = 200
SETTLED = 1e-7
"""Largest step, in standard uncertainties, at which sizes have settled."""
SCANNED = 81
"""Sizes at which a habit is looked at by itself, evenly up to ``WIDTHS`` prior standard deviations on both sides."""
WIDTHS = 4.0


@dataclass(frozen=True, slots=True, eq=False)
class Fit:
    """Sizes of E habits, of which those without variance before anything was read are zero."""

    size: Floats
    """(E,)"""
    covariance: Floats
    """(E, E)"""
    log_evidence: float
    """Of all circuits."""
    sound: Floats
    """(m,): probability that a circuit is as recorded."""
    curve: Floats
    """(E, E): what the readings alone tell, the inverse of a covariance."""


def fitted(pool: Pool, variance: Floats, start: Floats) -> Fit:
    """
    Sizes and evidence where the habits have these variances before anything is read.

    Parameters
    ----------
    variance : array (E,)
        Zero for a habit that does not err.
    start : array (E,)
        Sizes to start from.
    """
    on = np.flatnonzero(variance > 0)
    prior = 1 / variance[on]
    size = np.where(variance > 0, start, 0.0)
    for _ in range(MOST_STEPS):
        log_sound, sound = _sound(pool, size)
        curve, pull = _summed(pool, sound)
        precision = curve[np.ix_(on, on)] + np.diag(prior)
        new = np.linalg.solve(precision, pull[on])
        step = (new - size[on]) * np.sqrt(np.diag(precision))
        size[on] = new
        if np.abs(step).max(initial=0.0) < SETTLED:
            break
    log_sound, sound = _sound(pool, size)
    curve, _ = _summed(pool, sound)
    covariance = np.zeros((len(size), len(size)))
    covariance[np.ix_(on, on)] = np.linalg.inv(curve[np.ix_(on, on)] + np.diag(prior))
    scale = np.sqrt(np.outer(variance[on], variance[on]))
    sign, log_determinant = np.linalg.slogdet(
        np.eye(len(on)) + scale * (curve - _lost(pool, size, sound))[np.ix_(on, on)]
    )
    if sign <= 0:  # circuits that may be either way bend the density upwards
        _, log_determinant = np.linalg.slogdet(np.eye(len(on)) + scale * curve[np.ix_(on, on)])
    log_likelihood = float(np.logaddexp(log_sound, pool.otherwise).sum())
    evidence = log_likelihood - 0.5 * float((size[on] ** 2 * prior).sum()) - 0.5 * float(log_determinant)
    return Fit(size, covariance, evidence, sound, curve)


def _sound(pool: Pool, size: Floats) -> tuple[Floats, Floats]:
    """Log of prior times density as recorded, and the probability of it (m,)."""
    local = np.append(size, 0.0)[pool.index]
    bent = (pool.curve @ local[..., None])[..., 0]
    log_sound = pool.recorded + (local * (pool.pull - 0.5 * bent)).sum(axis=1)
    return log_sound, np.exp(log_sound - np.logaddexp(log_sound, pool.otherwise))


def _lost(pool: Pool, size: Floats, sound: Floats) -> Floats:
    """Curvature (E, E) that is lost because circuits may be either way."""
    slope = _slope(pool, size)
    count = len(pool.habits) + 1
    either = (sound * (1 - sound))[:, None, None] * slope[:, :, None] * slope[:, None, :]
    return summed_at(_pairs(pool), either, count * count).reshape(count, count)[:-1, :-1]


def _slope(pool: Pool, size: Floats) -> Floats:
    """(m, k): of the log density as recorded, at sizes."""
    local = np.append(size, 0.0)[pool.index]
    slope: Floats = pool.pull - (pool.curve @ local[..., None])[..., 0]
    return slope


def _pairs(pool: Pool) -> Integers:
    """(m, k, k): place of each pair of a circuit's habits in a flat matrix of all."""
    return pool.index[:, :, None] * (len(pool.habits) + 1) + pool.index[:, None, :]


def _summed(pool: Pool, sound: Floats) -> tuple[Floats, Floats]:
    """Curvature (E, E) and slope (E,) of all circuits, each as far as it is as recorded."""
    count = len(pool.habits) + 1
    curve = summed_at(_pairs(pool), sound[:, None, None] * pool.curve, count * count)
    pull = summed_at(pool.index, sound[:, None] * pool.pull, count)
    return curve.reshape(count, count)[:-1, :-1], pull[:-1]


def summed_at(places: Integers, values: Floats, count: int) -> Floats:
    """Sums (count,) of values by their places, both of one shape."""
    return np.asarray(np.bincount(places.ravel(), values.ravel(), count), dtype=np.float64)


@dataclass(frozen=True, slots=True, eq=False)
class Scan:
    """Each habit looked at by itself, the others as they are (E,)."""

    best: Floats
    """Its best size."""
    gain: Floats
    """What it adds to the log evidence."""


def scanned(pool: Pool, size: Floats, spread: Floats) -> Scan:
    """
    What each habit would explain beyond the sizes at hand.

    Parameters
    ----------
    size : array (E,)
        Sizes at hand.
    spread : array (E,)
        Standard deviation of each before anything is read.

    Notes
    -----
    Exact for one habit, but the others do not give way: it nominates, it does not decide.
    """
    count = len(spread)
    slope = _slope(pool, size)
    log_sound, _ = _sound(pool, size)
    curve = np.einsum("mkk->mk", pool.curve)
    grid = np.linspace(-WIDTHS, WIDTHS, SCANNED)
    total = np.zeros((count + 1, SCANNED))
    wide = np.append(spread, 0.0)[pool.index]
    for slot in range(pool.index.shape[1]):
        step = wide[:, slot, None] * grid
        along = log_sound[:, None] + step * (slope[:, slot, None] - 0.5 * step * curve[:, slot, None])
        gained = np.logaddexp(along, pool.otherwise[:, None])
        gained -= np.logaddexp(log_sound, pool.otherwise)[:, None]
        np.add.at(total, pool.index[:, slot], gained)
    total = total[:-1]
    joint = total - 0.5 * grid**2
    best = joint.argmax(axis=1)
    top = joint[np.arange(count), best]
    summed = np.exp(joint - top[:, None]).sum(axis=1) * (grid[1] - grid[0]) / np.sqrt(2 * np.pi)
    return Scan(size + spread * grid[best], top + np.log(summed))
