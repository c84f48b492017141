"""Temperature of a conductor in service: what its own current adds to the ambient."""

from __future__ import annotations

import numpy as np

from rules.calc.guard import Floats, require


def service_temperature_c(
    ambient_c: Floats,
    current_a: Floats,
    ampacity_a: Floats,
    limit_c: Floats,
    reference_ambient_c: Floats = 30.0,
) -> Floats:
    r"""
    Temperature at which a conductor settles while it carries a steady current.

    Parameters
    ----------
    ambient_c : float or array
        Around the cable, without its own heat. [°C]
    current_a : float or array
        Steady, either sense. [A]
    ampacity_a : float or array
        Current that brings the conductor to ``limit_c`` in an ambient of ``reference_ambient_c``: as tabulated, times
        the factor for grouping, **not** times that for the ambient. [A]
    limit_c : float or array
        Temperature that the tabulated capacity stands for: 70 °C for PVC, 90 °C for XLPE. [°C]
    reference_ambient_c : float or array
        Ambient that the tabulated capacity is based on. [°C]

    Returns
    -------
    float or array
        Broadcast shape of the inputs; above ``limit_c`` where the current is too much, where it is only a sign
        that it is, not a forecast. [°C]

    Raises
    ------
    InvalidQuantity
        If a capacity is not above zero, or a limit not above the reference ambient.

    Notes
    -----
    :math:`T = T_a + (T_{max} - T_{a,ref}) (I / I_z)^2`. Heat grows with the square of the current and leaves in
    proportion to the rise. The growth of resistance with temperature is left out, so that the rise comes out high
    below full load: by at most 1.4 K of the 40 K of PVC-insulated copper, 3.1 K of the 60 K of XLPE. It is the law
    behind the printed ambient factors: at :math:`I_z \sqrt{(T_{max} - T_a)/(T_{max} - T_{a,ref})}` the conductor
    has :math:`T_{max}` in any ambient.

    References
    ----------
    IEC 60364-5-52:2009, Annex B, ambient factors; NFPA 70 310.15(B), the same equation. Both computed, see
    ``tests/published/test_ampacity.py``.

    Examples
    --------
    4 mm² copper in PVC, clipped to a wall (36 A), carries 18 A in 25 °C:

    >>> round(service_temperature_c(25.0, 18.0, 36.0, 70.0), 3)
    35.0
    """
    require(ampacity_a, np.greater(ampacity_a, 0), "a capacity must be above 0", "A")
    require(limit_c, np.greater(limit_c, reference_ambient_c), "a limit must be above the reference ambient", "°C")
    return ambient_c + (limit_c - reference_ambient_c) * (current_a / ampacity_a) ** 2
