"""One run with one load: drop, doubt, margin, collapse, smallest sufficient size."""

from __future__ import annotations

import math
import tomllib
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from rules import limits
from rules.decision import Verdict
from rules.errors import UnknownSize
from rules.loads import Drawn
from rules.one_run import MOST_PARALLEL, Answer, Carried, OneRun, Warmth, answer, sufficient
from rules.record import Run, Site
from rules.runs import Carrying, figures, record_variance
from rules.tables.conductors import area_mm2, ladder

GENERAL = limits.of(Site(name=""))
RUN = Run(id="", circuit_id="", number=1, one_way_length_m=29.0, size="4 mm2", insulation="PVC", method="C", grouped=1)
ASKED = OneRun(run=RUN, nominal_v=24.0, draws=Drawn(current_a=8.0), allowed_percent=5.0, ambient_c=25.0)


def at(temperature_c: float, **changes: object) -> OneRun:
    """The question with a conductor of known temperature."""
    run = replace(RUN, conductor_temperature_c=temperature_c, **changes)  # type: ignore[arg-type]
    return replace(ASKED, run=run)


def carried(asked: OneRun) -> Carried:
    found = answer(asked, GENERAL).carried
    assert found is not None
    return found


# Drop


def test_a_drop_by_hand() -> None:
    """
    29 m of 4 mm² at 20 °C: 2 × 29 × 4.61 mΩ = 267.38 mΩ, and four terminations of 0.15 mΩ × sqrt(10/4) × e^(ln²2 / 2) = 0.30157 mΩ:
    268.586 mΩ. At 8 A: 2.14869 V, 8.953 % of 24 V, 21.8513 V left, 17.1895 W; allowed 1.2 V.
    """
    found = answer(at(20.0), GENERAL)
    of_load = carried(at(20.0))
    assert found.loop.value == pytest.approx(268.586e-3, abs=1e-6)
    assert found.terminations_ohm == pytest.approx(4 * 0.301573e-3, rel=1e-5)
    assert of_load.drop.value == pytest.approx(2.14869, abs=1e-5)
    assert of_load.share.value == pytest.approx(0.0895288, abs=1e-6)
    assert of_load.at_load.value == pytest.approx(21.85131, abs=1e-5)
    assert of_load.loss.value == pytest.approx(17.1895, abs=1e-4)
    assert of_load.margin.value == pytest.approx(1.2 - 2.14869, abs=1e-5)
    assert (of_load.verdict, found.warmth) == (Verdict.FAILS, Warmth.GIVEN)


def test_its_doubt_by_hand() -> None:
    """
    Length by drawing 10 % and resistance 2 % of 267.38 mΩ, 8 K × 0.00393 of it, terminations 4 × their variance (e^(ln²2) - 1):
    sqrt(26.738² + 5.3476² + 8.4064² + 0.4739²) = 28.538 mΩ.
    """
    u = answer(at(20.0), GENERAL).loop.u
    assert u == pytest.approx(28.538e-3, abs=2e-6)
    assert carried(at(20.0)).drop.u == pytest.approx(8 * 28.538e-3, abs=2e-5)


@pytest.mark.parametrize(("by", "relative"), [("marks", 0.005), ("tape", 0.01), ("guess", 0.25)])
def test_a_better_length_has_less_doubt(by: str, relative: float) -> None:
    u = answer(at(20.0, length_by=by), GENERAL).loop.u or 0.0
    rest = 28.538e-3**2 - (0.1 * 267.38e-3) ** 2
    assert u == pytest.approx(math.sqrt(rest + (relative * 267.38e-3) ** 2), rel=1e-3)


def test_it_is_what_a_site_computes_for_the_same_run() -> None:
    run = replace(RUN, conductor_temperature_c=41.0, parallel=2, return_size="6 mm2", return_material="aluminium")
    same = figures([run], Site(name="x"), GENERAL)[""]
    found = answer(replace(ASKED, run=run), GENERAL)
    assert found.loop.value == pytest.approx(same.loop_ohm, rel=1e-14)
    assert found.loop.u == pytest.approx(math.sqrt(record_variance([Carrying(same, 1.0)], GENERAL)), rel=1e-14)


