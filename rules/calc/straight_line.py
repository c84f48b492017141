"""A straight line through readings: of drop against current, the slope is a resistance and the intercept an offset."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from rules.errors import InvalidQuantity


@dataclass(frozen=True, slots=True)
class StraightLine:
    """A line fitted by least squares, each point of equal weight."""

    slope: float
    slope_u: float
    """Standard deviation, from the scatter of the points; nan where there are no more points than it takes."""
    intercept: float
    """0 of a line through the origin."""
    intercept_u: float
    residual_sd: float
    freedom: int
    """Points less what is fitted."""


def fit(x: Sequence[float], y: Sequence[float], through_origin: bool = False) -> StraightLine:
    """
    Fit a line.

    Parameters
    ----------
    x, y : sequence of float
        Of equal length.
    through_origin : bool
        No current, no drop: the intercept is zero.

    Raises
    ------
    InvalidQuantity
        If the points are too few, or all at one x.

    References
    ----------
    Ordinary least squares. Against the certified values of NIST StRD (Norris, NoInt1, NoInt2) in
    ``tests/published/test_nist_strd.py``.

    Examples
    --------
    0.5 V and 40 mΩ, read at three currents:

    >>> line = fit([2.0, 6.0, 12.0], [0.58, 0.74, 0.98])
    >>> round(line.slope, 6), round(line.intercept, 6)
    (0.04, 0.5)
    """
    count, fitted = len(x), 1 if through_origin else 2
    if count != len(y) or count < fitted:
        raise InvalidQuantity(f"a line takes at least {fitted} points with x and y each, got {count} and {len(y)}")
    middle_x, middle_y = (0.0, 0.0) if through_origin else (math.fsum(x) / count, math.fsum(y) / count)
    apart = [value - middle_x for value in x]
    square = math.fsum(value**2 for value in apart)
    if square <= 0:
        raise InvalidQuantity(f"a line takes points at different x, got all at {x[0]:g}")
    slope = math.fsum(a * (value - middle_y) for a, value in zip(apart, y, strict=True)) / square
    residuals = [value - middle_y - slope * a for a, value in zip(apart, y, strict=True)]
    freedom = count - fitted
    residual_sd = math.sqrt(math.fsum(r**2 for r in residuals) / freedom) if freedom else math.nan
    return StraightLine(
        slope=slope,
        slope_u=residual_sd / math.sqrt(square),
        intercept=middle_y - slope * middle_x,
        intercept_u=0.0 if through_origin else residual_sd * math.sqrt(1 / count + middle_x**2 / square),
        residual_sd=residual_sd,
        freedom=freedom,
    )
