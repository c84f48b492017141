"""People's text to numbers and back."""

from __future__ import annotations

import math
import subprocess
import sys
from contextlib import suppress
from decimal import Decimal

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from rules.errors import InvalidQuantity, RulesError, UnreadableText
from rules.unit_words import COLUMNS
from rules.units import is_plain, parse, parse_size, plain, show, show_against, show_size

finite = st.floats(allow_nan=False, allow_infinity=False)
units = st.sampled_from(sorted(COLUMNS))
unhurried = settings(deadline=None)
"""The first typed unit of a process loads pint."""
quantities = st.text(alphabet="0123456789.,-+eE_ '\"°µμΩΩ²\u2212\u00a0\u2009VAmMkKohmftindegCFwsq%#/*xnaf", max_size=30)


# Reading


@pytest.mark.parametrize(
    ("text", "unit", "value"),
    [
        ("13.7", "m", 13.7),
        ("13.7m", "m", 13.7),
        ("45 ft", "m", 13.716),
        ("45 FT", "m", 13.716),
        ("6 in", "m", 0.1524),
        ("45 ft 6 in", "m", 13.8684),
        ("45' 6\"", "m", 13.8684),
        ("45'-6\"", "m", 13.8684),
        ("45′ 6″", "m", 13.8684),
        ("2,5", "m", 2.5),
        ("2,50 m", "m", 2.5),
        ("4.1 mV", "V", 0.0041),
        ("4.1 mv", "V", 0.0041),
        ("\u221276 V", "V", -76.0),
        ("48v", "V", 48.0),
        ("1.2e-3", "V", 0.0012),
        ("250 \u00b5V", "V", 0.00025),
        ("250 \u03bcV", "V", 0.00025),
        ("1.2 kA", "A", 1200.0),
        ("15 mohm", "ohm", 0.015),
        ("15 m\u2126", "ohm", 0.015),
        ("15 m\u03a9", "ohm", 0.015),
        ("15 uohm", "ohm", 15e-6),
        ("2.2 kohm", "ohm", 2200.0),
        ("2 Mohm", "ohm", 2e6),
        ("2 MΩ", "ohm", 2e6),
        ("2 kW", "W", 2000.0),
        ("250 ms", "s", 0.25),
        ("20 min", "s", 1200.0),
        ("25 °C", "degC", 25.0),
        ("25 deg C", "degC", 25.0),
        ("77 °F", "degC", 25.0),
        ("-40F", "degC", -40.0),
        ("300 K", "degC", 26.85),
        ("5 %", "%", 5.0),
        ("2,5 mm²", "mm2", 2.5),
        ("2.5 mm^2", "mm2", 2.5),
        ("2.5 sq mm", "mm2", 2.5),
        ("0.8", "", 0.8),
        ("15\u00a0m", "m", 15.0),
        ("15\u202fm", "m", 15.0),
        ("  15 m ", "m", 15.0),
        ("+5", "V", 5.0),
        (".5", "V", 0.5),
        ("-0", "V", 0.0),
    ],
)
def test_what_people_type_is_read(text: str, unit: str, value: float) -> None:
    assert parse(text, unit) == value


@pytest.mark.parametrize(
    ("text", "value"), [("0,125", 0.125), ("0,000", 0.0), ("00,125", 0.125), ("1234,500", 1234.5), (",500", 0.5)]
)
def test_a_comma_that_cannot_separate_thousands_is_decimal(text: str, value: float) -> None:
    assert parse(text, "m") == value


@pytest.mark.parametrize(
    ("text", "named"),
    [
        ("1,000", "1000 or 1.000"),
        ("-2,500 m", "-2500 or -2.500"),
        ("15 MOHM", "mohm (milli) or Mohm (mega)"),
    ],
)
def test_what_can_be_read_two_ways_is_refused_with_both(text: str, named: str) -> None:
    with pytest.raises(UnreadableText) as error:
        parse(text, "ohm" if "OHM" in text else "m")
    assert "two ways" in str(error.value)
    assert named in str(error.value)


