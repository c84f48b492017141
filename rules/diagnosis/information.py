"""
How much an outcome that is not known yet will tell: the expected fall in entropy of a mixture's groups.

Each *atom* is one way in which things may be, with a weight and a Gaussian for the outcome; atoms of one *group* are
not told apart in what is said afterwards. The fall is the mean, over outcomes, of the divergence of the groups'
probabilities after the outcome from those before it (their mutual information), in nats. Outcomes are laid out the
same way each time: the same question has the same answer. Written throughout: b problems, c candidates, a atoms, g groups.

References
----------
D. V. Lindley, "On a measure of the information provided by an experiment", Annals of Mathematical Statistics 27
(1956) 986-1005.
"""

from __future__ import annotations

from functools import lru_cache
from statistics import NormalDist

import numpy as np

from rules.diagnosis.gaussian import cholesky, forward, log_determinant
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
NEGLIGIBLE = 1e-7
"""Weight of an atom below which it is left out of the outcomes of one row."""
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
    weight : array (b, a)
        Probabilities of the atoms; they sum to one.
    member : array (b, a, g)
        1 where an atom belongs to a group.
    mean, variance : array (b, c, a)
        Of the outcome under each atom.

    Returns
    -------
    array (b, c)
        [nat]

    Examples
    --------
    Two equal causes whose outcomes never overlap, and two that say the same:

    >>> weight, member = np.array([[0.5, 0.5]]), np.eye(2)[None]
    >>> falls = fall_by_one(weight, member, np.array([[[0.0, 9.0], [0.0, 0.0]]]), np.full((1, 2, 2), 0.25))
    >>> falls.round(4).tolist()
    [[0.6931, 0.0]]
    """
    found = np.empty(mean.shape[:2])
    for number, shares in enumerate(weight):  # one after another: the arrays then stay in the processor's cache
        kept = shares > NEGLIGIBLE
        found[number] = _by_one(
            shares[kept], member[number, kept], mean[number, :, kept].T, variance[number, :, kept].T
        )
    return found


def _by_one(weight: Floats, member: Floats, mean: Floats, variance: Floats) -> Floats:
    """Expected fall (c,) of one problem; arrays as above, without their first axis."""
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
    density = outcome[..., None] - mean[:, None]
    density /= spread[:, None]
    density *= density
    density *= -0.5
    np.exp(density, out=density)
    density /= spread[:, None]
    return _fall(weight, often, member, density)


def fall_by_several(weight: Floats, member: Floats, mean: Floats, covariance: Floats) -> Floats:
    """
    Expected fall in entropy by one candidate of several rows.

    Parameters
    ----------
    weight, member : arrays (b, a), (b, a, g)
        As for one row.
    mean : array (b, a, k)
    covariance : array (b, a, k, k)

    Returns
    -------
    array (b,)
        [nat]
    """
    often = weight**TEMPERED
    often /= often.sum(axis=1, keepdims=True)
    steps = (np.arange(SAMPLES) + 0.5) / SAMPLES
    atom = (often.cumsum(axis=1)[:, None] < steps[:, None]).sum(axis=-1).clip(max=weight.shape[1] - 1)
    lower = cholesky(covariance)
    rows = np.arange(len(weight))[:, None]
    points = normal_points(SAMPLES, mean.shape[-1])
    outcome = mean[rows, atom] + (lower[rows, atom] @ points[..., None])[..., 0]
    white = forward(lower, np.swapaxes(outcome[:, None] - mean[:, :, None], -1, -2))
    log_density = -0.5 * ((white**2).sum(axis=-2) + log_determinant(lower)[..., None])
    density = np.exp(log_density - log_density.max(axis=1, keepdims=True))
    return _fall(weight[:, None], often[:, None], member[:, None], np.swapaxes(density, -1, -2)[:, None])[:, 0]


def _fall(weight: Floats, often: Floats, member: Floats, density: Floats) -> Floats:
    """
    Expected fall (..., c) by outcomes that were laid out by ``often``.

    Parameters
    ----------
    weight, often : arrays (..., a)
    member : array (..., a, g)
    density : array (..., c, outcomes, a)
        Of the outcomes under each atom, but for a factor that all atoms of an outcome share.
    """
    joint = density @ (weight[..., None] * member)
    total = joint.sum(axis=-1)
    counts = total / (density @ often[..., None])[..., 0]
    before = (weight[..., None] * member).sum(axis=-2)[..., None, :]
    after = joint / total[..., None]
    told = (after * np.log(np.maximum(after, LEAST) / np.maximum(before, LEAST))).sum(axis=-1)
    fall: Floats = (counts * told).sum(axis=-1) / counts.sum(axis=-1)
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
