"""
Which two causes a reading tells apart, and the current that it takes.

The pair is the one that matters most: both probable, and their outcomes far apart. A reading is conclusive where the
outcomes of the two lie the profile's ``next_reading.apart`` standard uncertainties from each other.
"""

from __future__ import annotations

import math

import numpy as np

from rules.diagnosis.shape import Floats, Integers

LEAST = 1e-3
"""Groups of less than this share of the most probable one's are left out."""


def groups_apart(weight: Floats, group: Integers, mean: Floats, covariance: Floats) -> tuple[int, int] | None:
    """
    The two groups that an outcome tells apart.

    Parameters
    ----------
    weight, group : arrays (a,)
    mean : array (a, k)
        Of the outcome under each atom.
    covariance : array (a, k, k)

    Returns
    -------
    tuple of int or None
        The more probable first; ``None`` where there is one group alone.

    Notes
    -----
    The largest ``min(p, q) (1 - exp(-d²/8))``: the second factor is one less the overlap of two Gaussians that are d
    standard deviations apart (Bhattacharyya).

    Examples
    --------
    >>> weight, group = np.array([0.5, 0.3, 0.2]), np.array([4, 7, 9])
    >>> groups_apart(weight, group, np.array([[0.0], [0.1], [9.0]]), np.ones((3, 1, 1)))
    (4, 9)
    """
    there = weight > 0
    weight, mean, covariance = weight[there], mean[there], covariance[there]
    names, at = np.unique(group[there], return_inverse=True)
    member = (at[:, None] == np.arange(len(names))) * weight[:, None]
    share = member.sum(axis=0)
    kept = np.argsort(-share, kind="stable")
    kept = kept[share[kept] >= LEAST * share.max()]
    if len(kept) < 2:
        return None
    part = (member / share)[:, kept].T
    centre = part @ mean
    square = np.einsum("ga,aij->gij", part, covariance + mean[:, :, None] * mean[:, None, :])
    spread = square - centre[:, :, None] * centre[:, None, :]
    one, two = np.triu_indices(len(kept), 1)
    apart = centre[one] - centre[two]
    between = (spread[one] + spread[two]) / 2
    distance = (apart * np.linalg.solve(between, apart[..., None])[..., 0]).sum(axis=-1)
    matter = np.minimum(share[kept[one]], share[kept[two]]) * -np.expm1(-np.maximum(distance, 0.0) / 8)
    best = int(matter.argmax())
    return int(names[kept[one[best]]]), int(names[kept[two[best]]])


def conclusive_level(apart: float, steady: float, variance: float, fixed: float, wanted: float) -> float:
    """
    Least level of current at which two outcomes are far enough apart.

    Parameters
    ----------
    apart, steady : float
        Between their means: at level one, and what does not grow with the current. [V]
    variance, fixed : float
        Likewise of the outcome. [V²]
    wanted : float
        Standard uncertainties.

    Returns
    -------
    float
        Infinite where no current is enough.

    Notes
    -----
    The smallest s with ``|steady + s apart| >= wanted sqrt(fixed + s² variance)``.

    Examples
    --------
    10 mV at level one against counts of 1 mV, and against a spread of 4 mV that grows with the current:

    >>> round(conclusive_level(0.010, 0.0, 0.0, 1e-6, 3), 3), conclusive_level(0.010, 0.0, 16e-6, 1e-6, 3)
    (0.3, inf)
    """
    square = apart**2 - wanted**2 * variance
    linear = 2 * apart * steady
    constant = steady**2 - wanted**2 * fixed
    if constant >= 0:
        return 0.0
    if not square:
        return -constant / linear if linear > 0 else math.inf
    inside = linear**2 - 4 * square * constant
    if inside < 0:
        return math.inf
    root = (-linear + math.sqrt(inside)) / (2 * square)
    return root if root > 0 else math.inf
