"""Whether two values of one thing agree within their doubts."""

from __future__ import annotations

import math

from rules.calc.doubt import STANDARD_NORMAL
from rules.errors import InvalidQuantity

COVERAGE = 2.0
"""Coverage factor of the expanded uncertainties in an E_n ratio: about 95 % of a Gaussian."""


def en_ratio(first: float, first_u: float, second: float, second_u: float) -> float:
    """
    E_n ratio of two values: their distance over the expanded uncertainty of it; above 1 they disagree.

    Parameters
    ----------
    first, second : float
        Two values of one thing, in one unit.
    first_u, second_u : float
        Their standard uncertainties, which share nothing, in that unit.

    Returns
    -------
    float
        Not below zero; infinite where two exact values differ. [1]

    Notes
    -----
    ``E_n = |a − b| / √(U_a² + U_b²)`` with ``U = 2 u``.

    References
    ----------
    ISO 13528:2022, 9.7, and ISO/IEC 17043:2010, B.3.1.3 e), from memory.

    Examples
    --------
    >>> round(en_ratio(24.12, 0.071, 23.90, 0.069), 2)
    1.11
    """
    if first_u < 0 or second_u < 0 or not math.isfinite(first_u + second_u):
        raise InvalidQuantity(f"a standard uncertainty is finite and not below 0, got {first_u:g} and {second_u:g}")
    apart, expanded = abs(first - second), COVERAGE * math.hypot(first_u, second_u)
    if expanded == 0:
        return 0.0 if apart == 0 else math.inf
    return apart / expanded


def probability_apart(difference: float, u: float) -> float:
    """
    How sure it is that a difference is not zero: the share of a Gaussian about zero that lies nearer to zero.

    Examples
    --------
    >>> round(probability_apart(-2.0, 1.0), 3), probability_apart(0.0, 0.0)
    (0.954, 0.0)
    """
    if u < 0 or not math.isfinite(u):
        raise InvalidQuantity(f"a standard uncertainty is finite and not below 0, got {u:g}")
    if u == 0:
        return 0.0 if difference == 0 else 1.0
    return 1.0 - 2.0 * STANDARD_NORMAL.cdf(-abs(difference) / u)