def test_a_printed_24_v_control_circuit() -> None:
    """
    A training page (read): 100 ft of stranded 16 AWG at 75 °C, 4 A, 24 V: 4.0 V, 16.7 %. Terminations, which the
    page leaves out, add 9 mV.
    """
    data = Path(__file__).parents[1] / "published" / "data" / "worked_examples.toml"
    example = tomllib.loads(data.read_text(encoding="utf-8"))["control_24V"]
    of_load = carried(
        replace(
            at(75.0, size="16 AWG", one_way_length_m=example["length_ft"] * 0.3048),
            draws=Drawn(current_a=example["current_A"]),
            nominal_v=example["nominal_V"],
        )
    )
    assert of_load.drop.value == pytest.approx(example["printed_drop_V"], abs=0.05)
    assert 100 * of_load.share.value == pytest.approx(example["printed_percent"], abs=0.25)


def test_a_run_of_no_length_has_its_terminations() -> None:
    of_load = carried(at(20.0, one_way_length_m=0.0))
    assert of_load.drop.value == pytest.approx(8 * 4 * 0.301573e-3, rel=1e-5)


# Loads


@given(st.floats(0.5, 200), st.floats(0.05, 2.5), st.sampled_from(["A", "W", "ohm"]))
def test_power_of_the_source_is_load_and_heat(length_m: float, load: float, kind: str) -> None:
    """And Ohm's law holds for the run, whatever stays constant in the load."""
    draws = {"A": Drawn(current_a=load), "W": Drawn(power_w=10 * load), "ohm": Drawn(conductance_s=load / 24)}[kind]
    asked = replace(at(30.0, one_way_length_m=length_m), draws=draws)
    found = answer(asked, GENERAL)
    of_load = found.carried
    assume(of_load is not None)
    assert of_load is not None
    volts, amperes = of_load.at_load.value, of_load.current.value
    assert 24 * amperes == pytest.approx(volts * amperes + of_load.loss.value, rel=1e-9)
    assert of_load.drop.value == pytest.approx(amperes * found.loop.value, rel=1e-7)
    drawn = {"A": amperes, "W": volts * amperes / 10, "ohm": amperes / volts * 24}[kind]
    assert drawn == pytest.approx(load, rel=1e-9)


@pytest.mark.parametrize("draws", [Drawn(current_a=6.0), Drawn(power_w=120.0), Drawn(conductance_s=0.25)])
def test_doubts_are_those_of_small_changes_of_the_resistance(draws: Drawn) -> None:
    asked = replace(at(30.0), draws=draws)
    found, of_load = answer(asked, GENERAL), carried(asked)
    step = 1e-6
    longer = replace(asked, run=replace(asked.run, one_way_length_m=29.0 * (1 + step)))
    ohms = answer(longer, GENERAL).loop.value - found.loop.value
    for name in ("drop", "current", "loss"):
        before, after = getattr(of_load, name), getattr(carried(longer), name)
        assert (before.u or 0.0) == pytest.approx(
            abs(after.value - before.value) / ohms * (found.loop.u or 0.0), rel=1e-3
        )


def test_a_load_of_constant_power_collapses() -> None:
    """Vs² / 4 R: 24 V over 268.586 mΩ gives at most 536.14 W. 536 W hangs on at half the voltage; 537 W does not."""
    at_most = answer(replace(at(20.0), draws=Drawn(power_w=536.0)), GENERAL)
    assert at_most.most.value == pytest.approx(536.14, abs=0.01)
    assert at_most.carried is not None
    assert 12.0 < at_most.carried.at_load.value < 12.3
    assert at_most.carried.may_collapse
    assert not at_most.suffices
    over = answer(replace(at(20.0), draws=Drawn(power_w=537.0)), GENERAL)
    assert over.carried is None
    assert not over.suffices
    assert not over.is_above_capacity


