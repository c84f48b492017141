"""
Sums of readings against the examples of JCGM 101:2008: what the law of propagation gives, and what it leaves out.

The program carries a sum's doubt as one standard uncertainty and takes it as Gaussian. Each example is drawn here a
million times as well, so that the published intervals are checked and the price of that is known.
"""

from __future__ import annotations

import tomllib
from pathlib import Path
from statistics import NormalDist

import numpy as np
import pytest

from rules.calc.doubt import Shown, Weighted, probability_above, total

DATA = tomllib.loads((Path(__file__).parent / "data" / "jcgm101.toml").read_text(encoding="utf-8"))
ADDITIVE = {row[0]: dict(zip(DATA["additive"]["columns"], row, strict=True)) for row in DATA["additive"]["rows"]}
DOMINANT = DATA["one_dominant"]
DRAWS = 1_000_000


def summed(*doubts: float) -> tuple[float, float]:
    """Value and standard uncertainty of a sum of readings of zero, each with a doubt of its own."""
    return total(Weighted(1.0, Shown(0.0, "a", 0.0, u)) for u in doubts)


def drawn(rectangular: bool, *doubts: float) -> tuple[float, float]:
    """The central 95 % of a sum of inputs of these standard deviations."""
    rng = np.random.default_rng(101)
    whole = np.zeros(DRAWS)
    for u in doubts:
        whole += rng.uniform(-u * 3**0.5, u * 3**0.5, DRAWS) if rectangular else rng.normal(0, u, DRAWS)
    low, high = np.quantile(whole, [0.025, 0.975])
    return float(low), float(high)


@pytest.mark.parametrize("name", ["four normal", "four rectangular"])
def test_four_inputs_of_unit_doubt_have_two(name: str) -> None:
    value, u = summed(1.0, 1.0, 1.0, 1.0)
    assert value == ADDITIVE[name]["estimate"]
    assert u == pytest.approx(ADDITIVE[name]["u"])
    interval = (ADDITIVE[name]["low95"], ADDITIVE[name]["high95"])
    assert drawn(name.endswith("rectangular"), 1.0, 1.0, 1.0, 1.0) == pytest.approx(interval, abs=0.01)


def test_of_normal_inputs_the_interval_is_the_published_one() -> None:
    _, u = summed(1.0, 1.0, 1.0, 1.0)
    assert NormalDist(0, u).inv_cdf(0.975) == pytest.approx(ADDITIVE["four normal"]["high95"], abs=0.005)
    assert probability_above(ADDITIVE["four normal"]["high95"], 0.0, u) == pytest.approx(0.975, abs=1e-4)


def test_of_rectangular_inputs_the_gaussian_interval_is_a_hundredth_too_wide() -> None:
    _, u = summed(1.0, 1.0, 1.0, 1.0)
    ours = NormalDist(0, u).inv_cdf(0.975)
    assert 1.0 < ours / ADDITIVE["four rectangular"]["high95"] < 1.015


def test_where_one_rectangular_doubt_is_nearly_all_the_gaussian_interval_is_a_sixth_too_wide() -> None:
    """Never too narrow: one meter's accuracy limits alone are judged with more doubt than they have."""
    _, u = summed(1.0, 1.0, 1.0, 10.0)
    assert u == pytest.approx(DOMINANT["u"], abs=0.06)
    low, high = drawn(True, 1.0, 1.0, 1.0, 10.0)
    assert (low, high) == pytest.approx((DOMINANT["low95"], DOMINANT["high95"]), abs=0.1)
    assert NormalDist(0, u).inv_cdf(0.975) / high == pytest.approx(1.165, abs=0.01)
