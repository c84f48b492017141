"""Heat in a joint, and what its rise becomes at another current."""

from __future__ import annotations

import numpy as np

from rules.calc.guard import Floats, require


def joint_heat_w(resistance_ohm: Floats, current_a: Floats) -> Floats:
    """
    What a joint turns into heat. [W]

    Parameters
    ----------
    resistance_ohm : float or array
        Across the joint. [Ω]
    current_a : float or array
        Steady, either sense. [A]

    Raises
    ------
    InvalidQuantity
        If a resistance is negative.

    Examples
    --------
    50 to 200 µΩ at 1200 A, as a joint that deteriorates:

    >>> [round(float(joint_heat_w(ohm, 1200.0))) for ohm in (50e-6, 200e-6)]
    [72, 288]
    """
    require(resistance_ohm, np.greater_equal(resistance_ohm, 0), "a resistance must not be negative", "Ω")
    return resistance_ohm * current_a**2


def rise_at(rise_k: Floats, current_a: Floats, full_a: Floats, power: float = 2.0) -> Floats:
    r"""
    Rise of a joint at another current. [K]

    Parameters
    ----------
    rise_k : float or array
        Over a similar joint or the ambient, at ``current_a``. [K]
    current_a : float or array
        While it was read. [A]
    full_a : float or array
        The current asked for. [A]
    power : float
        2 for heat that grows with the square of the current and leaves in proportion to the rise.

    Raises
    ------
    InvalidQuantity
        If the current while it was read is not above zero.

    Notes
    -----
    :math:`\Delta T_2 = \Delta T_1 (I_2 / I_1)^n`; practice takes n from 1.6 to 2, since radiation and convection
    carry off more than in proportion.

    References
    ----------
    Thermographers' practice; see ``tests/published/test_maintenance.py``.

    Examples
    --------
    5 K at 40 % of full load:

    >>> round(float(rise_at(5.0, 0.4, 1.0)), 1), round(float(rise_at(5.0, 0.4, 1.0, 1.6)), 1)
    (31.2, 21.7)
    """
    require(current_a, np.greater(current_a, 0), "the current while a rise was read must be above 0", "A")
    return rise_k * (full_a / current_a) ** power
