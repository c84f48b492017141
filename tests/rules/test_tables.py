"""The data in use, and what is looked up in it."""

from __future__ import annotations

import itertools

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rules.errors import UnknownSize
from rules.record import METALS, STRANDINGS
from rules.tables import awg
from rules.tables.conductors import (
    alpha_20c,
    area_mm2,
    is_known,
    ladder,
    neighbours,
    next_smaller,
    resistance_20c_ohm_per_m,
    resistivity_20c,
)
from rules.tables.loader import STATUSES, group, groups
from rules.units import parse_size

AWG = [awg.name(n) for n in awg.NUMBERS]
KCMIL = [f"{n} kcmil" for n in (250, 300, 350, 400, 500, 600, 700, 750, 800, 900, 1000, 1250, 1500, 1750, 2000)]
NUMBERS = [0.5, 0.75, 1, 1.5, 2.5, 4, 6, 10, 16, 25, 35, 50, 70, 95, 120, 150, 185, 240, 300, 400, 500, 630]
MM2 = [f"{n} mm2" for n in NUMBERS]
SIZES = AWG + KCMIL + MM2

# Groups


def test_every_group_says_where_it_comes_from() -> None:
    assert groups()
    for each in groups():
        assert all((each.title, each.source, each.edition, each.unit)), each.name
        assert each.status in STATUSES, each.name


def test_every_row_fits_its_columns() -> None:
    for each in groups():
        assert each.rows, each.name
        assert {len(row) for row in each.rows} == {len(each.columns)}, each.name


def test_names_of_groups_are_unique_and_found() -> None:
    names = [each.name for each in groups()]
    assert len(set(names)) == len(names)
    assert [group(name) for name in names] == list(groups())


def test_groups_are_read_once() -> None:
    assert groups() is groups()


def test_a_gap_in_a_source_is_none() -> None:
    row = next(row for row in group("iec_class1").rows if row[0] == 500.0)
    assert row == (500.0, None, None, 0.0605)


# Sizes


def test_all_sizes_are_known() -> None:
    assert [size for size in SIZES if not is_known(size)] == []


@pytest.mark.parametrize("size", ["3 mm2", "31 AWG", "5/0 AWG", "275 kcmil", "12awg", "12", "", "0.34 mm2", "2.50 mm2"])
def test_other_texts_are_no_known_sizes(size: str) -> None:
    assert not is_known(size)


def test_a_known_size_is_written_as_people_s_text_is_read() -> None:
    assert [parse_size(size) for size in SIZES] == SIZES


@pytest.mark.parametrize("standard", [AWG, KCMIL, MM2])
def test_areas_rise_along_each_standard(standard: list[str]) -> None:
    areas = [area_mm2(size) for size in standard]
    assert areas == sorted(set(areas))


@pytest.mark.parametrize(
    ("size", "area"), [("4/0 AWG", 107.2193), ("12 AWG", 3.30877), ("30 AWG", 0.050926), ("1000 kcmil", 506.707)]
)
def test_areas_by_circular_mils(size: str, area: float) -> None:
    """ASTM B258 by another hand: d = 5 mil · 92^((36 - n) / 39); 1 kcmil is 0.506707 mm²."""
    assert area_mm2(size) == pytest.approx(area, rel=2e-5)


@pytest.mark.parametrize(
    ("size", "near"),
    [
        ("3 mm2", ("2.5 mm2", "4 mm2")),
        ("0.34 mm2", ("0.5 mm2",)),
        ("800 mm2", ("630 mm2",)),
        ("31 AWG", ("30 AWG",)),
        ("5/0 AWG", ("4/0 AWG",)),
        ("275 kcmil", ("250 kcmil", "300 kcmil")),
        ("200 kcmil", ("250 kcmil",)),
        ("1/0 AWG", ("1 AWG", "2/0 AWG")),
        ("0.5 mm2", ("0.75 mm2",)),
        ("nan mm2", ()),
        ("x AWG", ()),
        ("2.5", ()),
        ("", ()),
    ],
)
def test_neighbours_are_of_the_same_standard(size: str, near: tuple[str, ...]) -> None:
    assert neighbours(size) == near


@pytest.mark.parametrize(
    ("size", "said"),
    [
        ("3 mm2", "IEC 60228 has no size '3 mm2'; next to it are 2.5 mm2 and 4 mm2"),
        ("31 AWG", "AWG has no size '31 AWG'; next to it is 30 AWG"),
        ("2.5", "no table has the size '2.5'; accepted are 30 to 4/0 AWG, 250 to 2000 kcmil and 0.5 to 630 mm2"),
    ],
)
def test_an_unknown_size_is_refused_with_its_neighbours(size: str, said: str) -> None:
    for look_up in (area_mm2, resistance_20c_ohm_per_m, next_smaller):
        with pytest.raises(UnknownSize) as error:
            look_up(size)
        assert str(error.value) == said


@given(st.text() | st.from_regex(r"[0-9./]{1,5} (AWG|kcmil|mm2)", fullmatch=True))
def test_any_text_is_known_or_refused(text: str) -> None:
    assert is_known(text) == (text in SIZES)
    assert set(neighbours(text)) <= set(SIZES)
    if text not in SIZES:
        with pytest.raises(UnknownSize):
            area_mm2(text)


# Resistance


