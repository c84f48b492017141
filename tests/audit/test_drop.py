"""``ohmwalk drop`` as people and scripts meet it."""

from __future__ import annotations

import io
import json
import re
from collections.abc import Iterator
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from audit import cli
from audit.drop.reading import Options, Understood, understand
from audit.drop.text import print_drop
from audit.drop.words import joined
from audit.errors import WrongUse
from rules import limits
from rules.one_run import answer, sufficient
from rules.record import Site
from rules.text import forbidden_character

Captured = pytest.CaptureFixture[str]
GENERAL = limits.of(Site(name=""))
PLAIN = ("29m", "4mm2", "8A", "24V")


def told(capsys: Captured, *args: str) -> Any:
    assert cli.run(["drop", *args, "--json"]) == 0
    return json.loads(capsys.readouterr().out)


def said(capsys: Captured, *args: str) -> str:
    """Standard output with its lines joined, so that wrapping does not matter."""
    assert cli.run(["drop", *args]) == 0
    shown = capsys.readouterr()
    assert shown.err == ""
    assert all(len(line) <= 80 and line == line.rstrip() for line in shown.out.splitlines())
    return " ".join(shown.out.split())


def refused(capsys: Captured, *args: str) -> list[str]:
    assert cli.run(["drop", *args]) == 2
    shown = capsys.readouterr()
    assert shown.out == ""
    assert "Traceback" not in shown.err
    return shown.err.splitlines()


def read(*words: str, **options: Any) -> Understood:
    return understand(words, Options(**options), GENERAL)


def complaints(words: list[str]) -> tuple[str, ...]:
    """What is wrong with the words, a line each; none where they are understood."""
    try:
        understand(words, Options(), GENERAL)
    except WrongUse as error:
        return error.lines
    return ()


# Reading


@pytest.mark.parametrize(
    "words",
    [
        ("29m", "4mm2", "8A", "24V"),
        ("24V", "8A", "4mm2", "29m"),
        ("29", "m", "4", "mm2", "8", "A", "24", "V"),
        ("29 m", "4 mm²", "8 amps", "24 volts"),
        ("2900cm", "4 sq mm", "8000mA", "0.024kV"),
        ("29,0m", "4,0mm2", "8,0A", "24,0V"),
    ],
)
def test_quantities_are_known_by_their_units_in_any_order(words: tuple[str, ...]) -> None:
    asked = read(*words).asked
    assert asked.run.one_way_length_m == 29.0
    assert (asked.run.size, asked.nominal_v, asked.draws.current_a) == ("4 mm2", 24.0, 8.0)


@pytest.mark.parametrize(
    ("words", "size"),
    [
        (("12AWG",), "12 AWG"),
        (("12", "AWG"), "12 AWG"),
        (("AWG", "12"), "12 AWG"),
        (("#12", "AWG"), "12 AWG"),
        (("4/0",), "4/0 AWG"),
        (("4/0", "AWG"), "4/0 AWG"),
        (("250", "kcmil"), "250 kcmil"),
        (("250MCM",), "250 kcmil"),
        (("2.5", "sq", "mm"), "2.5 mm2"),
        (("2.5mm^2",), "2.5 mm2"),
    ],
)
def test_sizes_of_three_standards(words: tuple[str, ...], size: str) -> None:
    assert read("29m", *words, "8A", "24V").asked.run.size == size


@pytest.mark.parametrize(
    ("words", "metres"),
    [
        (("45ft",), 13.716),
        (("45", "ft"), 13.716),
        (("45 ft 6 in",), 13.8684),
        (("45", "ft", "6", "in"), 13.8684),
        (("45ft", "6in"), 13.8684),
        (("45'", '6"'), 13.8684),
        (("45' 6\"",), 13.8684),
        (("0m",), 0.0),
    ],
)
def test_lengths_in_metres_and_in_feet(words: tuple[str, ...], metres: float) -> None:
    assert read(*words, "4mm2", "8A", "24V").asked.run.one_way_length_m == pytest.approx(metres)


