"""Refusing values that cannot be, for functions that take floats and arrays alike."""

from __future__ import annotations

from typing import TypeAlias

import numpy as np
import numpy.typing as npt

from rules.errors import InvalidQuantity

Floats: TypeAlias = float | npt.NDArray[np.float64]
"""One value or an array of them."""


def require(value: Floats, holds: npt.ArrayLike, what: str, unit: str) -> None:
    """
    Refuse values for which a condition does not hold; NaN holds for none. Names the first of them.

    Parameters
    ----------
    value : float or array
        What is looked at. [unit]
    holds : bool or array
        Whether the condition holds, of a shape that ``value`` broadcasts to.
    what : str
        The condition in words.
    unit : str
        Unit to write behind the value.

    Raises
    ------
    InvalidQuantity
        ``what``, and the first value for which it does not hold.

    Examples
    --------
    >>> require(-1.0, np.greater_equal(-1.0, 0), "a length must not be negative", "m")
    Traceback (most recent call last):
    rules.errors.InvalidQuantity: a length must not be negative, got -1 m
    """
    if np.all(holds):
        return
    wrong = np.broadcast_to(value, np.shape(holds))[~np.asarray(holds)].flat[0]
    raise InvalidQuantity(f"{what}, got {wrong:g} {unit}".rstrip())