@pytest.mark.parametrize(("metal", "stranding"), itertools.product(METALS, STRANDINGS))
def test_metric_figures_lie_little_above_resistivity_over_area(metal: str, stranding: str) -> None:
    """A slip of the pen in any cell shows: 3 to 13.4 % (50 mm² aluminium) for class 1 and 2, to 17.5 % for class 5."""
    most = 1.175 if stranding == "flexible" else 1.135
    ratios = {
        size: resistance_20c_ohm_per_m(size, metal, stranding) * area_mm2(size) * 1e-6 / resistivity_20c(metal)
        for size in MM2
    }
    assert {size: ratio for size, ratio in ratios.items() if not 1.0 < ratio < most} == {}


@pytest.mark.parametrize(("metal", "size"), itertools.product(METALS, AWG + KCMIL))
def test_american_sizes_follow_from_area_with_two_percent_for_lay(metal: str, size: str) -> None:
    by_area = resistivity_20c(metal) / (area_mm2(size) * 1e-6)
    assert resistance_20c_ohm_per_m(size, metal, "solid") == pytest.approx(by_area)
    for stranding in ("stranded", "flexible"):
        assert resistance_20c_ohm_per_m(size, metal, stranding) == pytest.approx(1.02 * by_area)


@pytest.mark.parametrize(("standard", "metal", "stranding"), itertools.product((AWG, KCMIL, MM2), METALS, STRANDINGS))
def test_a_larger_size_never_has_more_resistance(standard: list[str], metal: str, stranding: str) -> None:
    ohms = [resistance_20c_ohm_per_m(size, metal, stranding) for size in standard]
    assert ohms == sorted(ohms, reverse=True)


@pytest.mark.parametrize(
    ("size", "metal", "stranding", "ohm_per_km"),
    [
        ("2.5 mm2", "aluminium", "stranded", 7.41 * 28.264 / (1000 / 58)),
        ("16 mm2", "aluminium", "flexible", 1.21 * 28.264 / (1000 / 58)),
        ("10 mm2", "copper-clad aluminium", "stranded", 1.83 / 0.62),
        ("25 mm2", "tinned copper", "solid", 0.727 * 17.745 / (1000 / 58)),
        ("500 mm2", "copper", "solid", 0.0366),
        ("12 AWG", "copper-clad aluminium", "solid", 1000 / 58 / 0.62 / 3.308773),
    ],
)
def test_what_the_standard_lacks_is_scaled_from_copper(
    size: str, metal: str, stranding: str, ohm_per_km: float
) -> None:
    assert 1000 * resistance_20c_ohm_per_m(size, metal, stranding) == pytest.approx(ohm_per_km, rel=1e-6)


def test_copper_and_stranded_are_meant_where_nothing_is_said() -> None:
    assert resistance_20c_ohm_per_m("4 mm2") == resistance_20c_ohm_per_m("4 mm2", "copper", "stranded") == 4.61e-3


@pytest.mark.parametrize(
    ("metal", "alpha"),
    [("copper", 0.00393), ("tinned copper", 0.00382), ("aluminium", 0.00403), ("copper-clad aluminium", 0.00405)],
)
def test_temperature_coefficients(metal: str, alpha: float) -> None:
    assert alpha_20c(metal) == alpha


def test_resistivity_and_percent_iacs_of_a_metal_agree() -> None:
    for metal in METALS:
        percent = group("metal_" + metal.replace(" ", "_").replace("-", "_")).value("iacs_percent")
        assert resistivity_20c(metal) * percent == pytest.approx(100 / 58e6, rel=1e-4)


def test_an_unknown_metal_or_stranding_is_refused() -> None:
    with pytest.raises(UnknownSize, match="no table has the metal 'silver'"):
        alpha_20c("silver")
    with pytest.raises(UnknownSize, match="no table has 'braided' conductors; accepted are solid, stranded, flexible"):
        resistance_20c_ohm_per_m("4 mm2", "copper", "braided")


# Ladders


def test_ladders_are_those_of_the_method() -> None:
    assert ladder("3 mm2") == tuple(MM2[:19])
    gauges = [*range(24, 0, -2), "1/0", "2/0", "3/0", "4/0"]
    assert ladder("12 AWG") == ladder("250 kcmil") == tuple(f"{gauge} AWG" for gauge in gauges)


@pytest.mark.parametrize(
    ("size", "steps", "smaller"),
    [
        ("2.5 mm2", 1, "1.5 mm2"),
        ("2.5 mm2", 2, "1 mm2"),
        ("0.75 mm2", 2, None),
        ("0.5 mm2", 1, None),
        ("400 mm2", 1, "300 mm2"),
        ("3 AWG", 1, "4 AWG"),
        ("1 AWG", 2, "4 AWG"),
        ("22 AWG", 2, None),
        ("30 AWG", 1, None),
        ("500 kcmil", 1, "4/0 AWG"),
        ("12 AWG", 0, None),
    ],
)
def test_steps_down_a_ladder(size: str, steps: int, smaller: str | None) -> None:
    assert next_smaller(size, steps) == smaller


# Gauge formula


def test_gauge_formula_meets_its_three_fixed_points() -> None:
    assert awg.diameter_mm(36) == pytest.approx(0.005 * 25.4)
    assert awg.diameter_mm(-3) == pytest.approx(0.46 * 25.4)
    assert awg.circular_mils(-3) == pytest.approx(211_600)


@pytest.mark.parametrize("size", ["12", "AWG 12", "0/0 AWG", "012 AWG", "1234 AWG", "-3 AWG", "٣ AWG", "2.5 AWG"])
def test_other_texts_are_no_gauge(size: str) -> None:
    with pytest.raises(UnknownSize, match="not an AWG size"):
        awg.number(size)


@pytest.mark.parametrize("number", awg.NUMBERS)
def test_name_and_number_of_a_gauge_agree(number: int) -> None:
    assert awg.number(awg.name(number)) == number