def test_the_load_may_be_a_current_a_power_or_a_resistance() -> None:
    assert read("29m", "4mm2", "24V", "8A").asked.draws.current_a == 8.0
    assert read("29m", "4mm2", "24V", "0.2kW").asked.draws.power_w == 200.0
    assert read("29m", "4mm2", "24V", "3ohm").asked.draws.conductance_s == pytest.approx(1 / 3)


def test_what_is_not_typed_comes_from_the_profile() -> None:
    asked = read(*PLAIN).asked
    assert (asked.allowed_percent, asked.ambient_c) == (GENERAL["drop.allowed_percent"], GENERAL["ambient.assumed_c"])
    assert (asked.lowest_v, asked.run.conductor_temperature_c) == (None, None)


def test_what_is_typed_or_chosen_counts() -> None:
    asked = read(*PLAIN, "5%", "70C", ambient="95F", lowest="20.4V", return_size="10awg", parallel=2).asked
    assert (asked.allowed_percent, asked.run.conductor_temperature_c, asked.lowest_v) == (5.0, 70.0, 20.4)
    assert asked.ambient_c == pytest.approx(35.0)
    assert (asked.run.return_size, asked.run.parallel) == ("10 AWG", 2)
    by_option = read(*PLAIN, allowed="5", temperature="-12.5C").asked
    assert (by_option.allowed_percent, by_option.run.conductor_temperature_c) == (5.0, -12.5)


@pytest.mark.parametrize(
    ("args", "line"),
    [
        (["29", "4mm2", "8A", "24V"], "'29' has no unit, so that it may be anything"),
        (["29m", "4mm", "8A", "24V"], "'4mm' can be read two ways: write 4mm2 for a size, or a length in m or ft"),
        (["1,000m", "4mm2", "8A", "24V"], "'1,000m' can be read two ways: write 1000 or 1.000"),
        (["29m", "4mm2", "15MOHM", "24V"], "'15MOHM' can be read two ways: write mohm (milli) or Mohm (mega)"),
        (["29m", "3mm2", "8A", "24V"], "IEC 60228 has no size '3 mm2'; next to it are 2.5 mm2 and 4 mm2"),
        (["29m", "31AWG", "8A", "24V"], "AWG has no size '31 AWG'; next to it is 30 AWG"),
        (["29m", "4cm2", "8A", "24V"], "'4cm2' is no quantity that is asked for"),
        (["29m", "4mm2", "8X", "24V"], "'8X' is no quantity that is asked for"),
        (["29m", "4mm2", "8A", "24V", "3s"], "'3s' is no quantity that is asked for"),
        (["29m", "4mm2", "8A", "24V", "copper"], "'copper' is no quantity; write --material copper"),
        (["29m", "4mm2", "8A", "24V", "pump"], "'pump' is no quantity that is asked for"),
        (["29m", "4mm2", "8A", "24V", "9A"], "two values for the current: '8A' and '9A'"),
        (["29m", "4mm2", "8A", "24V", "8A"], "two values for the current: '8A' and '8A'"),
        (["29m", "4mm2", "6mm2", "8A", "24V"], "two values for the size: '4mm2' and '6mm2'"),
        (["29m", "4mm2", "8A", "60W", "24V"], "the load has a current and a power; accepted is the one that stays"),
        (["29m", "4mm2", "24V"], "the load is missing; accepted is its current, power or resistance: 8A, 60W or 3ohm"),
        (["4mm2", "8A", "24V"], "the length is missing; accepted is something like 29m"),
        (["29m", "8A", "24V"], "the size is missing; accepted is something like 4mm2 or 12AWG"),
        (["29m", "4mm2", "8A"], "the nominal voltage is missing; accepted is something like 24V"),
        (["29m", "4mm2", "0A", "24V"], "the current must be above 0 A, got '0A'"),
        (["29m", "4mm2", "8A", "0V"], "the nominal voltage must be above 0 V, got '0V'"),
        (["29m", "4mm2", "8A", "24V", "101%"], "the allowed drop must be 100 or less %, got '101%'"),
        (["1e12m", "4mm2", "8A", "24V"], "the length must be 100000 or less m, got '1e12m'"),
        (["1e-300m", "4mm2", "8A", "24V"], "the length must be 1e-12 or more m, got '1e-300m'"),
        (["29m", "4mm2", "1e-300A", "24V"], "the current must be 1e-12 or more A, got '1e-300A'"),
        (["29m", "4mm2", "8A", "1e12V"], "the nominal voltage must be 10000 or less V, got '1e12V'"),
        (["29m", "4mm2", "1e308W", "24V"], "the power must be 10000000 or less W, got '1e308W'"),
        (["29m", "4mm2", "1e-30ohm", "24V"], "the load resistance must be 1e-09 or more ohm, got '1e-30ohm'"),
        (["29m", "4mm2", "8A", "24V", "--lowest", "1e300V"], "--lowest: the lowest voltage must be 10000 or less V"),
        (["29m", "4mm2", "8A", "24V", "--temperature=-200C"], "--temperature: the conductor temperature must be -90 or more"),
        (["29m", "4mm2", "8A", "24V", "70C", "--temperature", "60C"], "two values for the conductor temperature: '70C' and '60C'"),
        (["29m", "4mm2", "8A", "24V", "--ambient", "warm"], "--ambient: 'warm' is not a number with a unit such as '25 °C'"),
        (["29m", "4mm2", "8A", "24V", "--lowest", "20A"], "--lowest: '20A' is a current, not a voltage"),
        (["29m", "4mm2", "8A", "24V", "--return-size", "10"], "--return-size: '10' may be AWG, kcmil or mm2"),
        (["29m", "4mm2", "8A", "24V", "--material", "silver"], "'silver' is not one of"),
        (["29m", "4mm2", "8A", "24V", "--parallel", "0"], "0 is not in the range"),
        (["29m\x1b[2J", "4mm2", "8A", "24V"], "is no quantity that is asked for"),
        ([], "Missing argument"),
        (["-8A"], "No such option"),
    ],
)  # fmt: skip
def test_what_is_wrong_is_one_line(capsys: Captured, args: list[str], line: str) -> None:
    lines = refused(capsys, *args)
    assert line in lines[0]
    assert "\x1b" not in "".join(lines)
    if "is missing" not in lines[-1]:
        assert len(lines) == 1