@pytest.mark.parametrize(
    "text",
    [
        "", "  ", "ten m", "1 000", "1 000 m", "1.000,5", "1,000,000", "1'000", "5.", "5,", "0x10", "1_000", "9**9**9",
        "2*3", "1/2", "5-10", "1½", "٣", "1 ٣", "5 m 3", "45 ft 6", "45.5 ft 6 in", "5\x1b[0m", "5\x00", "--5",
        "5 m s", "0.2 V/A", "5²", "inf V", "1" * 101, "5" + " " * 200 + "x",
    ],
)  # fmt: skip
def test_text_that_is_no_quantity_is_refused_in_one_line(text: str) -> None:
    with pytest.raises(UnreadableText) as error:
        parse(text, "m")
    assert str(error.value).isprintable()
    assert len(str(error.value)) < 200


@pytest.mark.parametrize("text", ["nan", "-nan", "inf", "Infinity", "-inf", "1e999", "1e999 ft", "1e-999", "1e-999 ft"])
def test_a_number_that_a_float_cannot_hold_is_refused(text: str) -> None:
    with pytest.raises(InvalidQuantity, match=r"finite|too large|too small"):
        parse(text, "m")


@pytest.mark.parametrize("power", ["99999999999999999999", "-99999999999999999999", "4000", "-4000"])
def test_an_absurd_power_of_ten_is_refused_at_once(power: str) -> None:
    with pytest.raises(InvalidQuantity, match=r"too (large|small)"):
        parse(f"1e{power} ft", "m")


@pytest.mark.parametrize(
    ("text", "unit", "said"),
    [
        ("5 V", "m", "a voltage, not a length"),
        ("12 m", "V", "a length, not a voltage"),
        ("45 ft 6 in", "V", "is a length"),
        ("25 °C", "ohm", "a temperature, not a resistance"),
        ("80 %", "", "has a unit"),
    ],
)
def test_another_dimension_is_refused(text: str, unit: str, said: str) -> None:
    with pytest.raises(InvalidQuantity, match=said):
        parse(text, unit)


def test_inches_beside_feet_stay_below_a_foot() -> None:
    with pytest.raises(InvalidQuantity, match="less than 12"):
        parse("45 ft 12 in", "m")


@pytest.mark.parametrize(
    ("text", "unit", "near"),
    [
        ("5 metrs", "m", "metres"),
        ("45 M", "m", "m"),
        ("5 MV", "V", "mV"),
        ("5 amprs", "A", "amps"),
        ("5 om", "ohm", "ohm"),
    ],
)
def test_an_unknown_unit_names_a_known_one(text: str, unit: str, near: str) -> None:
    with pytest.raises(UnreadableText) as error:
        parse(text, unit)
    assert f"did you mean {near!r}?" in str(error.value)


def test_a_long_text_is_cut_in_its_error() -> None:
    with pytest.raises(UnreadableText, match="…"):
        parse("x" * 1_000_000, "m")


