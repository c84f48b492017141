"""American Wire Gauge by the formula of ASTM B258, so that no list of it can hold a slip."""

from __future__ import annotations

import math

from rules.errors import UnknownSize

SQUARE_MM_PER_CIRCULAR_MIL = math.pi / 4 * 0.0254**2
"""Area of a circle 0.001 in across. [mm²]"""

NUMBERS = tuple(range(30, -4, -1))
"""Gauge numbers of 30 to 4/0, smallest conductor first; 0, -1, -2, -3 stand for 1/0 to 4/0."""


def name(number: int) -> str:
    """
    The size text of a gauge number.

    >>> name(12), name(0), name(-3)
    ('12 AWG', '1/0 AWG', '4/0 AWG')
    """
    return f"{number} AWG" if number > 0 else f"{1 - number}/0 AWG"


def number(size: str) -> int:
    """
    The gauge number of a canonical size text, whether or not a table has it.

    >>> number("12 AWG"), number("4/0 AWG")
    (12, -3)

    Raises ``UnknownSize`` if the text is not such a size.
    """
    gauge, _, unit = size.partition(" ")
    digits = gauge.removesuffix("/0")
    if unit != "AWG" or not (digits.isascii() and digits.isdigit()) or len(digits) > 3 or digits.startswith("0"):
        raise UnknownSize(f"{size!r} is not an AWG size such as '12 AWG' or '4/0 AWG'")
    return 1 - int(digits) if gauge.endswith("/0") else int(digits)


def diameter_mm(number: int) -> float:
    """
    Diameter of the solid wire. [mm]

    ASTM B258: 36 AWG is 0.005 in, 4/0 is 0.46 in, and 39 equal ratios lie between them.

    >>> round(diameter_mm(12), 4)
    2.0525
    """
    return 0.127 * math.pow(92, (36 - number) / 39)


def circular_mils(number: int) -> float:
    """
    Square of the diameter in thousandths of an inch. [circular mil]

    >>> round(circular_mils(12))
    6530
    """
    return (diameter_mm(number) / 0.0254) ** 2


def area_mm2(number: int) -> float:
    """
    Cross-sectional area of the metal. [mm²]

    >>> round(area_mm2(12), 3)
    3.309
    """
    return circular_mils(number) * SQUARE_MM_PER_CIRCULAR_MIL


def rows() -> tuple[tuple[str, float, float, float], ...]:
    """Size, diameter [mm], circular mils and area [mm²] of every gauge, smallest first."""
    return tuple((name(n), diameter_mm(n), circular_mils(n), area_mm2(n)) for n in NUMBERS)