def test_all_that_is_wrong_is_told_in_one_go(capsys: Captured) -> None:
    assert len(refused(capsys, "12.5", "4mm", "8X", "--ambient", "hot", "--return-size", "3mm2")) == 9


@given(
    st.lists(st.text(max_size=8) | st.sampled_from(["29", "m", "4mm2", "8A", "24V", "AWG", "12", "'", '"']), max_size=6)
)
def test_any_words_are_understood_or_refused(words: list[str]) -> None:
    assert "".join("".join(joined(words)).split()) == "".join("".join(words).split())
    assert [line for line in complaints(words) if forbidden_character(line) is not None] == []


# Text


def test_the_text_says_what_follows_how_it_was_read_and_what_would_do(capsys: Captured) -> None:
    text = said(capsys, *PLAIN)
    for part in (
        "drop 2.2 ± 0.2 V, 9.3 ± 1.0 %: 9.27 % is above the allowed 3 %",
        "“29m” is 29 m one way along the cable, 58 m out and back; by drawing (assumed), ± 10 %",
        "“4mm2” is 4 mm², stranded (assumed) copper (assumed): 4.61 mΩ/m at 20 °C, IEC 60228, its largest",
        "“8A” is 8 A, a constant current",
        "24 V between the legs at the start of the run",
        "3 % of nominal, 0.72 V, of the limits profile general",
        "29 ± 8 °C, in service at this current",
        "four healthy terminations of together 1.206 mΩ",
        "capacity 26.5 A as installed 25 A (PVC, method A2) × 1.06 for 25 °C",
        "assumed: installation method A2, PVC insulation, no other loaded circuit beside it",
        "Smallest sufficient 16 mm²: drop",
        "local code and a licensed person decide",
        "± is the standard uncertainty u.",
    ):
        assert part in text
    assert "can kill" not in text


