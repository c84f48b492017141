"""
Decisions with doubt against ILAC-G8:09/2019 and JCGM 106:2012: what share of what is accepted does not conform.

The guard band w is measured in expanded uncertainties U = 2 u. Rows whose status is ``from-memory`` are compared within
what their few digits say; those computed follow from the Gaussian, by ``scipy.stats``.
"""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest
import scipy.stats
from hypothesis import given
from hypothesis import strategies as st

from rules import limits
from rules.calc.doubt import probability_above
from rules.record import Site

DATA = tomllib.loads((Path(__file__).parent / "data" / "decision_rules.toml").read_text(encoding="utf-8"))
LIMIT, U = 5.0, 0.2


def false_acceptance_percent(w_over_u: float) -> float:
    """Of a value that lies exactly at the acceptance limit, in percent."""
    return 100 * probability_above(LIMIT - w_over_u * U, LIMIT, U / 2)


@pytest.mark.parametrize(("rule", "w_over_u", "most"), DATA["decision_rules"]["rows"])
def test_no_more_is_falsely_accepted_than_the_rule_says(rule: str, w_over_u: float, most: float) -> None:
    assert false_acceptance_percent(w_over_u) <= most, rule
    assert false_acceptance_percent(w_over_u) > 0.9 * most, rule


@pytest.mark.parametrize(("rule", "w_over_u", "percent"), DATA["decision_rules_more"]["rows"])
def test_the_further_rules_as_remembered(rule: str, w_over_u: float, percent: float) -> None:
    within = 0.0001 if percent < 0.01 else 0.3
    assert false_acceptance_percent(w_over_u) == pytest.approx(percent, abs=within), rule


@pytest.mark.parametrize(("w_over_u", "percent"), DATA["false_accept_normal"]["rows"])
def test_the_risk_along_the_guard_band(w_over_u: float, percent: float) -> None:
    assert false_acceptance_percent(w_over_u) == pytest.approx(percent, rel=1e-3)


@given(value=st.floats(-10, 10), limit=st.floats(-10, 10), u=st.floats(1e-3, 5))
def test_it_is_scipys_normal_distribution(value: float, limit: float, u: float) -> None:
    expected = float(scipy.stats.norm.sf(limit, loc=value, scale=u))
    assert probability_above(value, limit, u) == pytest.approx(expected, rel=1e-9, abs=1e-15)


def test_the_profiles_thresholds_as_guard_bands() -> None:
    """What the general profile asks for, told as w/U: 0.82 to conform or not, 1.16 to count as real."""
    in_force = limits.of(Site(name="x"))
    for key, band in (("fails_at", 0.822), ("beyond_doubt", 1.163)):
        assert 100 - false_acceptance_percent(band) == pytest.approx(100 * in_force[f"decision.{key}"], abs=0.01)
    assert false_acceptance_percent(0.822) == pytest.approx(100 * in_force["decision.passes_at"], abs=0.01)
