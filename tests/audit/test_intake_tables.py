"""Cells, headers and references as people write them."""

from __future__ import annotations

import pytest

from audit.errors import IntakeRefused
from audit.intake.folder import site_of
from rules.record import Feed, Run, Site

RUN = {"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "10", "size": "16 mm2"}
CIRCUITS = {
    "sources": [{"source": "BATT", "kind": "battery", "nominal": "48"}],
    "circuits": [{"circuit": "C1", "fed_from": "BATT"}],
}


def run_of(**cells: str) -> Run:
    """One run, some of its cells exchanged."""
    return site_of({**CIRCUITS, "runs": [RUN | cells]}).runs[0]


def lines_of(tables: dict[str, list[dict[str, str]]], check: bool = True) -> tuple[str, ...]:
    with pytest.raises(IntakeRefused) as refused:
        site_of(tables, check=check)
    return refused.value.lines


@pytest.mark.parametrize(
    ("text", "length", "typed"),
    [
        ("10", 10.0, None),
        (" 12.50 ", 12.5, None),
        ("45 ft", 13.716, "45 ft"),
        ("2,5", 2.5, "2,5"),
        ("13.7m", 13.7, "13.7m"),
        ("45 ft 6 in", 13.8684, "45 ft 6 in"),
    ],
)
def test_a_cell_names_its_own_unit(text: str, length: float, typed: str | None) -> None:
    run = run_of(length=text)
    assert run.one_way_length_m == pytest.approx(length, rel=1e-12)
    assert run.as_typed("one_way_length_m") == typed


@pytest.mark.parametrize(
    ("header", "text", "length", "typed"),
    [
        ("length [m]", "45", 45.0, None),
        ("length[ m ]", "45", 45.0, None),
        ("length [metres]", "45", 45.0, None),
        ("length [ft]", "45", 13.716, "45 ft"),
        ("length [ft]", "45.5", 13.8684, "45.5 ft"),
        ("length [ft]", "2,5", 0.762, "2,5 ft"),
        ("length [ft]", "10 m", 10.0, "10 m"),
        ("length [ft]", "45 ft 6 in", 13.8684, "45 ft 6 in"),
    ],
)
def test_a_header_names_the_unit_of_its_cells(header: str, text: str, length: float, typed: str | None) -> None:
    row = {("length" if name == "length" else name): cell for name, cell in RUN.items() if name != "length"}
    run = site_of({**CIRCUITS, "runs": [row | {header: text}]}).runs[0]
    assert run.one_way_length_m == pytest.approx(length, rel=1e-12)
    assert run.as_typed("one_way_length_m") == typed


def test_the_unit_of_a_value_follows_its_quantity() -> None:
    reading = {"circuit": "C1", "round": "1", "at": "way"}
    rows = [
        reading | {"quantity": "voltage", "value": "4.1 mV"},
        reading | {"quantity": "current", "value": "4.1 mA"},
        reading | {"quantity": "temperature", "at": "ambient", "value": "77 °F"},
        reading | {"quantity": "resistance", "at": "device", "value": "12 mohm"},
    ]
    site = site_of({**CIRCUITS, "runs": [RUN], "readings": rows})
    assert [reading.value for reading in site.readings] == pytest.approx([0.0041, 0.0041, 25.0, 0.012], rel=1e-12)
    assert [reading.as_typed("value") for reading in site.readings] == ["4.1 mV", "4.1 mA", "77 °F", "12 mohm"]


def test_a_header_unit_of_a_value_holds_where_its_quantity_allows() -> None:
    rows = [
        {"circuit": "C1", "round": "1", "quantity": "voltage", "at": "way", "value [mV]": "48000"},
        {"circuit": "C1", "round": "1", "quantity": "current", "at": "way", "value [mV]": "2"},
    ]
    assert lines_of({**CIRCUITS, "readings": rows}) == (
        "readings.csv:3:value: '2 mV' is a voltage, not a current; accepted is a number with a unit such as '2.5 A'",
    )
    assert site_of({**CIRCUITS, "readings": rows[:1]}).readings[0].value == 48.0


def test_an_instrument_has_the_units_of_its_quantity() -> None:
    row = {"instrument": "DMM", "quantity": "voltage", "accuracy": "", "counts": "", "resolution": "0.1 mV"}
    meter = site_of({"instruments": [row | {"range": "600 mV", "zero": "-0.2 mV"}]}).instruments[0]
    assert (meter.full_scale, meter.resolution, meter.zero) == pytest.approx((0.6, 1e-4, -2e-4), rel=1e-12)
    assert (meter.accuracy_percent, meter.counts) == (None, None)
    assert meter.typed == (("full_scale", "600 mV"), ("resolution", "0.1 mV"), ("zero", "-0.2 mV"))


@pytest.mark.parametrize(
    ("text", "size"),
    [("12awg", "12 AWG"), ("4/0", "4/0 AWG"), ("250 MCM", "250 kcmil"), ("2,5 mm²", "2.5 mm2"), ("", "")],
)
def test_sizes_are_written_one_way(text: str, size: str) -> None:
    run = run_of(size=text)
    assert (run.size, run.typed) == (size, ())


@pytest.mark.parametrize(("text", "parallel"), [("2", 2), ("2.0", 2), ("", None)])
def test_whole_numbers_are_read_as_such(text: str, parallel: int | None) -> None:
    assert run_of(parallel=text).parallel == parallel
    assert type(run_of(parallel="2").parallel) is int


@pytest.mark.parametrize("text", ["2.5", "two", "1e999", "2 m"])
def test_other_numbers_are_not_whole(text: str) -> None:
    line = f"runs.csv:2:parallel: '{text}' is not a whole number; accepted: a whole number from 1 to 1000"
    assert lines_of({**CIRCUITS, "runs": [RUN | {"parallel": text}]}) == (line,)


def test_empty_cells_are_not_known() -> None:
    run = run_of(length="", size="")
    assert (run.one_way_length_m, run.size, run.parallel, run.material) == (None, "", None, "")


def test_notes_keep_their_lines_and_spaces() -> None:
    assert run_of(notes=" a\r\n\tb\rc ").notes == " a\n\tb\nc "
    assert run_of(method=" E\u00a0").method == "E"


def test_references_are_tags_first_and_split_only_otherwise() -> None:
    site = site_of(
        {
            "sources": [
                {"source": tag, "kind": "battery", "nominal": "48", "fed_from": ""} for tag in ("A", "B", "A + B", "D")
            ],
            "boards": [
                {"board": "M1", "fed_by": "A + B"},
                {"board": "M2", "fed_by": "B + D"},
                {"board": "M3", "fed_by": "C:1"},
                {"board": "M4", "fed_by": "C:1:p1"},
            ],
            "circuits": [{"circuit": "C:1", "fed_from": "M1"}, {"circuit": "C", "fed_from": "A + B"}],
            "runs": [RUN | {"circuit": "C:1"}, RUN | {"circuit": "C:1", "run": "2", "from": "p1", "to": "board:M2"}],
        }
    )
    a_and_b, circuit = site.sources[2].id, site.circuits[0].id
    assert site.boards[0].fed_by == (Feed("sources", a_and_b),)
    assert site.boards[1].fed_by == (Feed("sources", site.sources[1].id), Feed("sources", site.sources[3].id))
    assert site.boards[2].fed_by == (Feed("circuits", circuit),)
    assert site.boards[3].fed_by == (Feed("circuits", circuit, "p1"),)
    assert site.circuits[1].fed_from == Feed("sources", a_and_b)
    assert (site.runs[1].to_point, site.runs[1].to_board_id) == ("", site.boards[1].id)


def test_a_reading_replaces_a_later_row_too() -> None:
    row = {"circuit": "C1", "round": "1", "quantity": "voltage", "at": "way", "value": "48"}
    site = site_of({**CIRCUITS, "readings": [row | {"replaces": "old"}, row | {"reading": "old"}]})
    assert site.readings[0].replaces_id == site.readings[1].id


def test_without_the_check_only_what_cannot_be_read_is_refused() -> None:
    tables = {"circuits": [{"circuit": "C1", "fed_from": "gone"}], "runs": [RUN | {"length": "-1"}]}
    site = site_of(tables, check=False)
    assert site.circuits[0].fed_from == Feed("", "?gone")
    assert site.runs[0].one_way_length_m == -1.0
    tables["runs"][0]["length"] = "ten"
    assert len(lines_of(tables, check=False)) == 1


def test_unknown_tables_and_settings_are_refused() -> None:
    with pytest.raises(IntakeRefused) as refused:
        site_of({"circuit": []}, {"name": "Hut", "limits": "ours.toml"})
    unknown, limits = refused.value.lines
    assert unknown.endswith("did you mean circuits.csv?")
    assert limits == "site.toml:limits: 'ours.toml' is no file beside site.toml; accepted: a file there"


def test_tables_without_rows_make_an_empty_site() -> None:
    assert site_of({"circuits": []}) == Site(name="site")


HUT: dict[str, list[dict[str, str]]] = {
    "sources": [{"source": "BATT", "kind": "battery", "nominal": "48"}],
    "circuits": [{"circuit": "C1", "fed_from": "BATT"}],
    "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "10", "size": "2.5 mm2"}],
    "loads": [{"circuit": "C1", "point": "p1", "load": "lamp"}],
    "instruments": [
        {"instrument": "DMM", "quantity": "voltage", "accuracy": "0.5", "counts": "2", "resolution": "0.01"}
    ],
    "readings": [{"circuit": "C1", "round": "1", "quantity": "voltage", "at": "p1", "value": "47"}],
}


@pytest.mark.parametrize(
    ("table", "column", "text", "accepted"),
    [
        ("runs", "length", "1e308", "a number in m from 0 to 100000"),
        ("sources", "nominal", "1e300", "a number in V from 0.001 to 10000"),
        ("sources", "nominal", "1e12", "a number in V from 0.001 to 10000"),
        ("sources", "rating", "1e-30", "a number in A from 1e-06 to 100000"),
        ("loads", "power", "1e308", "a number in W from 0 to 10000000"),
        ("loads", "resistance", "1e-30", "a number in ohm from 1e-09 to 1e+12"),
        ("instruments", "accuracy", "1e308", "a number in % from 0 to 100"),
        ("instruments", "counts", "1e308", "a number from 0 to 1000000"),
        ("instruments", "resolution", "1e-30", "a number in V from 1e-12 to 10000"),
        ("instruments", "zero", "1e308", "a number in V from -10000 to 10000"),
        ("readings", "value", "-1e308", "a number in V from -10000 to 10000"),
        ("circuits", "order", "1e308", "a number from -1000000000 to 1000000000"),
    ],
)
def test_numbers_far_beyond_what_can_be_are_refused(table: str, column: str, text: str, accepted: str) -> None:
    assert site_of(HUT).circuits
    (line,) = lines_of({**HUT, table: [HUT[table][0] | {column: text}]})
    assert line.startswith(f"{table}.csv:2:{column}: ")
    assert line.endswith(f" is not possible; accepted: {accepted}")


def test_a_number_too_near_to_zero_is_refused() -> None:
    loads = [HUT["loads"][0] | {"current": "1e-300"}]
    assert lines_of({**HUT, "loads": loads}) == (
        "loads.csv:2:current: 1e-300 is too near to 0; accepted: 0, or a number of at least 1e-12 in size",
    )


def test_names_of_any_length_are_cut_in_lines() -> None:
    name = "p" * 1_000_000
    runs = [HUT["runs"][0] | {"to": name}]
    loads = [{"circuit": "C1", "point": f"q{n}", "load": f"lamp {n}"} for n in range(20)]
    lines = lines_of({**HUT, "runs": runs, "loads": loads, "readings": []})
    assert len(lines) > 20
    assert max(map(len, lines)) < 400