def test_options_show_in_the_reading_back(capsys: Captured) -> None:
    text = said(
        capsys, "95ft", "12AWG", "60W", "48V", "5%", "--lowest", "40.5V", "--material", "tinned copper",
        "--stranding", "flexible", "--return-size", "10AWG", "--parallel", "2", "--length-by", "tape",
        "--ambient", "40C", "--insulation", "XLPE", "--grouped", "2",
    )  # fmt: skip
    for part in (
        "within the allowed 5 %; enough for the load",
        "“95ft” is 28.96 m one way along the cable, 57.91 m out and back; by tape, ± 1 %",
        "12 AWG, flexible tinned copper",
        "way back 10 AWG, flexible tinned copper",
        "2 conductors side by side in each leg",
        "“60W” is 60 W, a constant power",
        "allowed 5 % of nominal, 2.4 V",
        "40.5 V that the load needs",
        "ambient 40 °C conductor",
        "to the load's lowest",
        "0.91 for 40 °C × 0.8 for grouping × 2 in parallel",
        "the small-conductor rule allows a device of 20 A at most",
    ):
        assert part in text


def test_terminals_show_where_they_decide(capsys: Captured) -> None:
    text = said(capsys, "10m", "4AWG", "30A", "48V", "--insulation", "XLPE")
    assert "capacity 70 A as installed 95 A (90 °C) × 1.04 for 25 °C; terminals of 60 °C allow 70 A" in text


@pytest.mark.parametrize(
    ("words", "verdict"),
    [
        (("100m", "1.5mm2", "200W", "24V"), "cannot be supplied: the run passes at most 58.31 W of power"),
        (("100m", "1.5mm2", "20A", "24V"), "cannot be supplied: the run passes at most 9.718 A of current, into a dead short"),
        (("12.5m", "16mm2", "90A", "48V"), "the current is above what the conductors may carry"),
        (("29m", "4mm2", "515W", "24V", "20C"), "within its doubt the load may not be supplied at all"),
        (("8m", "22AWG", ".3A", "12V"), "2.6 % is too near the allowed 3 % for its doubt, not settled"),
        (("29m", "4mm2", "8A", "24V", "--lowest", "22.5V"), "too little for the load"),
        (("29m", "4mm2", "8A", "24V", "--lowest", "21.8V"), "too near the load's lowest for its doubt"),
        (("8m", "22AWG", ".3A", "12V"), "capacity not known: NFPA 70 Table 310.16 has no 60 °C ampacity"),
        (("8m", "22AWG", ".3A", "12V"), "Smallest sufficient 20 AWG: drop 0.20 ± 0.02 V, 1.63 ± 0.17 %, capacity not known"),
        (("100km", "4mm2", "8A", "24V"), "no size of the trade, nor up to 20 conductors in parallel of 4 mm², suffices"),
        (("30m", "240mm2", "900A", "48V", "--method", "E"), "in parallel of 240 mm²: drop"),
        (("5m", "4mm2", "8A", "110V"), "more than 60 V d.c. between conductors, which can kill"),
        (("5m", "4mm2", "8A", "110V"), "At 100 V d.c. and more an arc can hold"),
    ],
)  # fmt: skip
def test_what_matters_most_is_said(capsys: Captured, words: tuple[str, ...], verdict: str) -> None:
    assert verdict in said(capsys, *words)


def test_the_text_can_be_printed_in_ascii() -> None:
    pipe = io.TextIOWrapper(io.BytesIO(), encoding="ascii")
    understood = read(*PLAIN)
    print_drop(understood, answer(understood.asked, GENERAL), sufficient(understood.asked, GENERAL), GENERAL, pipe)
    pipe.seek(0)
    assert "drop 2.2 +/- 0.2 V" in pipe.read()


