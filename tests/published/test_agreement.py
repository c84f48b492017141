"""E_n ratios against the normal distribution of SciPy and the law of propagation of independent doubts."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import norm
from uncertainties import ufloat

from rules.calc.agreement import en_ratio, probability_apart
from rules.errors import InvalidQuantity

values = st.floats(-1e3, 1e3)
doubts = st.floats(1e-6, 1e2)


@given(values, doubts, values, doubts)
def test_it_is_the_distance_over_twice_its_doubt(a: float, a_u: float, b: float, b_u: float) -> None:
    """ISO 13528, 9.7 (from memory) with U = 2 u: the doubt of the distance by the package ``uncertainties``."""
    apart = ufloat(a, a_u) - ufloat(b, b_u)
    assert en_ratio(a, a_u, b, b_u) == pytest.approx(abs(apart.nominal_value) / (2 * apart.std_dev), rel=1e-9)


def test_meters_within_their_doubts_disagree_in_five_of_a_hundred_pairs() -> None:
    """What a Gaussian leaves outside twice its standard deviation: 4.55 %, ``scipy.stats.norm``."""
    chance = np.random.default_rng(5)
    first, second = chance.normal(24.0, 0.07, 20_000), chance.normal(24.0, 0.03, 20_000)
    share = np.mean([en_ratio(a, 0.07, b, 0.03) > 1 for a, b in zip(first.tolist(), second.tolist(), strict=True)])
    assert share == pytest.approx(2 * norm.sf(2), abs=4 * (0.0455 * 0.9545 / 20_000) ** 0.5)


@given(st.floats(-8, 8), st.floats(0.01, 10))
def test_how_sure_a_difference_is_is_the_middle_of_a_gaussian(times: float, u: float) -> None:
    assert probability_apart(times * u, u) == pytest.approx(1 - 2 * norm.sf(abs(times)), abs=1e-12)


def test_a_doubt_below_zero_is_refused() -> None:
    with pytest.raises(InvalidQuantity, match="not below 0"):
        en_ratio(1.0, -0.1, 1.0, 0.1)
    with pytest.raises(InvalidQuantity, match="not below 0"):
        probability_apart(1.0, float("inf"))