def test_no_doubt_is_more_than_the_source_has() -> None:
    found = answer(replace(at(20.0), draws=Drawn(power_w=536.135)), GENERAL)
    assert found.carried is not None
    assert found.carried.drop.u == 24.0


def test_a_current_that_a_dead_short_would_not_draw_cannot_flow() -> None:
    """24 V over 268.586 mΩ: 89.36 A."""
    found = answer(replace(at(20.0), draws=Drawn(current_a=90.0)), GENERAL)
    assert found.carried is None
    assert found.most.value == pytest.approx(89.357, abs=1e-3)
    assert found.most.unit == "A"


# Temperature


def test_a_constant_current_settles_at_once() -> None:
    """8 A in 36 A of PVC, method C, at 25 °C: 25 + 40 × (8/36)² = 26.975 °C."""
    found = answer(ASKED, GENERAL)
    assert found.temperature.value == pytest.approx(25 + 40 * (8 / 36) ** 2)
    assert (found.warmth, found.temperature.u) == (Warmth.IN_SERVICE, 8)
    assert not found.is_above_capacity


@pytest.mark.parametrize("draws", [Drawn(power_w=260.0), Drawn(conductance_s=0.8)])
def test_temperature_and_current_settle_with_each_other(draws: Drawn) -> None:
    found = answer(replace(ASKED, draws=draws), GENERAL)
    assert found.carried is not None
    assert found.capacity is not None
    assert found.temperature.value > 28
    assert found.temperature.value == pytest.approx(found.capacity.temperature_c(found.carried.current.value), abs=1e-6)


def test_above_capacity_the_conductor_is_held_at_its_limit() -> None:
    found = answer(replace(ASKED, draws=Drawn(current_a=60.0)), GENERAL)
    assert (found.temperature.value, found.warmth) == (70.0, Warmth.LIMIT)
    assert found.is_above_capacity
    assert not found.suffices


def test_without_a_capacity_the_conductor_is_hot() -> None:
    found = answer(replace(ASKED, run=replace(RUN, size="22 AWG"), draws=Drawn(current_a=0.3)), GENERAL)
    assert (found.temperature.value, found.warmth) == (GENERAL["temperature.hot_c"], Warmth.HOT)
    assert "no 60 °C ampacity for copper of 22 AWG" in found.capacity_gap
    hotter = answer(replace(ASKED, run=replace(RUN, method="D"), ambient_c=85.0), GENERAL)
    assert hotter.temperature.value == 85.0


def test_a_load_that_collapses_leaves_the_conductor_at_the_ambient() -> None:
    found = answer(replace(ASKED, draws=Drawn(power_w=2000.0)), GENERAL)
    assert (found.temperature.value, found.warmth, found.carried) == (25.0, Warmth.AMBIENT, None)


# Verdicts


@pytest.mark.parametrize(
    ("allowed_percent", "verdict"), [(7.0, Verdict.FAILS), (9.0, Verdict.OPEN), (11.0, Verdict.CONFORMS)]
)
def test_the_allowed_drop_is_judged_with_the_doubt(allowed_percent: float, verdict: Verdict) -> None:
    """8.95 % with a standard uncertainty of 0.95 %."""
    assert carried(replace(at(20.0), allowed_percent=allowed_percent)).verdict is verdict


@pytest.mark.parametrize(
    ("lowest_v", "verdict"), [(22.5, Verdict.FAILS), (21.9, Verdict.OPEN), (21.0, Verdict.CONFORMS)]
)
def test_so_is_the_loads_lowest_voltage(lowest_v: float, verdict: Verdict) -> None:
    asked = replace(at(20.0), allowed_percent=20.0, lowest_v=lowest_v)
    of_load = carried(asked)
    assert of_load.lowest_verdict is verdict
    assert of_load.lowest_margin is not None
    assert of_load.lowest_margin.value == pytest.approx(21.85131 - lowest_v, abs=1e-5)
    assert answer(asked, GENERAL).suffices == (verdict is Verdict.CONFORMS)


