"""Temperature of a conductor in service."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from rules.calc.service_temperature import service_temperature_c
from rules.errors import InvalidQuantity

amperes = st.floats(0.1, 1000)
ambients = st.floats(-40, 60)


@given(ambients, amperes, st.sampled_from([60.0, 70.0, 75.0, 90.0]))
def test_at_rest_it_is_the_ambient_and_at_capacity_the_limit(
    ambient_c: float, ampacity_a: float, limit_c: float
) -> None:
    assert service_temperature_c(ambient_c, 0.0, ampacity_a, limit_c) == ambient_c
    assert service_temperature_c(30.0, ampacity_a, ampacity_a, limit_c) == pytest.approx(limit_c)


@given(ambients, amperes, amperes)
def test_the_rise_grows_with_the_square_of_the_current(ambient_c: float, current_a: float, ampacity_a: float) -> None:
    rise = service_temperature_c(0.0, current_a, ampacity_a, 70.0)
    assert service_temperature_c(0.0, 2 * current_a, ampacity_a, 70.0) == pytest.approx(4 * rise)
    assert service_temperature_c(0.0, -current_a, ampacity_a, 70.0) == rise
    assert service_temperature_c(ambient_c, current_a, ampacity_a, 70.0) == pytest.approx(ambient_c + rise)


@given(st.lists(st.tuples(ambients, amperes, amperes), min_size=1, max_size=10))
def test_arrays_equal_the_loop(rows: list[tuple[float, float, float]]) -> None:
    ambient, current, ampacity = (np.array(column) for column in zip(*rows, strict=True))
    together = np.asarray(service_temperature_c(ambient, current, ampacity, 70.0))
    assert_allclose(together, np.array([service_temperature_c(*row, 70.0) for row in rows]), rtol=1e-14)


@pytest.mark.parametrize(("limit_c", "most_k"), [(70.0, 1.4), (90.0, 3.1)])
def test_leaving_out_the_growth_of_resistance_errs_high_and_little(limit_c: float, most_k: float) -> None:
    """Against the balance of heat with resistance at its own temperature: rise = (I/Iz)² (limit - 30) r(T) / r(limit)."""
    excess = []
    for share in np.linspace(0, 1, 51):
        plain = float(service_temperature_c(30.0, float(share), 1.0, limit_c))
        hot = 30.0
        for _ in range(100):
            hot = 30 + share**2 * (limit_c - 30) * (1 + 0.00393 * (hot - 20)) / (1 + 0.00393 * (limit_c - 20))
        excess.append(plain - hot)
    assert min(excess) >= -1e-9
    assert max(excess) == pytest.approx(most_k, abs=0.05)


@pytest.mark.parametrize(
    ("given_", "said"),
    [
        ((25.0, 1.0, 0.0, 70.0), "a capacity must be above 0, got 0 A"),
        ((25.0, 1.0, math.nan, 70.0), "a capacity must be above 0, got nan A"),
        ((25.0, 1.0, 10.0, 30.0), "a limit must be above the reference ambient, got 30 °C"),
    ],
)
def test_what_cannot_be_is_refused(given_: tuple[float, float, float, float], said: str) -> None:
    with pytest.raises(InvalidQuantity) as error:
        service_temperature_c(*given_)
    assert str(error.value) == said
