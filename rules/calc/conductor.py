"""
Resistance of conductors and of their terminations.

Pure functions on floats or arrays in SI units, area in mm²; arrays broadcast against each other.
"""

from __future__ import annotations

import numpy as np

from rules.calc.guard import Floats, require
from rules.tables.conductors import resistivity_20c

REFERENCE_AREA_MM2 = 10.0
"""Area for which the median of a healthy termination is stated. [mm²]"""


def conductor_resistance_ohm(
    one_way_length_m: Floats,
    resistance_20c_ohm_per_m: Floats,
    alpha_20c_per_k: Floats,
    temperature_c: Floats,
    parallel: Floats = 1.0,
) -> Floats:
    r"""
    Resistance of one leg of a run.

    Parameters
    ----------
    one_way_length_m : float or array
        Along the cable, start to end. [m]
    resistance_20c_ohm_per_m : float or array
        Of a single conductor at 20 °C. [Ω/m]
    alpha_20c_per_k : float or array
        Temperature coefficient at 20 °C. [1/K]
    temperature_c : float or array
        Of the metal. [°C]
    parallel : float or array
        Number of equal conductors side by side.

    Returns
    -------
    float or array
        Broadcast shape of the inputs. [Ω]

    Raises
    ------
    InvalidQuantity
        If a length is negative, a resistance not above zero, ``parallel`` below 1, or the temperature
        so low that the linear law gives no resistance.

    Notes
    -----
    :math:`R = L\, r_{20} [1 + \alpha_{20}(T - 20)] / n`. Terminations are not included.

    References
    ----------
    Linear law and coefficient of copper: IEC 60028:1925.

    Examples
    --------
    29 m of 4 mm² copper at 20 °C:

    >>> round(conductor_resistance_ohm(29, 4.61e-3, 0.00393, 20), 4)
    0.1337
    """
    require(one_way_length_m, np.greater_equal(one_way_length_m, 0), "a length must not be negative", "m")
    require(resistance_20c_ohm_per_m, np.greater(resistance_20c_ohm_per_m, 0), "a resistance must be above 0", "Ω/m")
    require(parallel, np.greater_equal(parallel, 1), "the number of parallel conductors must be 1 or more", "")
    at_20c = one_way_length_m * resistance_20c_ohm_per_m / parallel
    return at_temperature(at_20c, alpha_20c_per_k, temperature_c)


def at_temperature(resistance_20c_ohm: Floats, alpha_20c_per_k: Floats, temperature_c: Floats) -> Floats:
    """
    A resistance known at 20 °C, at another temperature.

    Parameters
    ----------
    resistance_20c_ohm : float or array
        At 20 °C. [Ω, or Ω/m]
    alpha_20c_per_k : float or array
        Temperature coefficient at 20 °C. [1/K]
    temperature_c : float or array
        Of the metal. [°C]

    Returns
    -------
    float or array
        In the unit of the input. [Ω, or Ω/m]

    Raises
    ------
    InvalidQuantity
        If the temperature is so low that the linear law gives no resistance (below -234 °C for copper).

    Examples
    --------
    >>> round(at_temperature(1.0, 0.00393, 70.0), 4)
    1.1965
    """
    return resistance_20c_ohm * _warming(alpha_20c_per_k, temperature_c)


def resistance_at_20c(resistance_ohm: Floats, alpha_20c_per_k: Floats, temperature_c: Floats) -> Floats:
    """
    A resistance found at some temperature, referred to 20 °C: the inverse of ``at_temperature``.

    Parameters
    ----------
    resistance_ohm : float or array
        At ``temperature_c``. [Ω, or Ω/m]
    alpha_20c_per_k : float or array
        Temperature coefficient at 20 °C. [1/K]
    temperature_c : float or array
        Of the metal. [°C]

    Returns
    -------
    float or array
        In the unit of the input. [Ω, or Ω/m]

    Raises
    ------
    InvalidQuantity
        If the temperature is so low that the linear law gives no resistance.

    Examples
    --------
    >>> round(resistance_at_20c(1.1965, 0.00393, 70.0), 6)
    1.0
    """
    return resistance_ohm / _warming(alpha_20c_per_k, temperature_c)


