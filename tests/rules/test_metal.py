"""Recognising a metal by a resistance per metre."""

from __future__ import annotations

import itertools

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rules.calc.conductor import at_temperature
from rules.calc.metal import BELOW_MAXIMUM, recognise
from rules.errors import InvalidQuantity, UnknownSize
from rules.record import METALS, STRANDINGS
from rules.tables.conductors import alpha_20c, resistance_20c_ohm_per_m

PERCENT = {"copper": 100.0, "tinned copper": 98.5, "aluminium": 61.0, "copper-clad aluminium": 62.0}


def typical(size: str, metal: str, stranding: str) -> float:
    r20 = resistance_20c_ohm_per_m(size, metal, stranding)
    return r20 * (1 - BELOW_MAXIMUM / 2) if size.endswith("mm2") else r20


@pytest.mark.parametrize(
    ("metal", "stranding", "size"), itertools.product(METALS, STRANDINGS, ["12 AWG", "250 kcmil", "2.5 mm2", "50 mm2"])
)
def test_a_typical_conductor_is_recognised_at_any_temperature(metal: str, stranding: str, size: str) -> None:
    """50 mm² has 12 % less metal than its name says: taken over nominal area copper would pass for 89 % IACS."""
    for temperature_c in (-10.0, 20.0, 65.0):
        ohm = float(at_temperature(typical(size, metal, stranding), alpha_20c(metal), temperature_c))
        best = recognise(ohm, size, stranding, 0.002 * ohm, temperature_c=temperature_c)[0]
        assert best.material == metal
        assert best.fit == pytest.approx(1.0, abs=1e-9)
        assert best.percent_iacs == pytest.approx(PERCENT[metal], rel=0.025)
        assert best.expected_ohm_per_m == pytest.approx(typical(size, metal, stranding))


def test_copper_and_aluminium_are_told_apart_and_their_neighbours_are_not() -> None:
    """2 % of doubt: aluminium is 64 % off copper and fits not at all; tinned copper is 2.9 % off and stays possible."""
    r20 = typical("12 AWG", "copper", "solid")
    fits = {c.material: c.fit for c in recognise(r20, "12 AWG", "solid", 0.02 * r20)}
    assert fits["copper"] == pytest.approx(1.0)
    assert 0.1 < fits["tinned copper"] < 0.6
    assert fits["aluminium"] < 1e-9
    assert fits["copper-clad aluminium"] < 1e-9
    ohm = typical("12 AWG", "aluminium", "solid")
    assert [c.material for c in recognise(ohm, "12 AWG", "solid", 0.02 * ohm)[:2]] == [
        "aluminium",
        "copper-clad aluminium",
    ]
    assert recognise(ohm, "12 AWG", "solid", 0.02 * ohm)[1].fit > 0.5


def test_deviation_and_fit_by_hand() -> None:
    """
    12 AWG solid copper, 5.2108 mΩ/m nominal with 2 % of its own; read 5.4192 mΩ/m (4 % more) with 3 %: 0.20843 over
    hypot(0.16258, 0.10422) = 0.19312 is 1.0793 standard uncertainties, exceeded either way in 28.05 % of cases.
    """
    found = {c.material: c for c in recognise(5.41923e-3, "12 AWG", "solid", 0.162577e-3)}["copper"]
    assert found.deviation == pytest.approx(1.0793, abs=2e-4)
    assert found.fit == pytest.approx(0.2805, abs=2e-4)
    assert found.percent_iacs == pytest.approx(100 / 1.04, rel=1e-4)


@given(st.floats(0.5e-3, 50e-3), st.floats(0.001, 0.2))
def test_the_best_comes_first_and_more_doubt_never_fits_less(ohm: float, share: float) -> None:
    sharp, blunt = (recognise(ohm, "4 mm2", "stranded", u * ohm) for u in (share, 2 * share))
    assert [c.fit for c in sharp] == sorted((c.fit for c in sharp), reverse=True)
    fits = {c.material: c.fit for c in blunt}
    assert all(c.fit <= fits[c.material] <= 1 for c in sharp)
    assert {c.material for c in sharp} == set(METALS)


@pytest.mark.parametrize(
    ("given_", "error", "said"),
    [
        ((0.0, "4 mm2", "solid", 1e-4), InvalidQuantity, "a resistance must be above 0, got 0 Ω/m"),
        ((1e-3, "4 mm2", "solid", -1e-4), InvalidQuantity, "a standard uncertainty must not be negative"),
        ((1e-3, "3 mm2", "solid", 1e-4), UnknownSize, "next to it are 2.5 mm2 and 4 mm2"),
        ((1e-3, "4 mm2", "braided", 1e-4), UnknownSize, "accepted are solid, stranded, flexible"),
    ],
)
def test_what_cannot_be_is_refused(given_: tuple[float, str, str, float], error: type[Exception], said: str) -> None:
    with pytest.raises(error, match=said):
        recognise(*given_)
