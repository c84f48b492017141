"""How many bad ones may be left when only some of all were read."""

from __future__ import annotations

import math

from rules.errors import InvalidQuantity


def most_bad(total: int, read: int, bad: int, confidence: float) -> int:
    """
    Upper bound on the number of bad ones among all, when some were read and some of these were bad.

    Parameters
    ----------
    total : int
        All there are.
    read : int
        Of them, drawn at random and read without error.
    bad : int
        Of the read ones, found bad.
    confidence : float
        Of the one-sided bound, between 0 and 1.

    Returns
    -------
    int
        The largest number of bad ones in all with which finding so few has a probability above ``1 − confidence``.

    Notes
    -----
    The number found is hypergeometric; its distribution falls as the number in all grows, so that the bound is found
    by halving. Without a bad one it is near ``3 / read`` of all at 95 % ("rule of three"), and with ``total`` without
    end it is the bound of Clopper and Pearson.

    References
    ----------
    C. J. Clopper, E. S. Pearson, Biometrika 26 (1934) 404; J. A. Hanley, A. Lippman-Hand, JAMA 249 (1983) 1743.

    Examples
    --------
    >>> most_bad(100, 30, 0, 0.95), most_bad(100, 100, 2, 0.95)
    (8, 2)
    """
    if not (0 <= bad <= read <= total and read > 0 and 0 < confidence < 1):
        raise InvalidQuantity(
            f"of {total} there can be {read} read with {bad} bad, at a confidence of {confidence:g}, only if each is part of the other"
        )
    low, high = bad, total - (read - bad)
    while low < high:
        middle = (low + high + 1) // 2
        probability = at_most(bad, total, middle, read)
        if probability > 1 - confidence and not math.isclose(probability, 1 - confidence, rel_tol=1e-9):
            low = middle
        else:
            high = middle - 1
    return low


def at_most(found: int, total: int, bad: int, read: int) -> float:
    """
    Probability of at most ``found`` bad ones among ``read`` drawn from ``total`` of which ``bad`` are bad.

    Examples
    --------
    >>> round(at_most(0, 100, 8, 30), 4)
    0.0507
    """
    least = max(0, read - (total - bad))
    logs = [
        _log_choices(bad, k) + _log_choices(total - bad, read - k) - _log_choices(total, read)
        for k in range(least, min(found, bad, read) + 1)
    ]
    return min(1.0, math.fsum(map(math.exp, logs)))


def _log_choices(of: int, some: int) -> float:
    return math.lgamma(of + 1) - math.lgamma(some + 1) - math.lgamma(of - some + 1)