def test_plain_numbers_and_the_columns_own_unit_do_not_load_pint() -> None:
    """Start-up: pint costs half a second and is wanted only where a typed unit differs from the column's."""
    script = (
        "import sys; from rules.units import parse, parse_size, show; parse('12', 'm'); parse('12 m', 'm');"
        "parse_size('12 AWG'); show(1.0, 'V', 0.1); first = 'pint' in sys.modules;"
        "parse('12 ft', 'm'); print(first, 'pint' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert done.stdout.split() == ["False", "True"]


# Properties


@given(finite)
def test_plain_reads_back_as_the_same_float(value: float) -> None:
    text = plain(value)
    assert is_plain(text)
    assert parse(text, "m") == value


@given(st.integers(-(10**15), 10**15))
def test_a_whole_number_has_no_point(value: int) -> None:
    assert plain(float(value)) == str(value)


@unhurried
@given(
    st.integers(-99_999, 99_999), st.integers(-9, 3), st.sampled_from([("m", "V"), ("µ", "V"), ("k", "V"), ("", "V")])
)
def test_the_typed_unit_does_not_matter(digits: int, power: int, typed: tuple[str, str]) -> None:
    """The same voltage typed in mV, µV, kV or V is the same float, not one beside it."""
    prefix, unit = typed
    shift = {"m": -3, "µ": -6, "k": 3, "": 0}[prefix]
    number = Decimal(digits).scaleb(power)
    assert parse(f"{number.scaleb(-shift):f} {prefix}{unit}", "V") == float(number)


@unhurried
@given(st.floats(-200, 1000))
def test_fahrenheit_and_celsius_agree(celsius: float) -> None:
    text = f"{celsius * 9 / 5 + 32:.12f} °F"
    assert parse(text, "degC") == pytest.approx(celsius, abs=1e-9)


@unhurried
@given(st.text() | quantities, units)
def test_any_text_gives_a_float_or_an_error_of_ours(text: str, unit: str) -> None:
    with suppress(RulesError):
        value = parse(text, unit)
        assert math.isfinite(value)
        assert not is_plain(text) or value == float(text)


@given(st.text() | quantities)
def test_any_text_gives_a_size_that_stays_or_an_error_of_ours(text: str) -> None:
    with suppress(RulesError):
        size = parse_size(text)
        assert parse_size(size) == size


@unhurried
@given(st.text() | quantities, units)
def test_every_error_is_one_printable_line(text: str, unit: str) -> None:
    for read in (lambda: parse(text, unit), lambda: parse_size(text)):
        said = ""
        try:
            read()
        except RulesError as error:
            said = str(error)
        assert all(character.isprintable() for character in said)


@given(finite, units, st.none() | st.floats(0, 1e300))
def test_anything_finite_can_be_shown(value: float, unit: str, u: float | None) -> None:
    text = show(value, unit, u)
    assert text.isprintable()
    assert not text.startswith("-") or value < 0
    assert text.split(" ")[0].strip("-0.") or not text.startswith("-")  # no '-0.00'


@given(finite, finite, st.sampled_from(["V", "1", "ohm", "W", "degC"]))
def test_two_figures_bear_out_their_verdict(value: float, limit: float, unit: str) -> None:
    a, b = (float(text.split()[0]) for text in show_against(value, limit, unit))
    assert (a > b, a < b) == (value > limit, value < limit) or math.isinf(a) or math.isinf(b)


# Plain


@pytest.mark.parametrize("text", ["12.50", "-3", "1e-05", "1E5", "+5", ".5", "0", " 12 ", "007"])
def test_a_plain_number_needs_no_typed_entry(text: str) -> None:
    assert is_plain(text)


@pytest.mark.parametrize(
    "text", ["", "2,5", "45 ft", "12 m", "1e999", "1e-999", "nan", "inf", "−3", "1_000", "0x1", "5.", "٣", "1" * 101]
)
def test_other_text_needs_one(text: str) -> None:
    assert not is_plain(text)


@pytest.mark.parametrize(("value", "text"), [(0.0, "0"), (-0.0, "0"), (48.0, "48"), (0.1 + 0.2, "0.30000000000000004")])
def test_plain_is_the_shortest_text(value: float, text: str) -> None:
    assert plain(value) == text


@pytest.mark.parametrize("value", [math.nan, math.inf, -math.inf])
def test_what_is_not_finite_is_neither_written_nor_shown(value: float) -> None:
    for write in (plain, lambda v: show(v, "V"), lambda v: show(1.0, "V", v), lambda v: show_against(v, 1.0, "V")):
        with pytest.raises(InvalidQuantity):
            write(value)


# Sizes


@pytest.mark.parametrize(
    ("text", "size"),
    [
        ("12 AWG", "12 AWG"),
        ("12awg", "12 AWG"),
        ("AWG 12", "12 AWG"),
        ("awg12", "12 AWG"),
        ("#12 AWG", "12 AWG"),
        ("No. 12 AWG", "12 AWG"),
        ("4/0 AWG", "4/0 AWG"),
        ("4/0", "4/0 AWG"),
        ("0000 AWG", "4/0 AWG"),
        ("AWG 00", "2/0 AWG"),
        ("0 AWG", "1/0 AWG"),
        ("250 kcmil", "250 kcmil"),
        ("250MCM", "250 kcmil"),
        ("2.5 mm2", "2.5 mm2"),
        ("2,5 mm²", "2.5 mm2"),
        ("2.5mm^2", "2.5 mm2"),
        ("2.50 sq mm", "2.5 mm2"),
        ("2.5 SQ. MM", "2.5 mm2"),
        ("10.0 mm2", "10 mm2"),
        ("3\u00a0mm²", "3 mm2"),
        ("99 AWG", "99 AWG"),
    ],
)
def test_a_size_has_one_text(text: str, size: str) -> None:
    assert parse_size(text) == size


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("12", "may be AWG, kcmil or mm2"),
        ("2.5", "may be AWG, kcmil or mm2"),
        ("#12", "not a conductor size"),
        ("2.5 mm", "is a length"),
        ("12.5 AWG", "whole number or 1/0 to 4/0"),
        ("00000 AWG", "whole number or 1/0 to 4/0"),
        ("1,000 kcmil", "two ways"),
        ("1/0 mm2", "not a conductor size"),
        ("", "empty"),
        ("round", "not a conductor size"),
        ("2.5 m2", "not a conductor size"),
        ("1" * 101, "too long"),
    ],
)
def test_other_text_is_no_size(text: str, said: str) -> None:
    with pytest.raises(UnreadableText, match=said):
        parse_size(text)


