"""Integrals over the size of a cause against scipy.integrate and scipy.stats."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
import scipy.integrate
import scipy.stats
from hypothesis import given
from hypothesis import strategies as st

from rules.diagnosis.quadrature import Density, integrated
from rules.diagnosis.shape import Floats, Integers

LOW, HIGH = math.log(3e-3), math.log(0.3)


def found(log_density: Callable[[Floats], Floats], low: float = LOW, high: float = HIGH) -> Density:
    return integrated(lambda u, _: log_density(u), np.array([low]), np.array([high]))


def by_scipy(log_density: Callable[[Floats], Floats], peak: float, low: float, high: float) -> float:
    """Log of the mean over the range, by adaptive quadrature told where the peak is."""
    best = float(log_density(np.array(peak)))
    total, _ = scipy.integrate.quad(
        lambda u: math.exp(float(log_density(np.array(u))) - best),
        low,
        high,
        points=[peak],
        limit=500,
        epsabs=0,
        epsrel=1e-10,
    )
    return best + math.log(total / (high - low))


@given(centre=st.floats(LOW - 0.5, HIGH + 0.5), log_sd=st.floats(math.log(3e-4), math.log(3.0)))
def test_a_peak_anywhere_also_past_the_edge(centre: float, log_sd: float) -> None:
    """Standard deviations of ln x from 0.0003 to wider than the range; maxima on the edge as well."""
    sd = math.exp(log_sd)

    def log_density(u: Floats) -> Floats:
        return -0.5 * ((u - centre) / sd) ** 2

    inside = scipy.stats.truncnorm((LOW - centre) / sd, (HIGH - centre) / sd, centre, sd)
    mass = scipy.stats.norm(centre, sd)
    outside = max(LOW - centre, centre - HIGH) / sd
    if outside > 6:  # all of it lies in the flank, which a sharper density than any meter's makes too steep to state
        return
    density = found(log_density)
    expected = math.log((mass.cdf(HIGH) - mass.cdf(LOW)) * sd * math.sqrt(2 * math.pi) / (HIGH - LOW))
    assert float(density.log_evidence[0]) == pytest.approx(expected, abs=1e-6)
    for share in (0.025, 0.5, 0.975):
        assert inside.cdf(float(density.cumulative().quantiles(share)[0][0])) == pytest.approx(share, abs=1e-4)
    assert float(density.moments(lambda u: u)[0][0]) == pytest.approx(float(inside.mean()), abs=1e-5)


@pytest.mark.parametrize(("excess", "u"), [(0.05, 0.01), (0.002, 0.01), (0.4, 0.02), (0.0, 0.05), (0.2, 0.0005)])
def test_an_extra_resistance_seen_through_a_gaussian(excess: float, u: float) -> None:
    """Log-uniform resistance at 8 A; the density in ln x is far from Gaussian where the reading is coarse."""

    def log_density(coordinate: Floats) -> Floats:
        return -0.5 * ((8 * np.exp(coordinate) - 8 * excess) / (8 * u)) ** 2

    peak = min(max(math.log(max(excess, 1e-9)), LOW), HIGH)
    assert float(found(log_density).log_evidence[0]) == pytest.approx(by_scipy(log_density, peak, LOW, HIGH), abs=1e-6)


def test_nothing_read_leaves_the_range_even() -> None:
    density = found(lambda u: np.zeros_like(u))
    assert float(density.log_evidence[0]) == pytest.approx(0.0, abs=1e-12)
    for share in (0.025, 0.3, 0.975):
        assert float(density.cumulative().quantiles(share)[0][0]) == pytest.approx(LOW + share * (HIGH - LOW), abs=1e-9)
    middle = np.array([(LOW + HIGH) / 2])
    assert float(density.cumulative().above(middle)[0]) == pytest.approx(0.5)
    assert float(density.cumulative().above(np.array([-np.inf]))[0]) == 1.0
    assert float(density.cumulative().above(np.array([np.inf]))[0]) == 0.0


@given(edge=st.floats(-4.0, 4.0))
def test_the_probability_above_an_edge(edge: float) -> None:
    density = found(lambda u: -0.5 * ((u + 3) / 0.02) ** 2)
    expected = float(scipy.stats.norm.sf(edge))
    assert float(density.cumulative().above(np.array([-3 + edge * 0.02]))[0]) == pytest.approx(expected, abs=2e-3)


def test_many_at_once_are_each_alone() -> None:
    """One density of a batch does not disturb another, however differently sharp they are."""
    centre, sd = np.array([-5.0, -2.0, -3.0]), np.array([1e-3, 2.0, 0.1])

    def log_density(u: Floats, which: Integers) -> Floats:
        found: Floats = -0.5 * ((u - centre[which, None]) / sd[which, None]) ** 2
        return found

    together = integrated(log_density, np.full(3, LOW), np.full(3, HIGH))
    for n in range(3):
        alone = found(_gaussian(float(centre[n]), float(sd[n])))
        assert float(alone.log_evidence[0]) == pytest.approx(float(together.log_evidence[n]), abs=1e-7)


def _gaussian(centre: float, sd: float) -> Callable[[Floats], Floats]:
    return lambda u: -0.5 * ((u - centre) / sd) ** 2
