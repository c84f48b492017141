"""
JCGM 100:2008 Annex H.2: resistance and reactance from correlated readings of voltage, current and phase.

The law of propagation below is written out for the tests and compared with the published results and with
the package ``uncertainties``. Tolerance 0.001: u(X) is printed 0.295 where full precision gives 0.2956.
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Callable
from pathlib import Path
from typing import TypeAlias

import numpy as np
import numpy.typing as npt
import pytest
import uncertainties
from uncertainties import umath

Vector: TypeAlias = npt.NDArray[np.float64]

ANNEX = tomllib.loads((Path(__file__).parent / "data" / "jcgm100_h2.toml").read_text(encoding="utf-8"))
READINGS = np.array(ANNEX["data"]["rows"]) * (1.0, 1e-3, 1.0)  # V, A, rad
PUBLISHED = ANNEX["published"]
MEANS = READINGS.mean(axis=0)
COVARIANCE = np.cov(READINGS, rowvar=False) / len(READINGS)


def propagated(function: Callable[[Vector], Vector], x: Vector, covariance: Vector) -> tuple[Vector, Vector]:
    """JCGM 100 (13) for several results: values and their covariance, by central differences."""
    steps = 1e-6 * np.abs(x)
    columns = [(function(x + step) - function(x - step)) / (2 * step.sum()) for step in np.diag(steps)]
    sensitivity = np.stack(columns, axis=1)
    return function(x), np.asarray(sensitivity @ covariance @ sensitivity.T)


def impedance(x: Vector) -> Vector:
    """R, X and Z. [Ω]"""
    volts, amperes, phase = x
    return np.asarray(volts / amperes * np.array([math.cos(phase), math.sin(phase), 1.0]))


def test_correlations_of_the_readings() -> None:
    u = np.sqrt(np.diag(COVARIANCE))
    correlation = COVARIANCE / np.outer(u, u)
    assert correlation[0, 1] == pytest.approx(PUBLISHED["r_V_I"], abs=0.005)
    assert correlation[0, 2] == pytest.approx(PUBLISHED["r_V_phi"], abs=0.005)
    assert correlation[1, 2] == pytest.approx(PUBLISHED["r_I_phi"], abs=0.005)


def test_values_and_doubts_are_those_published() -> None:
    values, covariance = propagated(impedance, MEANS, COVARIANCE)
    u = np.sqrt(np.diag(covariance))
    for place, name in enumerate("RXZ"):
        assert values[place] == pytest.approx(PUBLISHED[f"{name}_ohm"], abs=0.001)
        assert u[place] == pytest.approx(PUBLISHED[f"u_{name}"], abs=0.001)


def test_leaving_the_correlations_out_gives_another_answer() -> None:
    """Why they are carried: without them u(R) comes out nearly three times too large."""
    _, alone = propagated(impedance, MEANS, np.diag(np.diag(COVARIANCE)))
    assert math.sqrt(alone[0, 0]) > 2 * PUBLISHED["u_R"]


def test_an_independent_package_agrees() -> None:
    values, covariance = propagated(impedance, MEANS, COVARIANCE)
    volts, amperes, phase = uncertainties.correlated_values(MEANS, COVARIANCE)
    theirs = [volts * umath.cos(phase) / amperes, volts * umath.sin(phase) / amperes, volts / amperes]
    np.testing.assert_allclose(values, [each.nominal_value for each in theirs], rtol=1e-12)
    np.testing.assert_allclose(covariance, uncertainties.covariance_matrix(theirs), rtol=1e-6)
