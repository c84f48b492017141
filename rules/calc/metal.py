"""Recognising the metal of a conductor by a measured resistance per metre."""

from __future__ import annotations

import math
from dataclasses import dataclass

from rules.calc.conductor import resistance_at_20c
from rules.calc.guard import require
from rules.tables.conductors import METALS, alpha_20c, resistance_20c_ohm_per_m

BELOW_MAXIMUM = 0.06
"""A metric conductor has between its standard's largest resistance and this share less. Common practice, no source."""

NOMINAL_U = 0.02
"""Relative standard uncertainty of an AWG or kcmil conductor about its nominal resistance. Our own default."""


@dataclass(frozen=True, slots=True)
class Candidate:
    """One metal, and how well a measured resistance fits it."""

    material: str
    expected_ohm_per_m: float
    """Of a typical conductor of this metal at 20 °C. [Ω/m]"""
    percent_iacs: float
    """Conductivity that was measured, if the conductor is of this metal and warms like it. [% IACS]"""
    deviation: float
    """Measured less expected, in standard uncertainties; above zero where it conducts worse."""
    fit: float
    """Probability that a conductor of this metal shows at least this deviation: 1 is perfect, 0.05 poor."""


def recognise(
    resistance_ohm_per_m: float, size: str, stranding: str, u_ohm_per_m: float, *, temperature_c: float = 20.0
) -> tuple[Candidate, ...]:
    r"""
    Which metals a conductor of known size may be of, the best first.

    Parameters
    ----------
    resistance_ohm_per_m : float
        Of one conductor, its terminations taken off. [Ω/m]
    size : str
        Canonical size text, as printed on it or gauged.
    stranding : str
        solid, stranded or flexible.
    u_ohm_per_m : float
        Standard uncertainty of the measured resistance, that of the length included. [Ω/m]
    temperature_c : float
        Of the metal while it was measured. [°C]

    Returns
    -------
    tuple of Candidate
        All metals of the tables. Several may fit: copper and tinned copper differ by 1 to 3 %, aluminium and
        copper-clad aluminium by 1.6 %, less than conductors differ among themselves.

    Raises
    ------
    UnknownSize
        If no table has the size or the stranding.
    InvalidQuantity
        If the resistance is not above zero, its uncertainty negative, or the temperature leaves no resistance.

    Notes
    -----
    The conductivity is :math:`\sigma = 1/\rho`, in percent of annealed copper of **the same conductor**: 100 times a
    typical copper conductor's resistance over the measured one. Resistivity over nominal area would err by 4 to 12 %
    in metric sizes, whose metal is less than their name says. A typical metric conductor lies in the middle of what is
    common, 3 % below its standard's maximum, rectangular ± 3 %; an American one at its nominal figure.

    References
    ----------
    IEC 60228:2004, whose figures are maxima; IEC 60028:1925 for 100 % IACS.

    Examples
    --------
    2.5 mm² stranded at 11.6 mΩ/m ± 2 %, 20 °C, is no copper:

    >>> [f"{c.material} {c.percent_iacs:.0f} % {c.fit:.2f}" for c in recognise(11.6e-3, "2.5 mm2", "stranded", 0.23e-3)]
    ['copper-clad aluminium 62 % 0.98', 'aluminium 62 % 0.56', 'tinned copper 62 % 0.00', 'copper 62 % 0.00']
    """
    require(resistance_ohm_per_m, resistance_ohm_per_m > 0, "a resistance must be above 0", "Ω/m")
    require(u_ohm_per_m, u_ohm_per_m >= 0, "a standard uncertainty must not be negative", "Ω/m")
    copper = _typical(size, "copper", stranding)[0]
    found = []
    for material in METALS:
        at_20c = float(resistance_at_20c(resistance_ohm_per_m, alpha_20c(material), temperature_c))
        expected, own_u = _typical(size, material, stranding)
        u = math.hypot(u_ohm_per_m * at_20c / resistance_ohm_per_m, own_u)
        deviation = (at_20c - expected) / u
        fit = math.erfc(abs(deviation) / math.sqrt(2))
        found.append(Candidate(material, expected, 100 * copper / at_20c, deviation, fit))
    return tuple(sorted(found, key=lambda candidate: abs(candidate.deviation)))


def _typical(size: str, material: str, stranding: str) -> tuple[float, float]:
    """Resistance at 20 °C of a typical conductor and its standard uncertainty among conductors. [Ω/m]"""
    tabulated = resistance_20c_ohm_per_m(size, material, stranding)
    if size.endswith(" mm2"):
        half = BELOW_MAXIMUM / 2
        return tabulated * (1 - half), tabulated * half / math.sqrt(3)
    return tabulated, tabulated * NOMINAL_U