# JSON


def test_the_object_holds_quantities_in_si_units(capsys: Captured) -> None:
    document = told(capsys, *PLAIN, "--lowest", "20.4V")
    assert document["schema"] == "ohmwalk.drop/1"
    assert document["read"]["load"] == {"value": 8.0, "unit": "A"}
    assert document["read"]["allowed"] == {"value": 0.03, "unit": "1"}
    assert document["drop"]["value"] == pytest.approx(2.225, abs=1e-3)
    assert document["drop"]["u"] == pytest.approx(0.2358, abs=1e-4)
    assert document["share"]["value"] == pytest.approx(document["drop"]["value"] / 24)
    assert (document["verdict"], document["lowest_verdict"]) == ("does not conform", "conforms")
    assert document["sufficient"]["size"] == "16 mm2"
    assert document["capacity"]["ampacity"] == {"value": 26.5, "unit": "A"}
    assert document["capacity"]["table"] == "iec_pvc_copper"
    assert document["above_capacity"] is False
    assert document["cautions"]


def units_of(part: Any) -> set[str]:
    if isinstance(part, dict):
        own = {part["unit"]} if "unit" in part else set()
        return own.union(*(units_of(value) for value in part.values()))
    return set().union(*(units_of(value) for value in part)) if isinstance(part, list) else set()


@pytest.mark.parametrize(
    "words",
    [PLAIN, ("100m", "1.5mm2", "200W", "24V"), ("8m", "22AWG", "40ohm", "12V"), ("100km", "14AWG", "8A", "24V", "70C")],
)
def test_units_are_those_of_the_format_and_what_is_not_known_is_left_out(
    capsys: Captured, words: tuple[str, ...]
) -> None:
    document = told(capsys, *words)
    assert units_of(document) <= {"V", "A", "ohm", "m", "W", "degC", "1"}
    assert None not in document.values()
    assert ("drop" in document) == document["supplied"]
    assert ("capacity" in document) != ("capacity_not_known" in document)


def test_nothing_sufficient_leaves_the_key_out(capsys: Captured) -> None:
    assert "sufficient" not in told(capsys, "100km", "4mm2", "8A", "24V")


def test_help_shows_a_line_that_works(capsys: Captured) -> None:
    assert cli.run(["drop", "--help"]) == 0
    examples = re.findall(r"ohmwalk (drop [0-9].*)", capsys.readouterr().out)
    assert len(examples) >= 3
    for example in examples:
        assert cli.run(example.split()) == 0


def test_the_energy_lost_a_year_at_a_stated_duty(capsys: pytest.CaptureFixture[str]) -> None:
    """17.8 W for a tenth of 8,760 h: 15.6 kWh."""
    assert cli.run(["drop", "29m", "4mm2", "8A", "24V", "--duty", "10%", "--json"]) == 0
    told = json.loads(capsys.readouterr().out)
    text = json.dumps(told)
    heat = next(value for value in _values(told, "heat"))["value"]
    energy = next(value for value in _values(told, "energy_a_year"))
    assert energy["unit"] == "J"
    assert energy["value"] == pytest.approx(heat * 0.1 * 8760 * 3600)
    assert "energy_a_year" in text
    assert cli.run(["drop", "29m", "4mm2", "8A", "24V", "--duty", "10%"]) == 0
    assert "15.59 kWh lost a year, with the load on for 10 % of it" in " ".join(capsys.readouterr().out.split())
    assert cli.run(["drop", "29m", "4mm2", "8A", "24V", "--duty", "110%"]) == 2
    assert "--duty" in capsys.readouterr().err


def _values(document: Any, name: str) -> Iterator[Any]:
    """Every value of a name, at any depth."""
    if isinstance(document, dict):
        for key, value in document.items():
            if key == name:
                yield value
            yield from _values(value, name)
    elif isinstance(document, list):
        for each in document:
            yield from _values(each, name)
