"""What the screens draw, without a screen: lines of pieces."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from functools import partial
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from audit.intake.folder import read_folder
from audit.report.blocks import Path as CircuitPath
from audit.report.blocks import Stop as PathStop
from audit.report.phrases import status_words
from audit.tui.drawing.board import board_lines
from audit.tui.drawing.causes import cause_lines
from audit.tui.drawing.doubts import doubt_lines
from audit.tui.drawing.margins import margin_lines
from audit.tui.drawing.next_act import next_act
from audit.tui.drawing.page import page_lines, view_of
from audit.tui.drawing.pieces import Line, Piece, apart, cut, fit, line, text_of, width_of, wrapped
from audit.tui.drawing.profile import profile_lines, profile_of
from audit.tui.drawing.rows import circuit_items, item_line, row_title, row_words, site_items
from audit.tui.drawing.sketch import Bad, sketch_lines
from audit.tui.drawing.walk import head_line, reason_line, stop_line, tag_cells, walk_stops
from audit.tui.entry.fields import row_of
from audit.tui.state import Survey, latest_visit, read_by_visit
from rules.assess import assess, prepare
from rules.assessment import Doubt, Drop, JointHeat, LoadMargin, NextReading, Place, Status
from rules.index import Index
from rules.joints import heat_at, heat_of_lost
from rules.limits import of
from rules.record import Circuit, Figure, Load, Run, Site, Source
from sample_sites.catalogue import SAMPLE_SITES
from tests.audit.tui.walker import HUT


def survey_of(site: Site) -> Survey:
    """A site as the screens see it once all of it is judged."""
    limits = of(site)
    assessment = assess(site, limits)
    results = {result.circuit_id: result for result in assessment.circuits}
    index, visit = Index(site), latest_visit(site)
    return Survey(
        site, index, visit, read_by_visit(site), context=prepare(site, limits), results=results, assessment=assessment
    )


@pytest.fixture(scope="module", params=[sample.name for sample in SAMPLE_SITES])
def sample(request: pytest.FixtureRequest, tmp_path_factory: pytest.TempPathFactory) -> Survey:
    """Each sample site."""
    folder = tmp_path_factory.mktemp("sample")
    chosen = next(one for one in SAMPLE_SITES if one.name == request.param)
    for name, content in chosen.files().items():
        (folder / name).write_bytes(content)
    return survey_of(read_folder(folder))


def texts(lines: Iterable[Line]) -> list[str]:
    return [text_of(one).rstrip() for one in lines]


# --- pieces


@given(st.text(max_size=40), st.integers(0, 30))
def test_fit_takes_exactly_the_cells(text: str, width: int) -> None:
    assert cell_len(fit(text, width)) == width
    assert cell_len(fit(text, width, "right")) == width


@given(st.lists(st.text(max_size=12), max_size=5), st.integers(1, 30))
def test_cut_is_never_wider(words: list[str], width: int) -> None:
    assert width_of(cut(line(*words), width)) <= width


@given(st.text(max_size=120), st.integers(12, 40))
def test_wrapped_text_stays_within_its_width_and_loses_no_word(text: str, width: int) -> None:
    lines = wrapped(text, width, 2)
    assert all(width_of(one) <= width for one in lines)
    letters = "".join(text_of(one) for one in lines).replace(" ", "")
    assert all(word in letters for word in ("".join(text.split()),) if text.isascii() and text.isprintable())


def test_two_ends_of_one_line() -> None:
    assert text_of(apart(line("left"), line("right"), 14)) == "left     right"
    assert text_of(apart(line("a long left end"), line("right"), 14)) == "a long … right"


# --- the walk


def test_the_walk_has_every_circuit_once_under_its_board(sample: Survey) -> None:
    stops = walk_stops(sample.index)
    circuits = [stop.id for stop in stops if stop.kind == "circuit"]
    assert circuits == [circuit.id for circuit in sample.index.walked_circuits]
    assert len({stop.id for stop in stops if stop.kind == "board"}) >= len(sample.site.boards)


def test_every_line_of_the_walk_fits(sample: Survey) -> None:
    tags = tag_cells(sample.index)
    for width in (120, 79, 60, 50):
        for stop in walk_stops(sample.index):
            for chosen in (False, True):
                assert width_of(stop_line(stop, sample, width, tags, chosen=chosen)) <= width
            assert width_of(reason_line(stop, sample, width)) <= width
        assert width_of(head_line(sample, width, read_only=True)) <= width


@pytest.mark.parametrize("width", [70, 54, 46, 40, 34, 26, 22])
def test_the_word_of_a_status_stays_where_there_is_little_room(sample: Survey, width: int) -> None:
    """The bar gives way first, then the tag."""
    index = sample.index
    for stop in walk_stops(index):
        if stop.kind == "circuit":
            text = text_of(stop_line(stop, sample, width, tag_cells(index), chosen=True))
            status = status_words(sample.results[stop.id].status)
            assert text.rstrip().endswith(status), text
            assert index.circuits[stop.id].tag[0] in text
            waiting = text_of(stop_line(stop, replace(sample, results={}), width, tag_cells(index), chosen=False))
            assert waiting.rstrip().endswith("…")
            assert len(waiting) == len(text) == width


def test_what_nothing_feeds_stands_at_the_end() -> None:
    stray = Circuit(id="x", tag="X")
    lonely = replace(HUT, circuits=(*HUT.circuits, stray), sources=(*HUT.sources, Source(id="t", tag="SPARE")))
    stops = walk_stops(Index(lonely))
    assert [(stop.kind, stop.words or stop.id) for stop in stops] == [
        ("board", "SPARE"),
        ("gap", ""),
        ("place", "Kitchen"),
        ("board", "DB1, from BATT"),
        ("circuit", "c1"),
        ("circuit", "c2"),
        ("gap", ""),
        ("place", "fed from nothing in the record"),
        ("circuit", "x"),
    ]


def test_a_circuit_that_is_not_judged_yet_says_so() -> None:
    survey = replace(survey_of(HUT), results={}, assessment=None)
    stop = next(stop for stop in walk_stops(survey.index) if stop.id == "c1")
    assert text_of(stop_line(stop, survey, 80, 6, chosen=True)).split() == ["╎", "▸", "DB1-01", "Pump", "…"]
    assert reason_line(stop, survey, 80) == ()
    assert "judging …" in text_of(head_line(survey, 80, read_only=False))


# --- the sketch


def two_runs() -> CircuitPath:
    stops = tuple(PathStop(point) for point in ("bus", "way", "p1", "p2"))
    return CircuitPath(stops, ("breaker C 16 A", "38 m · 16 mm²", "21 m · 10 mm²"), True)


def test_the_sketch_has_what_was_read_above_what_was_computed() -> None:
    read = {"way": "54.05 V", "p1": "52.96 V", "p2": "50.15 V"}
    computed = {"way": "54.05 V", "p1": "52.97 ± 0.03 V", "p2": "52.02 ± 0.05 V"}
    above, conductor, names, below, bad = texts(sketch_lines([two_runs()], read, computed, 100, {"p2": Bad("0.93")}))
    assert above.split() == ["read", "54.05", "V", "52.96", "V", "50.15", "V"]
    assert below.startswith(" computed")
    assert "┤breaker C 16 A├" in conductor
    assert conductor.endswith("━╳━●")
    assert bad.strip() == "0.93"
    for name in ("bus", "way", "p1", "p2"):
        middle = names.index(name) + len(name) // 2
        assert conductor[middle - 1 : middle + 2].count("●") == 1
    start = texts(sketch_lines([two_runs()], {}, {}, 100, {"p1": Bad("0.6", at_start=True)}))
    assert "●━╳━" in start[0]
    for value in ("52.96 V", "50.15 V"):
        assert abs(above.index(value) + 3 - names.index({"52.96 V": "p1", "50.15 V": "p2"}[value])) <= 2


def test_a_path_too_long_goes_on_in_a_further_row() -> None:
    lines = sketch_lines([two_runs()], {}, {}, 60)
    assert max(map(width_of, lines)) <= 60
    assert sum("●" in text for text in texts(lines)) == 2
    assert any("┄┄●" in text for text in texts(lines))


def test_a_branch_begins_with_a_fork() -> None:
    branch = CircuitPath((PathStop("p1"), PathStop("p3")), ("5 m · 2.5 mm²",))
    lines = texts(sketch_lines([two_runs(), branch], {"p1": "12 V"}, {}, 100))
    assert any(text.strip().startswith("├━") for text in lines)
    assert sum("12 V" in text for text in lines) == 1


@given(
    st.lists(st.text(min_size=1, max_size=30), min_size=1, max_size=6, unique=True),
    st.integers(60, 140),
    st.text(max_size=20),
)
def test_any_sketch_is_drawn(points: list[str], width: int, words: str) -> None:
    path = CircuitPath(tuple(map(PathStop, ["way", *points])), (words,) * len(points))
    assert sketch_lines([path], {points[0]: "1 V"}, {points[-1]: "2 V"}, width)


# --- the profile


def test_the_profile_has_a_mark_for_each_reading_and_a_band_for_the_doubt() -> None:
    site = replace(HUT, loads=(*HUT.loads, Load(id="l3", circuit_id="c2", point="p1", tag="x", lowest_voltage_v=11.0)))
    computed = {"way": Figure(12.6, "V"), "p1": Figure(12.0, "V", 0.2), "p2": Figure(11.6, "V", 0.3)}
    profile = profile_of(Index(site), "c2", computed, {"way": (12.6,), "p1": (11.2, 11.4)})
    lines = texts(profile_lines(profile, 70, 12))
    assert len(lines) == 12
    assert sum(text.count("◆") for text in lines[:-1]) == 3
    assert any("░" in text for text in lines[:-1])
    assert any("╌╌" in text for text in lines[:-1])
    assert "p1 6 m" in lines[-2]
    assert "p2 12 m" in lines[-2]
    assert "the load's lowest, 11 V" in lines[-1]


def test_a_limit_far_away_is_said_and_does_not_flatten_the_profile() -> None:
    site = replace(HUT, loads=(replace(HUT.loads[0], lowest_voltage_v=5.0),))
    computed = {"way": Figure(12.6, "V"), "p1": Figure(12.3, "V", 0.01)}
    lines = texts(profile_lines(profile_of(Index(site), "c1", computed, {}), 70, 9))
    assert "the load's lowest is 5 V" in lines[-1]
    assert not any("╌" in text for text in lines)


def test_one_point_makes_no_profile() -> None:
    assert profile_lines(profile_of(Index(HUT), "c1", {"way": Figure(12.6, "V")}, {}), 70, 9) == []


def test_a_run_of_unknown_length_is_left_out_of_the_profile() -> None:
    site = replace(HUT, runs=(HUT.runs[0], HUT.runs[1], replace(HUT.runs[2], one_way_length_m=None)))
    computed = {"way": Figure(12.6, "V"), "p1": Figure(12.3, "V"), "p2": Figure(12.0, "V")}
    lines = texts(profile_lines(profile_of(Index(site), "c2", computed, {}), 70, 9))
    assert "p2" not in lines[-2]


# --- pages


def test_every_page_is_drawn_at_any_width(sample: Survey) -> None:
    for circuit in sample.site.circuits:
        view = view_of(sample, circuit.id)
        assert view is not None
        for width in (132, 80, 64):
            lines = page_lines(sample, view, width, 24)
            assert max(map(width_of, lines)) <= width, circuit.tag
    for row in (*sample.site.boards, *sample.site.sources):
        assert max(map(width_of, board_lines(sample, row.id, 80))) <= 80


def test_a_page_of_what_is_not_there_is_empty() -> None:
    survey = survey_of(HUT)
    assert view_of(survey, "gone") is None
    assert board_lines(survey, "gone", 80) == []


def test_a_page_before_it_is_judged_shows_the_record_as_it_is() -> None:
    survey = replace(survey_of(HUT), results={}, context=None, assessment=None)
    view = view_of(survey, "c1")
    assert view is not None
    lines = texts(page_lines(survey, view, 80, 24))
    assert any("10 m · 4 mm²" in text for text in lines)
    assert any("judging …" in text for text in lines)


def test_causes_are_bars_with_their_place_and_resistance() -> None:
    survey = survey_of(HUT)
    causes = (
        Place("bad connection", "run 1", 0.93, 0.151, 0.155, 0.159),
        Place("as recorded", "", 0.062),
        Place("other metal", "", 0.008),
    )
    result = replace(survey.results["c1"], causes=causes)
    blank, first, second = texts(cause_lines(result, 80))
    assert blank == ""
    assert first.startswith("   bad connection, run 1 ")
    assert first.endswith(" 0.93        155 mΩ (151 mΩ to 159 mΩ)")
    assert first.count("█") == 11
    assert second.endswith(" 0.06")
    survey = replace(survey, results={**survey.results, "c1": result})
    view = view_of(survey, "c1")
    assert view is not None
    assert any("━╳━●" in text for text in texts(page_lines(survey, view, 80, 24)))
    stop = next(stop for stop in walk_stops(survey.index) if stop.id == "c1")
    assert text_of(reason_line(stop, survey, 80)).strip().startswith("bad connection in run 1 (0.93) · ")


def test_facts_stand_under_their_cause_once() -> None:
    """What speaks for two causes alike is not said twice, nor anything of a cause of little weight."""
    survey = survey_of(HUT)
    shared = "run 1 loses 1.22 V at 12 A against 0.41 V computed, 0.81 ± 0.02 V more"
    causes = (
        Place("smaller conductor", "", 0.6, speaks_for=(shared,), speaks_against=("no reading tells it",)),
        Place("other metal", "", 0.36, speaks_for=(shared, "a second fact")),
        Place("longer route", "", 0.04, speaks_for=("a third fact",)),
    )
    lines = texts(cause_lines(replace(survey.results["c1"], causes=causes), 80))
    said = " ".join(" ".join(lines).split())
    assert said.count(shared) == 1
    assert said.count("a second fact") == 1
    assert "a third fact" not in said
    assert [line.split()[0] for line in lines if line.startswith("     ") and line[5] != " "] == [
        "for",
        "against",
        "for",
    ]
    assert max(len(line) for line in lines) <= 80


def test_a_bad_connection_says_its_resistance_and_its_heat_now_and_at_design() -> None:
    survey = survey_of(HUT)
    place = Place("bad connection", "run 1", 0.93, 0.151, 0.155, 0.159)
    heat = JointHeat("run 1", Figure(6.0, "A"), Figure(5.58, "W", 0.08), Figure(12.0, "A"), Figure(22.3, "W", 0.3))
    result = replace(survey.results["c1"], causes=(place,), joints=(heat,))
    _, bar, *extra = texts(cause_lines(result, 80))
    assert "mΩ" not in bar
    assert " ".join(" ".join(extra).split()) == (
        "extra 155 mΩ (151 mΩ to 159 mΩ): 5.58 ± 0.08 W in it at 6 A as read, 22.3 ± 0.3 W at design 12 A"
    )


def test_a_semiconductor_makes_heat_by_the_current_and_has_no_resistance() -> None:
    """0.31 V × 17.1 A = 5.3 W and 0.31 V × 22.3 A = 6.9 W; a resistance would make 5.3 W × (22.3 / 17.1)² = 9.0 W."""
    survey = survey_of(HUT)
    diode = Place("series semiconductor", "device", 0.37)
    joint = Place("bad connection", "device", 0.63, 0.0142, 0.0182, 0.0223)
    read_a, design_a = 17.1, 22.3
    heats = tuple(
        JointHeat("device", Figure(read_a, "A"), heat(read_a), Figure(design_a, "A"), heat(design_a), cause)
        for cause, heat in (
            (joint.cause, partial(heat_at, joint)),
            (diode.cause, partial(heat_of_lost, Figure(0.31, "V", 0.035))),
        )
    )
    result = replace(survey.results["c1"], causes=(joint, diode), joints=heats)
    assert [" ".join(text.split()) for text in texts(cause_lines(result, 120))[2::2]] == [
        "extra 18.2 mΩ (14.2 mΩ to 22.3 mΩ): 5.3 ± 0.6 W in it at 17.1 A as read, 9.1 ± 1.0 W at design 22.3 A",
        "heat 5.3 ± 0.6 W in it at 17.1 A as read, 6.9 ± 0.8 W at design 22.3 A",
    ]


def test_a_load_gets_with_and_without_the_fault_what_the_lowest_source_leaves() -> None:
    survey = survey_of(HUT)
    volts = [Figure(v, "V", u) for v, u in ((38.1, 0.2), (39.7, 0.1))]
    load = LoadMargin("fan", "p1", worst=volts[0], worst_recorded=volts[1], source_lowest=Figure(40.5, "V"))
    faulty = replace(survey.results["c1"], margins=(load,), causes=(Place("bad connection", "run 1", 0.93),))
    said = "fan, source at its lowest 40.5 V: 38.1 ± 0.2 V, 2.4 ± 0.2 V lost; without the fault 39.70 ± 0.10 V"
    assert said in " ".join(" ".join(texts(margin_lines(faulty, 80))).split())
    sound = replace(faulty, causes=(Place("as recorded", "", 0.97),))
    assert texts(margin_lines(sound, 80))[2:] == ["   at worst: the source at its lowest, 40.5 V, hot conductors"]


def test_a_load_with_a_peak_has_its_voltage_and_margin_at_the_peak_in_whole_numbers() -> None:
    """85.0 V − 93.5 V = −8.5 V at the peak, though 98.424 V − 93.5 V = 4.924 V are left without it."""
    coil = LoadMargin(
        "closing coil Q2",
        "kiosk",
        design=Figure(117.41, "V"),
        worst=Figure(98.424, "V", 0.015),
        source_lowest=Figure(99.0, "V"),
        source_working=Figure(118.0, "V"),
        lowest=Figure(93.5, "V"),
        margin=Figure(4.924, "V", 0.015),
        dip=Figure(104.0, "V"),
        peak=Figure(10.0, "A"),
        dip_worst=Figure(85.0, "V", 0.4),
        dip_margin=Figure(-8.5, "V", 0.4),
    )
    result = replace(survey_of(HUT).results["c1"], margins=(coil,), causes=())
    lines = margin_lines(result, 80)
    assert [" ".join(text.split()) for text in texts(lines)] == [
        "at design at worst its lowest margin",
        "closing coil Q2, … 117.4 V 98.424 ± 0.015 V 93.5 V 4.924 ± 0.015 V",
        "at peak, 10 A 104 V 85.0 ± 0.4 V 93.5 V -8.5 ± 0.4 V",
        "at design: the source at 118 V; at worst: the source at its lowest, 99 V,",
        "hot conductors",
    ]
    assert all(len(text) <= 80 for text in texts(lines))
    assert lines[2][-1].role == "act"


def test_the_doubt_budget_is_bars_with_numbers_and_who_states_them() -> None:
    """30 mV and 40 mV make 50 mV: 36 and 64 % of its square."""
    survey = survey_of(HUT)
    figure = Figure(1.0, "V", 0.05)
    budget = (Doubt("length", 0.04, "length_doubt"), Doubt("meter counts", 0.03))
    drop = Drop("1", "way", "p1", figure, figure, figure, Figure(8.0, "A"), "two voltages", budget)
    result = replace(survey.results["c1"], drop=drop)
    head, first, second = texts(doubt_lines(result, 80))
    assert head.strip().startswith("measured less computed 1.00 ± 0.05 V")
    assert first.split() == ["length", "█████▏", "40", "mV", "64", "%", "profile,", "length_doubt"]
    assert second.split() == ["meter", "counts", "██▉", "30", "mV", "36", "%", "record", "of", "instruments"]
    assert doubt_lines(replace(result, drop=None), 80) == []


# --- what is next


def test_the_next_act_begins_at_the_cursor() -> None:
    act = next_act(survey_of(HUT), "c2", ["c1"])
    assert act is not None
    assert act.circuit_id == "c2"
    assert act.words.startswith("DB1-02 (m): a round with its current")


def test_a_circuit_that_is_settled_wants_to_be_read_on_a_new_visit() -> None:
    survey = survey_of(HUT)
    settled = replace(survey.results["c2"], next_reading=None, status=Status.SOUND)
    survey = replace(survey, results={"c2": settled})
    act = next_act(survey, "c2", [])
    assert act is not None
    assert act.words == "DB1-02 (m): current, then the voltage at way, p1, p2"
    assert next_act(replace(survey, read={survey.visit: frozenset({"c2"})}), "c2", []) is None


def test_a_circuit_that_could_not_be_measured_is_not_asked_for_again() -> None:
    site = replace(HUT, circuits=(HUT.circuits[0], replace(HUT.circuits[1], not_tested="locked")))
    survey = survey_of(site)
    survey = replace(survey, results={"c2": survey.results["c2"]})
    assert next_act(survey, "c1", ["c2"]) is None
    assert next_act(survey, "c2", []) is not None


def test_a_reading_that_the_judgement_asks_for_goes_before_all_but_danger() -> None:
    survey = survey_of(HUT)
    wanted = NextReading("reading", "joint", "run 1 end", "", "positive", Figure(4.0, "A"))
    survey = replace(survey, results={"c1": replace(survey.results["c1"], next_reading=wanted)})
    act = next_act(survey, "c1", [])
    assert act is not None
    assert act.words == "DB1-01 (o): millivolts across run 1 end, positive leg, at 4 A or more"


def test_nothing_is_next_where_nothing_is_judged() -> None:
    assert next_act(replace(survey_of(HUT), results={}), "c1", ["c2"]) is None


@pytest.mark.parametrize(
    ("site", "words"),
    [
        (Site(name="x"), "first a source"),
        (Site(name="x", sources=HUT.sources), "a adds a board"),
        (Site(name="x", sources=HUT.sources, boards=HUT.boards), "a adds a circuit"),
    ],
)
def test_an_empty_record_says_what_to_add(site: Site, words: str) -> None:
    act = next_act(survey_of(site), "", [])
    assert act is not None
    assert words in act.words


# --- rows


def test_rows_have_titles_and_words(sample: Survey) -> None:
    index = sample.index
    for circuit in sample.site.circuits[:4]:
        for item in circuit_items(index, circuit.id):
            row = None if item.heading else row_of(sample.site, item.table, item.id)
            assert 0 < width_of(item_line(item, row, index, 80, chosen=True)) <= 80
    for item in site_items(sample.site):
        row = None if item.heading else row_of(sample.site, item.table, item.id)
        assert 0 < width_of(item_line(item, row, index, 80, chosen=False)) <= 80


def test_what_a_row_is_called() -> None:
    index = Index(HUT)
    assert row_title("runs", HUT.runs[2], index) == "run 2 of DB1-02"
    assert row_title("loads", HUT.loads[0], index) == "load pump of DB1-01"
    assert row_title("loads", replace(HUT.loads[0], tag="load 1"), index) == "load 1 of DB1-01"
    assert row_title("instruments", HUT.instruments[0], index) == "meter DMM"
    assert row_title("site", HUT, index) == "the site"
    assert row_words(Source(id="x", tag="x"), index) == "nothing else is known"
    assert row_words(HUT.boards[0], index) == "from BATT · Kitchen"
    bare = Run(id="x", circuit_id="c1", number=9, from_point="way", to_point="z")
    assert row_words(bare, index) == "way to z · length not known · size not known"


def test_a_line_holds_no_control_code(tmp_path: Path) -> None:
    assert line("a\x1b[2J", Piece("b")) == (Piece("a\ufffd[2J"), Piece("b"))
