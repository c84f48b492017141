"""Capacity of the runs of a record: which table, which column, which corrections, and what is assumed."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rules import limits
from rules.calc.ampacity import Capacity, iec_capacity, nec_capacity
from rules.capacity import capacity_of
from rules.errors import InvalidQuantity, MissingData, UnknownSize
from rules.record import METALS, Run, Site
from rules.tables.ampacity import IEC_METHODS, iec_ampacity, limit_c, nec_ampacity, nec_column_c

SITE = Site(name="hut", ambient_temperature_c=30.0)
RUN = Run(id="r", circuit_id="c", number=1, size="4 mm2", insulation="PVC", method="C", grouped=1)
AMERICAN = replace(RUN, size="4 AWG", insulation="XLPE", method="")


def of(run: Run, rated_current_a: float | None = None, site: Site = SITE, profile: str = "") -> Capacity:
    own = f'[capacity]\nsource = "test"\n{profile}\n'
    if profile:
        site = replace(site, limits="ours.toml", own_limits=own)
    return capacity_of(run, site, limits.of(site), rated_current_a)


# Metric sizes


def test_a_run_that_says_everything_assumes_nothing() -> None:
    capacity = of(RUN)
    assert (capacity.ampacity_a, capacity.column, capacity.assumed) == (36.0, "PVC, method C", ())
    assert (capacity.table, capacity.edition, capacity.status) == ("iec_pvc_copper", "2009", "verified")


def test_ambient_grouping_and_parallel_correct_the_printed_figure() -> None:
    """4 mm² PVC by C: 36 A × 0.87 at 40 °C × 0.65 for 3 circuits + 1 conductor in parallel × 2 = 40.716 A."""
    capacity = of(replace(RUN, grouped=3, parallel=2), site=replace(SITE, ambient_temperature_c=40.0))
    assert (capacity.ambient_factor, capacity.grouping_factor, capacity.parallel) == (0.87, 0.65, 2)
    assert capacity.ampacity_a == pytest.approx(40.716)


def test_what_is_not_recorded_is_taken_as_the_profile_says_and_named() -> None:
    capacity = of(Run(id="r", circuit_id="c", number=1, size="4 mm2"), site=Site(name="x"))
    assert (capacity.column, capacity.tabulated_a, capacity.ambient_factor) == ("PVC, method A2", 25.0, 1.06)
    assert capacity.assumed == (
        "installation method A2",
        "PVC insulation",
        "no other loaded circuit beside it",
        "ambient 25 °C",
    )
    ours = of(
        replace(RUN, insulation="unknown", method=""), profile='assumed_insulation = "XLPE"\nassumed_method = "E"'
    )
    assert (ours.column, ours.assumed) == ("XLPE, method E", ("installation method E", "XLPE insulation"))


def test_what_the_profile_assumes_is_the_lowest_of_the_tables() -> None:
    least = min(iec_ampacity("4 mm2", "copper", "PVC", method).value for method in IEC_METHODS)
    assert of(Run(id="r", circuit_id="c", number=1, size="4 mm2")).tabulated_a == least


@pytest.mark.parametrize("text", ["C", "c", "method C", "Reference method C", " C "])
def test_a_method_may_be_written_in_several_ways(text: str) -> None:
    assert of(replace(RUN, method=text)).column == "PVC, method C"


def test_a_method_with_a_number() -> None:
    assert of(replace(RUN, method="method b 2")).column == "PVC, method B2"


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"size": ""}, "the size of run 1 is not known"),
        ({"method": "D"}, "no table held here has method 'D'"),
        ({"method": "tray"}, "run 1 has the method 'tray', which is no reference method of IEC 60364-5-52"),
        ({"material": "copper-clad aluminium"}, "has no capacity for copper-clad aluminium in PVC insulation"),
        ({"material": "aluminium", "size": "1.5 mm2"}, "no capacity for aluminium of 1.5 mm2 in PVC by method C"),
        ({"size": "400 mm2"}, "has no capacity for copper of 400 mm2 in PVC by method C"),
        ({"grouped": 21}, "has no factor for 21 circuits together"),
    ],
)
def test_a_case_without_a_table_is_said_plainly(change: dict[str, Any], said: str) -> None:
    with pytest.raises(MissingData, match=said):
        of(replace(RUN, **change))


def test_too_hot_a_site_leaves_no_capacity() -> None:
    with pytest.raises(MissingData, match="leaves PVC-insulated conductors no capacity at 61 °C ambient"):
        of(RUN, site=replace(SITE, ambient_temperature_c=61.0))


def test_a_size_that_no_table_of_conductors_has() -> None:
    with pytest.raises(UnknownSize, match=r"next to it are 2.5 mm2 and 4 mm2"):
        of(replace(RUN, size="3 mm2"))


def test_hot_terminals_are_asked_for() -> None:
    assert "ask whether its terminals stand more than 70 °C" in of(replace(RUN, insulation="XLPE")).notes[0]
    assert of(RUN).notes == ()
    assert "single layer" in of(replace(RUN, grouped=4)).notes[0]


# American sizes


def test_unmarked_terminals_bind_a_small_circuit_to_60_degrees() -> None:
    """4 AWG of 90 °C: 95 A in its column, 70 A at its ends with a device of 60 A, 85 A with one of 125 A."""
    small, large = of(AMERICAN, 60.0), of(AMERICAN, 125.0)
    assert (small.corrected_a, small.terminal_a, small.ampacity_a) == (95.0, 70.0, 70.0)
    assert (large.corrected_a, large.terminal_a, large.ampacity_a) == (95.0, 85.0, 85.0)
    assert small.assumed == large.assumed == ()


def test_terminals_follow_the_size_where_no_device_is_known_and_that_is_named() -> None:
    capacity = of(AMERICAN)
    assert (capacity.terminal_c, capacity.assumed) == (60, ("terminals of 60 °C, by the size",))
    assert of(replace(AMERICAN, size="1/0 AWG")).terminal_c == 75


def test_terminals_may_be_marked() -> None:
    capacity = of(AMERICAN, profile='nec_terminals = "75"')
    assert (capacity.ampacity_a, capacity.assumed) == (85.0, ())


def test_bundling_counts_both_conductors_of_each_circuit() -> None:
    """Two circuits are four conductors, 80 %; one circuit with two in parallel is the same."""
    assert of(replace(AMERICAN, grouped=2), 60.0).corrected_a == pytest.approx(95.0 * 0.8)
    doubled = of(replace(AMERICAN, size="1/0 AWG", parallel=2), 400.0)
    assert doubled.corrected_a == pytest.approx(2 * 170.0 * 0.8)
    assert doubled.terminal_a == 2 * 150.0


def test_hot_terminal_column_never_raises_a_capacity() -> None:
    pvc = of(replace(AMERICAN, insulation="PVC"), 125.0)
    assert (pvc.corrected_a, pvc.terminal_a, pvc.ampacity_a) == (70.0, 85.0, 70.0)


@pytest.mark.parametrize(("word", "amperes"), [("60", 70.0), ("75", 85.0), ("90", 95.0)])
def test_the_profile_says_which_column_pvc_is_read_in(word: str, amperes: float) -> None:
    capacity = of(replace(AMERICAN, insulation="PVC"), 125.0, profile=f'nec_column_of_pvc = "{word}"')
    assert capacity.tabulated_a == amperes


def test_small_conductors_bring_the_largest_device() -> None:
    capacity = of(replace(AMERICAN, size="14 AWG"), 15.0)
    assert (capacity.ampacity_a, capacity.largest_device_a) == (15.0, 15.0)
    assert capacity.notes == ("the small-conductor rule allows a device of 15 A at most",)


def test_18_awg_has_no_figure_for_its_terminations() -> None:
    capacity = of(replace(AMERICAN, size="18 AWG"))
    assert (capacity.terminal_a, capacity.ampacity_a, capacity.largest_device_a) == (None, 14.0, 7.0)
    assert capacity.assumed == ()


def test_an_earlier_edition_has_other_cells() -> None:
    now, before = (
        of(replace(AMERICAN, size="1 AWG"), 200.0),
        of(replace(AMERICAN, size="1 AWG"), 200.0, profile='table = "nec before 2011"'),
    )
    assert (now.corrected_a, before.corrected_a) == (145.0, 150.0)
    assert (now.edition, before.edition) == ("2011 to 2023", "before 2011")
    assert before.notes == ("ambient and bundling factors are those from 2011 on",)


@pytest.mark.parametrize("method", ["", "raceway", "Conduit", "cable", "earth", "direct buried", "D", "E", "method B1"])
def test_table_310_16_is_for_raceway_cable_or_earth(method: str) -> None:
    assert of(replace(AMERICAN, method=method)).table == "nec_310_16_copper"


@pytest.mark.parametrize("method", ["free air", "F", "g", "ladder"])
def test_table_310_16_is_not_for_single_conductors_in_air(method: str) -> None:
    with pytest.raises(MissingData, match="is for raceway, cable or earth"):
        of(replace(AMERICAN, method=method))


@pytest.mark.parametrize(
    ("change", "profile", "said"),
    [
        ({"size": "16 AWG", "insulation": "PVC"}, "", "has no 60 °C ampacity for copper of 16 AWG"),
        ({"size": "13 AWG"}, "", "has no 90 °C ampacity for copper of 13 AWG"),
        ({"size": "14 AWG", "material": "aluminium"}, "", "has no 90 °C ampacity for aluminium of 14 AWG"),
        ({}, 'table = "iec"', "IEC 60364-5-52 has no capacity for 4 AWG, only for metric sizes"),
        ({"size": "4 mm2"}, 'table = "nec"', "has no ampacity for 4 mm2, only for AWG and kcmil sizes"),
    ],
)
def test_an_american_case_without_a_table(change: dict[str, Any], profile: str, said: str) -> None:
    with pytest.raises(MissingData, match=said):
        of(replace(AMERICAN, **change), profile=profile)


def test_copper_clad_aluminium_stands_in_the_column_of_aluminium() -> None:
    clad, plain = (of(replace(AMERICAN, material=metal), 60.0) for metal in ("copper-clad aluminium", "aluminium"))
    assert clad.corrected_a == plain.corrected_a == 75.0


# Both


def test_the_weaker_leg_decides() -> None:
    thin = replace(RUN, return_size="2.5 mm2")
    assert (of(thin).size, of(thin).ampacity_a) == ("2.5 mm2", 27.0)
    mixed = replace(RUN, size="16 mm2", return_material="aluminium")
    assert (of(mixed).material, of(mixed).ampacity_a) == ("aluminium", 66.0)


@pytest.mark.parametrize("way_back", ["shared:N", "structure"])
def test_a_return_that_others_share_is_not_looked_at(way_back: str) -> None:
    run = replace(RUN, return_conductor=way_back, return_size="" if way_back == "structure" else "1.5 mm2")
    assert of(run).ampacity_a == 36.0


def test_legs_of_two_standards_are_each_read_in_their_own() -> None:
    """4 mm² by C 36 A; the return of 14 AWG PVC 15 A at its terminations."""
    assert of(replace(RUN, return_size="14 AWG")).ampacity_a == 15.0


@pytest.mark.parametrize(("circuits", "parallel"), [(0, 1), (1, 0)])
def test_less_than_one_circuit_or_conductor_is_refused(circuits: int, parallel: int) -> None:
    with pytest.raises(InvalidQuantity, match="must be 1 or more, got 0"):
        iec_capacity("4 mm2", circuits=circuits, parallel=parallel)
    with pytest.raises(InvalidQuantity, match="must be 1 or more, got 0"):
        nec_capacity("4 AWG", circuits=circuits, parallel=parallel)


def test_words_that_no_table_knows() -> None:
    with pytest.raises(MissingData, match="conductor temperature for the insulation 'paper'"):
        limit_c("paper")
    with pytest.raises(MissingData, match="no column for the insulation 'paper'"):
        nec_column_c("paper")
    with pytest.raises(MissingData, match="no ampacity for silver"):
        nec_ampacity("4 AWG", "silver", 60)


@given(st.sampled_from(METALS[:3]), st.sampled_from(["16 mm2", "50 mm2"]), st.integers(1, 12), st.floats(-10, 55))
def test_more_company_and_more_heat_never_carry_more(metal: str, size: str, circuits: int, ambient_c: float) -> None:
    def amperes(circuits: int, ambient_c: float) -> float:
        run = replace(RUN, size=size, material=metal, grouped=circuits)
        return of(run, site=replace(SITE, ambient_temperature_c=ambient_c)).ampacity_a

    assert amperes(circuits + 1, ambient_c) <= amperes(circuits, ambient_c)
    assert amperes(circuits, ambient_c + 5) <= amperes(circuits, ambient_c)


# In service


def test_temperature_in_service_is_the_limit_at_capacity() -> None:
    """36 A × 0.7 for three circuits; the printed ambient factor rounds, so that 40 °C gives 70 °C within half a kelvin."""
    capacity = of(replace(RUN, grouped=3))
    assert capacity.temperature_c(36 * 0.7) == pytest.approx(70.0)
    hot = of(replace(RUN, grouped=3), site=replace(SITE, ambient_temperature_c=40.0))
    assert hot.temperature_c(hot.corrected_a) == pytest.approx(70.0, abs=0.5)


def test_temperature_in_service_by_hand() -> None:
    """18 A in 36 A of PVC at 24 °C: 24 + 40 × 0.25 = 34 °C."""
    assert of(RUN, site=replace(SITE, ambient_temperature_c=24.0)).temperature_c(18.0) == pytest.approx(34.0)


def test_terminals_do_not_enter_the_temperature_in_service() -> None:
    """4 AWG of 90 °C: at 95 A it has 90 °C, though its terminations allow 70 A."""
    assert of(AMERICAN, 60.0).temperature_c(95.0) == pytest.approx(90.0)
