"""
The doubt of a difference of two readings, worked by hand and against JCGM 100.

Sources: JCGM 100:2008, 4.3.7 (rectangular), 5.2.2 (correlated inputs); accuracy form of a digital multimeter, "percent of
reading + counts", read in a secondary text: 5 V range, 0.08 % + 2 counts at 2.000 V gives 1.9964 to 2.0036 V.
"""

from __future__ import annotations

import math

import pytest
import uncertainties
from hypothesis import given
from hypothesis import strategies as st

from rules.calc.doubt import Shown, Weighted, each_u, gain_u, probability_above, total
from rules.errors import InvalidQuantity


def volts(value: float, meter: str, percent: float = 0.5, counts: float = 2, resolution: float = 0.01) -> Shown:
    return Shown(value, meter, gain_u(percent), each_u(counts, resolution))


def difference(a: Shown, b: Shown) -> tuple[float, float]:
    return total([Weighted(1, a), Weighted(-1, b)])


def test_one_meter_by_hand() -> None:
    """24.12 V less 23.41 V, 0.5 % + 2 counts of 0.01 V, by one meter."""
    # gain: 0.5 % of 0.71 V / √3 = 0.002050 V
    # counts: 0.02 V / √3 = 0.011547 V; display: 0.01 V / √12 = 0.002887 V; each of two readings: 0.011902 V
    # together: √(0.002050² + 2 × 0.011902²) = 0.016957 V
    value, u = difference(volts(24.12, "a"), volts(23.41, "a"))
    assert value == pytest.approx(0.71)
    assert u == pytest.approx(0.016957, abs=1e-6)


def test_two_meters_by_hand() -> None:
    """The same by two meters: their gains do not cancel, and the doubt is six times as large."""
    # gains: 0.5 % / √3 of 24.12 V and 23.41 V = 0.069628 V and 0.067579 V
    # together: √(0.069628² + 0.067579² + 2 × 0.011902²) = 0.098480 V
    _, u = difference(volts(24.12, "a"), volts(23.41, "b"))
    assert u == pytest.approx(0.098480, abs=1e-6)


def test_a_direct_reading_by_hand() -> None:
    """0.71 V across the leg itself, 0.5 % + 2 counts of 0.001 V."""
    # gain 0.71 × 0.5 % / √3 = 0.002050; counts and display 0.001190; together 0.002370 V
    _, u = total([Weighted(1, volts(0.71, "a", resolution=0.001))])
    assert u == pytest.approx(0.002370, abs=1e-6)


def test_the_printed_accuracy_of_a_multimeter() -> None:
    """0.0036 V half width, rectangular: 0.002078 V without the display's own half digit."""
    gain = gain_u(0.08) * 2.0
    counts = each_u(2, 0.001)
    display = 0.001 / math.sqrt(12)
    # the print adds both parts linearly; as independent rectangular parts they stay within it
    assert gain * math.sqrt(3) + math.sqrt(counts**2 - display**2) * math.sqrt(3) == pytest.approx(0.0036)


@given(
    values=st.lists(st.floats(0.1, 300), min_size=1, max_size=5),
    weights=st.lists(st.floats(-3, 3), min_size=5, max_size=5),
    meters=st.lists(st.sampled_from("ab"), min_size=5, max_size=5),
)
def test_sums_agree_with_a_general_library(values: list[float], weights: list[float], meters: list[str]) -> None:
    """``uncertainties`` propagates the same inputs by automatic derivatives."""
    gains = {meter: uncertainties.ufloat(1.0, gain_u(0.5)) for meter in "ab"}
    whole = sum(
        weight * (value * gains[meter] + uncertainties.ufloat(0.0, each_u(2, 0.01)))
        for value, weight, meter in zip(values, weights, meters, strict=False)
    )
    terms = [
        Weighted(weight, volts(value, meter)) for value, weight, meter in zip(values, weights, meters, strict=False)
    ]
    value, u = total(terms)
    assert value == pytest.approx(whole.nominal_value, abs=1e-9)
    assert u == pytest.approx(whole.std_dev, rel=1e-6, abs=1e-12)


def test_a_reading_that_occurs_twice_is_one_reading() -> None:
    reading = volts(24.0, "a")
    assert total([Weighted(1, reading), Weighted(-1, reading)]) == (0.0, 0.0)


@pytest.mark.parametrize(
    ("w_over_u", "percent"), [(0.0, 50.0), (0.5, 15.87), (0.83, 4.846), (1.0, 2.275), (1.5, 0.135)]
)
def test_risk_of_false_acceptance(w_over_u: float, percent: float) -> None:
    """One-sided specific risk with a guard band w of U = 2u: ILAC-G8:09/2019 table, computed as 1 − Φ(2 w/U)."""
    u = 0.1
    risk = probability_above(5.0 - w_over_u * 2 * u, 5.0, u)
    assert 100 * risk == pytest.approx(percent, abs=0.006)


@pytest.mark.parametrize("u", [-1.0, math.nan, math.inf])
def test_a_doubt_that_cannot_be_is_refused(u: float) -> None:
    with pytest.raises(InvalidQuantity):
        probability_above(1.0, 2.0, u)


def test_without_doubt_a_limit_is_exact() -> None:
    assert probability_above(5.01, 5.0, 0.0) == 1.0
    assert probability_above(5.0, 5.0, 0.0) == 0.0
