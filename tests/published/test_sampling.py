"""The bound on bad ones among those not read, against SciPy's distributions and the published rule of three."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import beta, hypergeom

from rules.calc.sampling import at_most, most_bad


@st.composite
def samples(draw: st.DrawFn) -> tuple[int, int, int]:
    """All, read, and bad among the read."""
    total = draw(st.integers(1, 400))
    read = draw(st.integers(1, total))
    return total, read, draw(st.integers(0, min(read, 12)))


@given(samples(), st.sampled_from([0.8, 0.9, 0.95, 0.99]))
def test_the_bound_is_the_largest_number_that_the_hypergeometric_distribution_does_not_rule_out(
    sample: tuple[int, int, int], confidence: float
) -> None:
    """Against ``scipy.stats.hypergeom``, every number in all tried."""
    total, read, bad = sample
    found = {k: hypergeom.cdf(bad, total, k, read) for k in range(bad, total - (read - bad) + 1)}
    possible = [k for k, probability in found.items() if probability > (1 - confidence) * (1 + 1e-9)]
    assert most_bad(total, read, bad, confidence) == max(possible, default=bad)


@given(samples(), st.integers(0, 400))
def test_the_distribution_is_that_of_scipy(sample: tuple[int, int, int], bad: int) -> None:
    total, read, found = sample
    bad = min(bad, total)
    assert at_most(found, total, bad, read) == pytest.approx(hypergeom.cdf(found, total, bad, read), abs=1e-9)


@pytest.mark.parametrize(("read", "bad"), [(30, 0), (30, 2), (59, 0), (100, 5)])
def test_without_end_it_is_the_bound_of_clopper_and_pearson(read: int, bad: int) -> None:
    """Clopper and Pearson (1934): the upper bound is a quantile of a beta distribution, here from SciPy."""
    total = 1_000_000
    share = most_bad(total, read, bad, 0.95) / total
    assert share == pytest.approx(beta.ppf(0.95, bad + 1, read - bad), rel=2e-4)


@pytest.mark.parametrize("read", [30, 100, 300, 1000])
def test_without_a_bad_one_it_is_near_three_over_those_read(read: int) -> None:
    """Hanley and Lippman-Hand (1983), from memory: 3/n for n above 30; ln 20 = 2.996 is the limit of the exact one."""
    share = most_bad(10_000_000, read, 0, 0.95) / 10_000_000
    assert share == pytest.approx(3 / read, rel=0.06)
    assert share < 3 / read


def test_a_number_found_with_exactly_the_rest_of_the_confidence_is_ruled_out() -> None:
    """One of five read and not bad: with four bad in all that has the probability 1/5, which is not above 1 − 0.8."""
    assert most_bad(5, 1, 0, 0.8) == 3
    assert most_bad(5, 1, 0, 0.81) == 4