def loop_resistance_ohm(
    one_way_length_m: Floats,
    temperature_c: Floats,
    out_20c_ohm_per_m: Floats,
    out_alpha_20c_per_k: Floats,
    return_20c_ohm_per_m: Floats,
    return_alpha_20c_per_k: Floats,
    parallel: Floats = 1.0,
) -> Floats:
    """
    Resistance of both legs of a run, whose conductors may differ in size and metal.

    Parameters
    ----------
    one_way_length_m : float or array
        Along the cable, start to end; the way back is added here. [m]
    temperature_c : float or array
        Of both conductors. [°C]
    out_20c_ohm_per_m, return_20c_ohm_per_m : float or array
        Of a single conductor of each leg at 20 °C. [Ω/m]
    out_alpha_20c_per_k, return_alpha_20c_per_k : float or array
        Temperature coefficient of each leg at 20 °C. [1/K]
    parallel : float or array
        Number of equal conductors side by side, in each leg.

    Returns
    -------
    float or array
        Broadcast shape of the inputs; terminations are not included. [Ω]

    Raises
    ------
    InvalidQuantity
        As ``conductor_resistance_ohm``.

    Examples
    --------
    60 m of 10 mm² copper at 50 °C, out and back:

    >>> round(loop_resistance_ohm(60, 50, 1.83e-3, 0.00393, 1.83e-3, 0.00393), 4)
    0.2455
    """
    out = conductor_resistance_ohm(one_way_length_m, out_20c_ohm_per_m, out_alpha_20c_per_k, temperature_c, parallel)
    back = conductor_resistance_ohm(
        one_way_length_m, return_20c_ohm_per_m, return_alpha_20c_per_k, temperature_c, parallel
    )
    return out + back


def termination_ohm(area_mm2: Floats, median_ohm: Floats, gsd: Floats) -> tuple[Floats, Floats]:
    r"""
    Mean and variance of one healthy termination, which is log-normal.

    Parameters
    ----------
    area_mm2 : float or array
        Of one conductor; parallel cores do not change it. [mm²]
    median_ohm : float or array
        Median for a conductor of 10 mm². [Ω]
    gsd : float or array
        Geometric standard deviation, 1 or more.

    Returns
    -------
    mean : float or array
        [Ω]
    variance : float or array
        [Ω²]

    Raises
    ------
    InvalidQuantity
        If an area or a median is not above zero, or ``gsd`` below 1.

    Notes
    -----
    With :math:`m = m_{10} \sqrt{10\,\mathrm{mm^2} / S}` and :math:`s = \ln \mathrm{gsd}` the mean is
    :math:`m\,e^{s^2/2}` (1.27 m for a gsd of 2) and the variance :math:`\mathrm{mean}^2 (e^{s^2} - 1)`. The
    dependence on area is this project's own; it has no published source.

    Examples
    --------
    >>> mean, variance = termination_ohm(10.0, 0.15e-3, 2.0)
    >>> f"{mean * 1e3:.4f} mΩ, standard deviation {variance**0.5 * 1e3:.4f} mΩ"
    '0.1907 mΩ, standard deviation 0.1498 mΩ'
    """
    require(area_mm2, np.greater(area_mm2, 0), "an area must be above 0", "mm²")
    require(median_ohm, np.greater(median_ohm, 0), "a resistance must be above 0", "Ω")
    require(gsd, np.greater_equal(gsd, 1), "a geometric standard deviation must be 1 or more", "")
    log_variance = np.log(gsd) ** 2
    mean = median_ohm * np.sqrt(REFERENCE_AREA_MM2 / area_mm2) * np.exp(log_variance / 2)
    return mean, mean**2 * np.expm1(log_variance)


def percent_iacs(resistance_ohm_per_m: Floats, area_mm2: Floats) -> Floats:
    """
    Conductivity that a measured resistance and an area say, in percent of standard annealed copper.

    Parameters
    ----------
    resistance_ohm_per_m : float or array
        Of one conductor, referred to 20 °C. [Ω/m]
    area_mm2 : float or array
        Of its metal. [mm²]

    Returns
    -------
    float or array
        About 100 for copper, 61 for aluminium, 62 for copper-clad aluminium. [% IACS]

    Raises
    ------
    InvalidQuantity
        If a resistance or an area is not above zero.

    References
    ----------
    100 % is 58 m/(Ω mm²): IEC 60028:1925.

    Examples
    --------
    >>> round(percent_iacs(0.028264 / 2.5, 2.5), 1)
    61.0
    """
    require(resistance_ohm_per_m, np.greater(resistance_ohm_per_m, 0), "a resistance must be above 0", "Ω/m")
    require(area_mm2, np.greater(area_mm2, 0), "an area must be above 0", "mm²")
    return 100 * resistivity_20c("copper") * 1e6 / (resistance_ohm_per_m * area_mm2)


def _warming(alpha_20c_per_k: Floats, temperature_c: Floats) -> Floats:
    """Resistance at a temperature over that at 20 °C."""
    warming = 1 + alpha_20c_per_k * (temperature_c - 20)
    require(temperature_c, np.greater(warming, 0), "a temperature must leave the metal a resistance", "°C")
    return warming
