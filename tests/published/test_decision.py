"""
Conforms, does not conform, not settled: against the figures of ILAC-G8:09/2019 and JCGM 106:2012, ``data/decision.toml``.

The profile's 5 % and 95 % are the one-sided rule of ISO 14253-1 (k = 1.65, a guard band of 0.83 U), on both sides.
"""

from __future__ import annotations

import tomllib
from pathlib import Path
from statistics import NormalDist
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rules import limits
from rules.calc.doubt import probability_above
from rules.decision import Verdict, against_limit
from rules.limits import Limits
from rules.record import Site

PRINTED: dict[str, dict[str, Any]] = tomllib.loads(
    (Path(__file__).parent / "data" / "decision.toml").read_text(encoding="utf-8")
)
LIMIT, U_EXPANDED = 24.0, 0.2
GENERAL = limits.of(Site(name="x"))


def thresholds(passes_at: float, fails_at: float) -> Limits:
    own = f'[decision]\nsource = "this test"\npasses_at = {passes_at}\nfails_at = {fails_at}\n'
    return limits.of(Site(name="x", limits="ours.toml", own_limits=own))


def wrongly_accepted_percent(w_over_u: float) -> float:
    """Of a figure that lies at the end of acceptance, a guard band inside an upper limit."""
    return 100 * probability_above(LIMIT - w_over_u * U_EXPANDED, LIMIT, U_EXPANDED / 2)


@pytest.mark.parametrize(("w_over_u", "percent"), PRINTED["jcgm_106_normal"]["rows"])
def test_the_risk_of_a_guard_band(w_over_u: float, percent: float) -> None:
    assert wrongly_accepted_percent(w_over_u) == pytest.approx(percent, rel=5e-4)


@pytest.mark.parametrize(("_", "w_over_u", "most_percent"), PRINTED["ilac_g8"]["rows"])
def test_the_most_that_is_wrongly_accepted(_: str, w_over_u: float, most_percent: float) -> None:
    assert wrongly_accepted_percent(w_over_u) <= most_percent
    assert wrongly_accepted_percent(w_over_u - 0.1) > most_percent


@pytest.mark.parametrize(("_", "w_over_u", "percent"), PRINTED["ilac_g8_more"]["rows"])
def test_the_further_rules(_: str, w_over_u: float, percent: float) -> None:
    """Printed with two or three digits, and 0.135 % as 0.16 %: within 0.3 of a percent."""
    assert wrongly_accepted_percent(w_over_u) == pytest.approx(percent, abs=0.3)


@pytest.mark.parametrize("above_is_bad", [True, False])
@pytest.mark.parametrize(
    ("inside_in_u", "verdict"),
    [
        (1.65, Verdict.CONFORMS), (1.64, Verdict.OPEN), (0.0, Verdict.OPEN), (-1.64, Verdict.OPEN),
        (-1.65, Verdict.FAILS),
    ],
)  # fmt: skip
def test_the_profiles_thresholds_are_a_guard_band_on_both_sides(
    inside_in_u: float, verdict: Verdict, above_is_bad: bool
) -> None:
    """5 % one-sided: 1.645 standard uncertainties, which ISO 14253-1 rounds to 1.65."""
    u = 0.1
    value = LIMIT - inside_in_u * u if above_is_bad else LIMIT + inside_in_u * u
    assert against_limit(value, LIMIT, u, GENERAL, above_is_bad=above_is_bad) is verdict


def test_pass_fail_and_between_with_a_guard_band_of_the_expanded_uncertainty() -> None:
    """ILAC-G8, non-binary: pass below TL − U, fail above TL + U; 2.275 % at each end of what is between."""
    chosen = thresholds(0.02275, 0.97725)
    ends = {-1.001: Verdict.CONFORMS, -0.999: Verdict.OPEN, 0.999: Verdict.OPEN, 1.001: Verdict.FAILS}
    for times, verdict in ends.items():
        assert against_limit(LIMIT + times * U_EXPANDED, LIMIT, U_EXPANDED / 2, chosen) is verdict


def test_simple_acceptance_leaves_nothing_open() -> None:
    chosen = thresholds(0.499999, 0.500001)
    assert against_limit(LIMIT - 1e-4, LIMIT, 0.1, chosen) is Verdict.CONFORMS
    assert against_limit(LIMIT + 1e-4, LIMIT, 0.1, chosen) is Verdict.FAILS


@pytest.mark.parametrize(
    ("value", "above_is_bad", "verdict"),
    [
        (24.0, True, Verdict.CONFORMS), (24.0, False, Verdict.CONFORMS), (24.001, True, Verdict.FAILS),
        (23.999, False, Verdict.FAILS),
    ],
)  # fmt: skip
def test_without_doubt_the_limit_itself_is_kept(value: float, above_is_bad: bool, verdict: Verdict) -> None:
    assert against_limit(value, LIMIT, 0.0, GENERAL, above_is_bad=above_is_bad) is verdict


@given(value=st.floats(-5, 5), u=st.floats(0.001, 2))
def test_both_ways_of_looking_at_a_limit_mirror_each_other(value: float, u: float) -> None:
    assert against_limit(value, 1.0, u, GENERAL) is against_limit(-value, -1.0, u, GENERAL, above_is_bad=False)


@given(value=st.floats(-5, 5), u=st.floats(0.001, 2))
def test_the_verdict_is_that_of_the_gaussian_tail(value: float, u: float) -> None:
    past = 1 - NormalDist(value, u).cdf(0.0)
    if min(abs(past - 0.05), abs(past - 0.95)) > 1e-9:
        expected = Verdict.FAILS if past > 0.95 else Verdict.CONFORMS if past < 0.05 else Verdict.OPEN
        assert against_limit(value, 0.0, u, GENERAL) is expected
