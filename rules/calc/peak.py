"""What a peak of current leaves a load, and what a steady current costs in a year."""

from __future__ import annotations

HOURS_A_YEAR = 8760.0
"""Of 365 days. [h]"""


def lowest_at_peak_v(source_v: float, peak_a: float, loop_ohm: float, source_ohm: float = 0.0) -> float:
    """
    Voltage at a load while it draws its peak current.

    Parameters
    ----------
    source_v : float
        At the source's terminals without that current. [V]
    peak_a : float
        [A]
    loop_ohm : float
        Both legs from the source's terminals to the load. [ohm]
    source_ohm : float
        The source's own resistance. [ohm]

    Returns
    -------
    float
        Below zero where the path cannot carry the peak at all. [V]

    Notes
    -----
    :math:`V_{min} = V_s - I_{pk} (R_{loop} + R_{source})`; steady while the peak lasts, inductance and storage left out.

    Examples
    --------
    A lock of 1 A that starts with 5 A, on 24 V through 1.9 Ω:

    >>> round(lowest_at_peak_v(24.0, 5.0, 1.9), 2), round(lowest_at_peak_v(24.0, 1.0, 1.9), 2)
    (14.5, 22.1)
    """
    return source_v - peak_a * (loop_ohm + source_ohm)


def energy_kwh_a_year(loss_w: float, duty: float) -> float:
    """
    Energy that a loss takes in a year. [kWh]

    Parameters
    ----------
    loss_w : float
        While the current flows. [W]
    duty : float
        Share of the year in which it flows, 0 to 1.

    Examples
    --------
    >>> round(energy_kwh_a_year(12.0, 0.5), 2)
    52.56
    """
    return loss_w / 1000 * HOURS_A_YEAR * duty
