"""Resistance of conductors and terminations."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from rules.calc.conductor import (
    at_temperature,
    conductor_resistance_ohm,
    loop_resistance_ohm,
    percent_iacs,
    resistance_at_20c,
    termination_ohm,
)
from rules.errors import InvalidQuantity
from rules.record import METALS
from rules.tables.conductors import area_mm2, resistance_20c_ohm_per_m, resistivity_20c

lengths = st.floats(0, 1e4)
resistances = st.floats(1e-5, 1.0)
temperatures = st.floats(-60, 200)
COPPER = 0.00393


@pytest.mark.parametrize(
    ("length_m", "current_a", "temperature_c", "ohm_per_km", "drop_v"),
    [
        (30.0, 2.0, 20.0, 12.1, 1.452),
        (30.0, 2.0, 70.0, 12.1, 1.73732),
        (45.0, 8.0, 40.0, 8.21, 6.37582),
        (60.0, 25.0, 50.0, 1.83, 6.13727),
        (30.48, 5.0, 20.0, 8.2841, 2.52499),
    ],
)
def test_drops_worked_by_hand(
    length_m: float, current_a: float, temperature_c: float, ohm_per_km: float, drop_v: float
) -> None:
    """2 × L × r20 × [1 + 0.00393 (T - 20)] × I, worked outside the project."""
    loop = loop_resistance_ohm(length_m, temperature_c, ohm_per_km / 1000, COPPER, ohm_per_km / 1000, COPPER)
    assert current_a * loop == pytest.approx(drop_v, abs=1e-5)


def test_both_legs_may_differ() -> None:
    """80 m of 16 mm² copper out, aluminium back, at 60 °C: 80 (1.15e-3 × 1.1572 + 1.91e-3 × 1.1612) = 0.283894 Ω."""
    loop = loop_resistance_ohm(80.0, 60.0, 1.15e-3, COPPER, 1.91e-3, 0.00403)
    assert loop == pytest.approx(0.283894, abs=5e-7)


@given(lengths, resistances, temperatures, st.integers(1, 12))
def test_parallel_conductors_share(length_m: float, r20: float, temperature_c: float, parallel: int) -> None:
    one = conductor_resistance_ohm(length_m, r20, COPPER, temperature_c)
    shared = conductor_resistance_ohm(length_m, r20, COPPER, temperature_c, parallel)
    assert shared * parallel == pytest.approx(one, rel=1e-12)


@given(st.lists(st.tuples(lengths, resistances, temperatures), min_size=1, max_size=20))
def test_arrays_equal_the_loop(rows: list[tuple[float, float, float]]) -> None:
    length, r20, temperature = (np.array(column) for column in zip(*rows, strict=True))
    together = np.asarray(conductor_resistance_ohm(length, r20, COPPER, temperature))
    one_by_one = np.array([conductor_resistance_ohm(a, b, COPPER, t) for a, b, t in rows])
    assert_allclose(together, one_by_one, rtol=1e-14)


@given(resistances, st.floats(0.001, 0.005), st.floats(-100, 200))
def test_to_a_temperature_and_back(ohm: float, alpha: float, temperature_c: float) -> None:
    hot = at_temperature(ohm, alpha, temperature_c)
    assert resistance_at_20c(hot, alpha, temperature_c) == pytest.approx(ohm, rel=1e-12)


@pytest.mark.parametrize(
    ("given_", "said"),
    [
        ((-1.0, 1e-3, COPPER, 20.0), "a length must not be negative, got -1 m"),
        ((math.nan, 1e-3, COPPER, 20.0), "a length must not be negative, got nan m"),
        ((1.0, 0.0, COPPER, 20.0), "a resistance must be above 0, got 0 Ω/m"),
        ((1.0, 1e-3, COPPER, 20.0, 0), "the number of parallel conductors must be 1 or more, got 0"),
        ((1.0, 1e-3, COPPER, -240.0), "a temperature must leave the metal a resistance, got -240 °C"),
        ((np.array([1.0, -2.0]), 1e-3, COPPER, 20.0), "a length must not be negative, got -2 m"),
    ],
)
def test_what_cannot_be_is_refused(given_: tuple[float, ...], said: str) -> None:
    with pytest.raises(InvalidQuantity) as error:
        conductor_resistance_ohm(*given_)
    assert str(error.value) == said


def test_a_termination_has_the_moments_of_its_log_normal() -> None:
    """Against draws: 0.15 mΩ at 10 mm², geometric standard deviation 2, here for 2.5 mm² (median 0.30 mΩ)."""
    mean, variance = termination_ohm(2.5, 0.15e-3, 2.0)
    draws = np.random.default_rng(1).lognormal(math.log(0.30e-3), math.log(2.0), 400_000)
    assert mean == pytest.approx(draws.mean(), rel=0.01)
    assert math.sqrt(variance) == pytest.approx(draws.std(), rel=0.03)
    assert mean == pytest.approx(1.2715 * 0.30e-3, rel=1e-4)


@pytest.mark.parametrize("wrong", [(0.0, 1e-4, 2.0), (10.0, 0.0, 2.0), (10.0, 1e-4, 0.9), (10.0, 1e-4, math.nan)])
def test_a_termination_that_cannot_be_is_refused(wrong: tuple[float, float, float]) -> None:
    with pytest.raises(InvalidQuantity, match="must be"):
        termination_ohm(*wrong)


@pytest.mark.parametrize(
    ("metal", "percent"),
    [("copper", 100.0), ("tinned copper", 97.16), ("aluminium", 61.0), ("copper-clad aluminium", 62.0)],
)
def test_a_solid_gauge_tells_its_metal(metal: str, percent: float) -> None:
    ohm = resistance_20c_ohm_per_m("12 AWG", metal, "solid")
    assert percent_iacs(ohm, area_mm2("12 AWG")) == pytest.approx(percent, rel=1e-4)


def test_metals_are_all_covered() -> None:
    assert all(resistivity_20c(metal) >= resistivity_20c("copper") for metal in METALS)


@pytest.mark.parametrize("wrong", [(0.0, 2.5), (1e-3, 0.0), (math.nan, 2.5)])
def test_conductivity_needs_a_resistance_and_an_area(wrong: tuple[float, float]) -> None:
    with pytest.raises(InvalidQuantity, match="must be above 0"):
        percent_iacs(*wrong)