@pytest.mark.parametrize("text", ["0 mm2", "-2.5 mm2", "0 kcmil", "1e999 mm2"])
def test_an_area_is_above_zero_and_finite(text: str) -> None:
    with pytest.raises(InvalidQuantity):
        parse_size(text)


def test_people_read_square_millimetres() -> None:
    assert show_size("2.5 mm2") == "2.5 mm²"
    assert show_size("4/0 AWG") == "4/0 AWG"


# Showing


@pytest.mark.parametrize(
    ("value", "unit", "u", "text"),
    [
        (0.155, "ohm", None, "155 mΩ"),
        (0.0041, "V", None, "4.1 mV"),
        (0.71, "V", None, "0.71 V"),
        (52.9731, "V", 0.031, "52.97 ± 0.03 V"),
        (0.7134, "V", 0.0142, "0.713 ± 0.014 V"),
        (0.7134, "V", 0.0196, "0.713 ± 0.020 V"),
        (0.7134, "V", 0.0096, "0.713 ± 0.010 V"),
        (0.00412, "V", 0.0003, "4.1 ± 0.3 mV"),
        (0.0, "V", 0.02, "0 ± 20 mV"),
        (0.05, "1", None, "5 %"),
        (0.0504, "1", 0.0012, "5.04 ± 0.12 %"),
        (5.0, "%", None, "5 %"),
        (25.0, "degC", None, "25 °C"),
        (-0.0001, "degC", 0.5, "0.0 ± 0.5 °C"),
        (-0.00001, "m", None, "-0.00001 m"),
        (-0.0, "V", None, "0 V"),
        (12345.6, "m", None, "12346 m"),
        (1234.0, "m", 100.0, "1230 ± 100 m"),
        (999.96, "V", None, "1 kV"),
        (10_000.0, "A", None, "10 kA"),
        (2.5e6, "ohm", None, "2.5 MΩ"),
        (15e-6, "ohm", None, "15 µΩ"),
        (5.2108e-3, "ohm/m", None, "5.211 mΩ/m"),
        (2.5, "mm2", None, "2.5 mm²"),
        (3.0, "", None, "3"),
        (7.25, "s", None, "7.25 s"),
        (48.0, "V", 0.0, "48 V"),
        (1e30, "m", 1.0, "1e+30 ± 1 m"),
        (48.0, "V", 1e-14, "48 ± 1e-14 V"),
    ],
)
def test_a_figure_has_the_digits_that_its_doubt_allows(value: float, unit: str, u: float | None, text: str) -> None:
    assert show(value, unit, u) == text


def test_a_doubt_is_not_negative() -> None:
    with pytest.raises(InvalidQuantity, match="must not be negative"):
        show(1.0, "V", -0.1)


@pytest.mark.parametrize(
    ("value", "limit", "unit", "texts"),
    [
        (0.0504, 0.05, "1", ("5.04 %", "5 %")),
        (0.0891667, 0.05, "1", ("8.92 %", "5 %")),
        (0.0500004, 0.05, "1", ("5.00004 %", "5 %")),
        (0.0499996, 0.05, "1", ("4.99996 %", "5 %")),
        (0.05, 0.05, "1", ("5 %", "5 %")),
        (40.21, 40.25, "V", ("40.2 V", "40.25 V")),
        (40.246, 40.2449, "V", ("40.25 V", "40.2449 V")),
        (0.0498, 0.05, "V", ("49.8 mV", "50 mV")),
        (-1.0, 0.0, "V", ("-1 V", "0 V")),
        (0.1 + 0.2, 0.3, "V", ("0.30000000000000004 V", "0.3 V")),
    ],
)
def test_digits_are_added_until_the_verdict_shows(
    value: float, limit: float, unit: str, texts: tuple[str, str]
) -> None:
    assert show_against(value, limit, unit) == texts
