"""
Doubt of sums of readings: gain shared by readings of one meter, counts and wander each anew.

A measured drop, a mean of repeated readings and a computed drop (resistance times current) are all
sums of readings with weights. Written so, what two readings share takes care of itself: the gain
of one voltmeter acts on the *difference* of its two readings alone.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass
from statistics import NormalDist

from rules.errors import InvalidQuantity

STANDARD_NORMAL = NormalDist()


@dataclass(frozen=True, slots=True)
class Shown:
    """One value that a meter showed, less its zero, with what is doubtful about it."""

    value: float
    gain_key: str
    """What shares one gain: instrument, quantity, range and visit."""
    gain_u: float
    """Relative standard uncertainty of the gain."""
    each_u: float
    """Standard uncertainty of counts and display, each reading anew, in the value's unit."""
    wander_u: float = 0.0
    """Standard deviation of what was read itself, each reading anew, in the value's unit."""
    zero: float = 0.0
    """What was taken off as the meter's zero, in the value's unit."""
    is_poor: bool = False
    """What is doubtful about it is the profile's, at least in part: the meter or its figures are not recorded."""

    @property
    def own_variance(self) -> float:
        """Variance of what no other reading shares."""
        return self.each_u**2 + self.wander_u**2


@dataclass(frozen=True, slots=True)
class Weighted:
    """One reading in a sum."""

    weight: float
    shown: Shown


def gain_u(accuracy_percent: float) -> float:
    """
    Relative standard uncertainty of a meter's gain: rectangular, ± accuracy.

    References
    ----------
    JCGM 100:2008, 4.3.7.

    Examples
    --------
    >>> round(gain_u(0.5), 6)
    0.002887
    """
    return accuracy_percent / 100 / math.sqrt(3)


def each_u(counts: float, resolution: float) -> float:
    """
    Standard uncertainty of one reading from its counts and its display.

    Rectangular, ± counts × resolution, and the display's ± half a digit.

    References
    ----------
    JCGM 100:2008, 4.3.7 and F.2.2.1.

    Examples
    --------
    >>> round(each_u(2, 0.01), 5)
    0.0119
    """
    return resolution * math.sqrt(counts**2 / 3 + 1 / 12)


@dataclass(frozen=True, slots=True)
class Parts:
    """A sum of readings, and what each kind of doubt adds to its variance."""

    value: float
    gain_variance: float
    counts_variance: float
    wander_variance: float

    @property
    def variance(self) -> float:
        return self.gain_variance + self.counts_variance + self.wander_variance


def parts(terms: Iterable[Weighted]) -> Parts:
    """
    A weighted sum of readings with its variance by kind of doubt.

    Parameters
    ----------
    terms : iterable of Weighted
        A reading may occur several times; its weights add.

    Returns
    -------
    Parts
        Sum in the readings' unit times the weights', and three variances.

    Notes
    -----
    ``u² = Σ_gains (u_g Σ w v)² + Σ_readings (Σw)² u_each²``: JCGM 100:2008, equation 13, with
    correlation one within a gain and zero elsewhere.

    Examples
    --------
    >>> one = parts([Weighted(1, Shown(24.12, "a", 0.003, 0.01)), Weighted(-1, Shown(23.41, "a", 0.003, 0.01))])
    >>> round(one.gain_variance**0.5, 5), round(one.counts_variance**0.5, 4)
    (0.00213, 0.0141)
    """
    value = 0.0
    by_gain: dict[tuple[str, float], float] = defaultdict(float)
    weights: dict[int, float] = defaultdict(float)
    shown: dict[int, Shown] = {}
    for term in terms:
        part = term.weight * term.shown.value
        value += part
        by_gain[term.shown.gain_key, term.shown.gain_u] += part
        weights[id(term.shown)] += term.weight
        shown[id(term.shown)] = term.shown
    gain = sum((u * part) ** 2 for (_, u), part in by_gain.items())
    counts = sum((weight * shown[key].each_u) ** 2 for key, weight in weights.items())
    wander = sum((weight * shown[key].wander_u) ** 2 for key, weight in weights.items())
    return Parts(value, gain, counts, wander)


def total(terms: Iterable[Weighted]) -> tuple[float, float]:
    """
    Value and standard uncertainty of a weighted sum of readings.

    Parameters
    ----------
    terms : iterable of Weighted
        A reading may occur several times; its weights add.

    Returns
    -------
    tuple of float
        Sum and standard uncertainty, in the readings' unit times the weights'.

    Examples
    --------
    Two readings by one 0.5 % + 2 counts meter against two meters:

    >>> def volts(value, meter):
    ...     return Shown(value, meter, gain_u(0.5), each_u(2, 0.01))
    >>> one = total([Weighted(1, volts(24.12, "a")), Weighted(-1, volts(23.41, "a"))])
    >>> two = total([Weighted(1, volts(24.12, "a")), Weighted(-1, volts(23.41, "b"))])
    >>> round(one[1], 3), round(two[1], 3)
    (0.017, 0.098)
    """
    summed = parts(terms)
    return summed.value, math.sqrt(summed.variance)


STUDENT_95 = (12.706, 4.303, 3.182, 2.776, 2.571, 2.447, 2.365, 2.306, 2.262, 2.228)
"""Two-sided coverage factors of Student's t for 1 to 10 degrees of freedom. JCGM 100:2008, Table G.2; computed."""


def few_readings_factor(freedom: int) -> float:
    """
    By how much a standard deviation of few readings is widened to cover 95 % where a Gaussian takes its place.

    Parameters
    ----------
    freedom : int
        Degrees of freedom, readings less their means; 0 for a standard deviation that is known.

    References
    ----------
    JCGM 100:2008, G.3 and Table G.2.

    Examples
    --------
    >>> [round(few_readings_factor(freedom), 3) for freedom in (0, 2, 10, 1000)]
    [1.0, 2.195, 1.137, 1.001]
    """
    if freedom <= 0:
        return 1.0
    if freedom <= len(STUDENT_95):
        return STUDENT_95[freedom - 1] / STANDARD_NORMAL.inv_cdf(0.975)
    return math.sqrt(freedom / (freedom - 2))


def probability_above(value: float, limit: float, u: float) -> float:
    """
    Probability that what was measured or computed lies above a limit, taken as Gaussian.

    References
    ----------
    JCGM 106:2012, 7.2.

    Examples
    --------
    >>> round(probability_above(5.2, 5.0, 0.1), 3)
    0.977
    >>> probability_above(5.0, 5.0, 0.0)
    0.0
    """
    if u < 0 or not math.isfinite(u):
        raise InvalidQuantity(f"a standard uncertainty is finite and not below 0, got {u:g}")
    if u == 0:
        return 1.0 if value > limit else 0.0
    return STANDARD_NORMAL.cdf((value - limit) / u)