# Sufficient


def enough(asked: OneRun) -> Answer:
    found = sufficient(asked, GENERAL)
    assert found is not None
    return found


@given(st.floats(1, 60), st.floats(0.5, 40), st.sampled_from(["4 mm2", "12 AWG"]), st.floats(2, 10))
def test_the_smallest_sufficient_size_suffices_and_the_next_smaller_does_not(
    length_m: float, current_a: float, size: str, allowed_percent: float
) -> None:
    run = replace(RUN, one_way_length_m=length_m, size=size)
    asked = replace(ASKED, run=run, draws=Drawn(current_a=current_a), allowed_percent=allowed_percent)
    found = sufficient(asked, GENERAL)
    assume(found is not None)
    assert found is not None
    assert found.suffices
    assert found.capacity is not None
    smaller = [step for step in ladder(size) if area_mm2(step) < area_mm2(found.asked.run.size)]
    assume(smaller and found.asked.run.parallel_or_default == 1)
    before = answer(replace(asked, run=replace(run, size=smaller[-1])), GENERAL)
    assert not before.suffices or before.capacity is None


def test_a_size_beside_the_ladder_may_suffice() -> None:
    """3 AWG is no size of the ladder; it is what is there."""
    asked = replace(ASKED, run=replace(RUN, size="3 AWG"), draws=Drawn(current_a=22.0))
    assert enough(asked).asked.run.size == "3 AWG"


def test_capacity_asks_for_more_than_the_drop_does() -> None:
    """2 m at 35 A: 4 mm² would do for the drop; 36 A × 0.71 at 50 °C ambient asks for 10 mm²: 63 A × 0.71."""
    run = replace(RUN, one_way_length_m=2.0)
    asked = replace(ASKED, run=run, draws=Drawn(current_a=35.0), ambient_c=50.0)
    assert answer(asked, GENERAL).carried is not None
    assert enough(asked).asked.run.size == "10 mm2"


def test_where_capacity_is_known_a_size_without_one_does_not_count() -> None:
    """
    60 °C has no figure for 18 AWG, which would do for the drop; so 14 AWG. For 20 AWG itself there is none, so that any
    size counts: 22 AWG.
    """
    asked = replace(ASKED, run=replace(RUN, size="12 AWG"), draws=Drawn(current_a=1.0), allowed_percent=9.0)
    assert answer(replace(asked, run=replace(RUN, size="18 AWG")), GENERAL).suffices
    assert enough(asked).asked.run.size == "14 AWG"
    small = replace(asked, run=replace(RUN, size="20 AWG"), draws=Drawn(current_a=0.35))
    assert enough(small).asked.run.size == "22 AWG"


def test_parallel_conductors_where_no_size_suffices() -> None:
    run = replace(RUN, size="240 mm2", one_way_length_m=30.0, method="E", insulation="XLPE")
    found = enough(replace(ASKED, run=run, draws=Drawn(current_a=900.0), nominal_v=48.0))
    assert found.asked.run.size == "240 mm2"
    number = found.asked.run.parallel_or_default
    assert number > 1
    fewer = replace(ASKED, run=replace(run, parallel=number - 1), draws=Drawn(current_a=900.0), nominal_v=48.0)
    assert not answer(fewer, GENERAL).suffices


def test_nothing_may_suffice() -> None:
    run = replace(RUN, one_way_length_m=100_000.0)
    assert sufficient(replace(ASKED, run=run), GENERAL) is None
    assert MOST_PARALLEL >= 10


def test_an_unknown_size_is_refused() -> None:
    with pytest.raises(UnknownSize, match=r"next to it are 2.5 mm2 and 4 mm2"):
        answer(replace(ASKED, run=replace(RUN, size="3 mm2")), GENERAL)
