"""Resistances of many runs at once: one leg in columns, healthy terminations included."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from rules.calc.conductor import conductor_resistance_ohm, termination_ohm

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Leg:
    """One leg of each of n runs; arrays (n,)."""

    conductor_ohm: Floats
    """At its temperature."""
    hot_ohm: Floats
    """The same conductor at the hot temperature."""
    cold_ohm: Floats
    """The same conductor at the cold temperature."""
    slope_ohm_per_k: Floats
    """What the conductor gains with each kelvin."""
    joint_ohm: Floats
    """Mean of each of its terminations."""
    joint_variance: Floats
    """Of each. [ohm²]"""

    def spread(self, rows: Sequence[int], size: int) -> Leg:
        """The same legs at their rows among more, 0 elsewhere."""
        if len(rows) == size:
            return self
        columns = []
        parts = (self.conductor_ohm, self.hot_ohm, self.cold_ohm, self.slope_ohm_per_k)
        for column in (*parts, self.joint_ohm, self.joint_variance):
            whole = np.zeros(size)
            whole[list(rows)] = column
            columns.append(whole)
        return Leg(*columns)


def leg_of(
    one_way_length_m: Floats,
    parallel: Floats,
    temperature_c: Floats,
    hot_c: float,
    cold_c: float,
    resistance_20c_ohm_per_m: Floats,
    alpha_20c_per_k: Floats,
    area_mm2: Floats,
    median_ohm: float,
    gsd: float,
) -> Leg:
    """
    One leg of many runs.

    Parameters
    ----------
    one_way_length_m : array (n,)
        [m]
    parallel : array (n,)
        Conductors side by side.
    temperature_c : array (n,)
        Of the metal. [°C]
    hot_c : float
        The hot temperature; a run that is hotter keeps its own. [°C]
    cold_c : float
        The cold temperature; a run that is colder keeps its own. [°C]
    resistance_20c_ohm_per_m, alpha_20c_per_k, area_mm2 : array (n,)
        Of a single conductor. [Ω/m], [1/K], [mm²]
    median_ohm, gsd : float
        Of a healthy termination, as ``rules.calc.conductor.termination_ohm``. [Ω]

    Returns
    -------
    Leg

    Raises
    ------
    InvalidQuantity
        As ``conductor_resistance_ohm`` and ``termination_ohm``.

    Examples
    --------
    29 m of 4 mm² copper at 20 °C and at 70 °C:

    >>> one = np.ones(1)
    >>> leg = leg_of(29 * one, one, 20 * one, 70.0, 20.0, 4.61e-3 * one, 0.00393 * one, 4 * one, 0.15e-3, 2.0)
    >>> round(float(leg.conductor_ohm[0]), 4), round(float(leg.hot_ohm[0]), 4), round(1e3 * float(leg.joint_ohm[0]), 3)
    (0.1337, 0.16, 0.302)
    """
    conductor = np.asarray(
        conductor_resistance_ohm(one_way_length_m, resistance_20c_ohm_per_m, alpha_20c_per_k, temperature_c, parallel)
    )
    slope = one_way_length_m * resistance_20c_ohm_per_m * alpha_20c_per_k / parallel
    mean, variance = termination_ohm(area_mm2, median_ohm, gsd)
    hot = conductor + slope * np.maximum(hot_c - temperature_c, 0.0)
    cold = conductor - slope * np.maximum(temperature_c - cold_c, 0.0)
    return Leg(conductor, hot, cold, slope, np.asarray(mean), np.asarray(variance))
