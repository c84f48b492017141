"""
How much an outcome that is not known yet will tell: the expected fall in entropy of a mixture's groups.

Each *atom* is one way in which things may be, with a weight and a Gaussian for the outcome; atoms of one *group* are
not told apart in what is said afterwards. The fall is the mean, over outcomes, of the divergence of the groups'
probabilities after the outcome from those before it (their mutual information), in nats. Outcomes are laid out the
same way each time: the same question has the same answer. Written throughout: c candidates, a atoms, g groups.

References
----------
D. V. Lindley, "On a measure of the information provided by an experiment", Annals of Mathematical Statistics 27
(1956) 986-1005.
"""

from __future__ import annotations

from functools import lru_cache
from statistics import NormalDist

import numpy as np

from rules.diagnosis.atoms import NEGLIGIBLE
from rules.diagnosis.gaussian import cholesky, whitener
from rules.diagnosis.shape import Floats

OUTCOMES = 64
"""Outcomes of one row that stand for all."""
SAMPLES = 192
"""Outcomes of several rows together that stand for all."""
TRIED = 512
"""Outcomes among which those of one row are chosen; each atom has at least four."""
TEMPERED = 0.5
"""Power of the weights by which outcomes are laid out: those of improbable atoms are looked at more often than they
come, and count less for it."""
LEAST = 1e-300


def entropy(shares: Floats) -> Floats:
    """
    Entropy (...) of probabilities (..., g). [nat]

    >>> float(entropy(np.array([0.5, 0.5, 0.0]))).__round__(6)
    0.693147
    """
    found: Floats = -(shares * np.log(np.maximum(shares, LEAST))).sum(axis=-1)
    return found


def fall_by_one(weight: Floats, member: Floats, mean: Floats, variance: Floats) -> Floats:
    """
    Expected fall in entropy by candidates of one row each.

    Parameters
    ----------
    weight : array (a,)
        Probabilities of the atoms; they sum to one.
    member : array (a, g)
        1 where an atom belongs to a group.
    mean, variance : array (c, a)
        Of the outcome under each atom.

    Returns
    -------
    array (c,)
        [nat]

    Examples
    --------
    Two equal causes whose outcomes never overlap, and two that say the same:

    >>> weight, member = np.array([0.5, 0.5]), np.eye(2)
    >>> fall_by_one(weight, member, np.array([[0.0, 9.0], [0.0, 0.0]]), np.full((2, 2), 0.25)).round(4).tolist()
    [0.6931, 0.0]
    """
    kept = weight > NEGLIGIBLE
    weight, member, mean, variance = weight[kept], member[kept], mean[:, kept], variance[:, kept]
    often = weight**TEMPERED
    often /= often.sum()
    spread = np.sqrt(variance)
    places = _quantiles(max(4, TRIED // len(weight)))
    tried = (mean[..., None] + spread[..., None] * places).reshape(len(mean), -1)
    order = tried.argsort(axis=-1)
    below = np.repeat(often / len(places), len(places))[order].cumsum(axis=-1)
    # one search for all candidates: each has its own whole number
    number = np.arange(len(mean))[:, None]
    steps = (np.arange(OUTCOMES) + 0.5) / OUTCOMES
    at = np.searchsorted((below + number).ravel(), (steps + number).ravel()).reshape(-1, OUTCOMES)
    at = np.minimum(at - number * tried.shape[1], tried.shape[1] - 1)
    outcome = np.take_along_axis(tried, np.take_along_axis(order, at, axis=-1), axis=-1)
    # the exponent is quadratic in the outcome: three columns of it times three rows of the atoms
    middle = mean.mean(axis=1, keepdims=True)
    apart, from_there = outcome - middle, mean - middle
    columns = np.stack([np.ones_like(apart), apart, apart**2], axis=-1)
    rows = np.stack([-0.5 * from_there**2 / variance - np.log(spread), from_there / variance, -0.5 / variance], axis=1)
    density = columns @ rows
    return _fall(weight, often, member, np.exp(density, out=density))


def fall_by_several(weight: Floats, member: Floats, mean: Floats, covariance: Floats) -> float:
    """
    Expected fall in entropy by one candidate of several rows.

    Parameters
    ----------
    weight, member : arrays (a,), (a, g)
        As for one row.
    mean : array (a, k)
    covariance : array (a, k, k)

    Returns
    -------
    float
        [nat]
    """
    kept = weight > NEGLIGIBLE
    weight, member, mean, covariance = weight[kept], member[kept], mean[kept], covariance[kept]
    often = weight**TEMPERED
    often /= often.sum()
    steps = (np.arange(SAMPLES) + 0.5) / SAMPLES
    atom = np.searchsorted(often.cumsum(), steps).clip(max=len(weight) - 1)
    white = whitener(covariance)
    points = normal_points(SAMPLES, mean.shape[-1])
    drawn, of_point = np.unique(atom, return_inverse=True)
    outcome = mean[atom] + (cholesky(covariance[drawn])[of_point] @ points[..., None])[..., 0]
    # whitened, all outcomes less all means: one product for all atoms
    whitened = (white.inverse.reshape(-1, mean.shape[-1]) @ outcome.T).reshape(len(weight), -1, SAMPLES)
    whitened -= white.inverse @ mean[..., None]
    log_density = white.log_scale[:, None] - 0.5 * np.einsum("aks,aks->as", whitened, whitened)
    density = np.exp(log_density - log_density.max(axis=0))
    return float(_fall(weight, often, member, density.T[None])[0])


def _fall(weight: Floats, often: Floats, member: Floats, density: Floats) -> Floats:
    """
    Expected fall (c,) by outcomes that were laid out by ``often``.

    Parameters
    ----------
    weight, often : arrays (a,)
    member : array (a, g)
    density : array (c, outcomes, a)
        Of the outcomes under each atom, but for a factor that all atoms of an outcome share.
    """
    of_groups = member[:, member.any(axis=0)] * weight[:, None]
    before = of_groups.sum(axis=0)
    columns = np.concatenate([of_groups, weight[:, None], often[:, None]], axis=1)
    found = (density.reshape(-1, len(weight)) @ columns).reshape(*density.shape[:-1], -1)
    joint, total, laid_out = found[..., :-2], found[..., -2], found[..., -1]
    counts = total / laid_out
    told = np.einsum("...g,...g->...", joint, np.log(np.maximum(joint, LEAST)) - np.log(before)) / total - np.log(total)
    fall: Floats = np.maximum((counts * told).sum(axis=-1) / counts.sum(axis=-1), 0.0)
    return fall


@lru_cache(maxsize=64)
def _quantiles(count: int) -> Floats:
    """The middles of so many equal shares of the standard normal."""
    return np.array([NormalDist().inv_cdf((place + 0.5) / count) for place in range(count)])


@lru_cache(maxsize=64)
def normal_points(count: int, dimensions: int) -> Floats:
    """
    Points (count, dimensions) that stand for independent standard normals: the same ones each time.

    Each has its opposite, so that the mean is zero, and they are turned so that their covariance is the identity.

    >>> points = normal_points(192, 3)
    >>> bool(np.allclose(points.mean(axis=0), 0)), bool(np.allclose(points.T @ points / 192, np.eye(3)))
    (True, True)
    """
    half = np.random.default_rng(20240101).standard_normal((count // 2, dimensions))
    if dimensions < len(half):
        half = half @ np.linalg.inv(np.linalg.cholesky(half.T @ half / len(half))).T
    points: Floats = np.concatenate([half, -half])
    return points
