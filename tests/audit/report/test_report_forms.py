"""Every form says the same: the same texts, the same figures, the same counts."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Iterator
from dataclasses import fields, is_dataclass, replace
from html.parser import HTMLParser
from typing import Any

import pytest
from markdown_it import MarkdownIt

from audit.report.bar import Bar
from audit.report.blocks import Blanks, Content, FindingCard, Line, Paragraph, Table
from audit.report.content import AUDIENCES, content_of
from audit.report.csv import BYTE_ORDER_MARK, COLUMNS, csv_report
from audit.report.html import html_report
from audit.report.json import document, json_report
from audit.report.line import text_line
from audit.report.markdown import markdown_report
from audit.report.phrases import (
    CAUSES_NOT_JUDGED,
    NOT_DESIGN_SPARE,
    SAYS_AND_DOES_NOT_SAY,
    figure_words,
    limits_defer,
    number_words,
)
from rules.assessment import Assessment, Finding, Severity
from rules.record import Site

NOT_SHOWN = {"tone", "align", "share", "level", "new_page", "side_by_side", "through_device"}


class Page(HTMLParser):
    """The elements, texts and descriptions of a page."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.elements: list[tuple[str, dict[str, str | None]]] = []
        self.words: list[str] = []
        self.feed(text)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, dict(attrs)))
        self.words += [value or "" for name, value in attrs if name == "aria-label"]

    def handle_data(self, data: str) -> None:
        self.words.append(data)


def squeezed(text: str) -> str:
    return "".join(text.split())


def html_words(content: Content) -> str:
    return squeezed(" ".join(Page(html_report(content)).words))


def markdown_words(content: Content) -> str:
    rendered = MarkdownIt("commonmark").enable("table").render(markdown_report(content))
    return squeezed(" ".join(Page(rendered).words))


def json_words(content: Content) -> str:
    def walk(value: Any) -> Iterator[str]:
        if isinstance(value, dict):
            yield from (text for item in value.values() for text in walk(item))
        elif isinstance(value, list):
            yield from (text for item in value for text in walk(item))
        elif isinstance(value, str):
            yield value

    return squeezed(" ".join(walk(document(content)["report"])))


def texts_of(value: Any, bars: bool = True) -> Iterator[str]:
    """Every text of some blocks from top to bottom, a bar by its words, a line as it is written in text."""
    if isinstance(value, Bar):
        if bars:
            yield value.words
    elif isinstance(value, Line):
        yield from (text_line(path) for path in value.paths)
    elif isinstance(value, str):
        yield value
    elif isinstance(value, tuple):
        for item in value:
            yield from texts_of(item, bars)
    elif is_dataclass(value):
        for field in fields(value):
            if field.name not in NOT_SHOWN:
                yield from texts_of(getattr(value, field.name), bars)


@pytest.mark.parametrize("audience", AUDIENCES)
def test_every_text_of_the_content_stands_in_every_form(site: Site, with_causes: Assessment, audience: str) -> None:
    content = content_of(site, with_causes, audience, "2026-03-05 10:00")
    html, markdown, as_json = html_words(content), markdown_words(content), json_words(content)
    for text in texts_of(content.sections):
        assert squeezed(text) in html, text
        assert squeezed(text) in as_json, text
    for text in texts_of(content.sections, bars=False):  # Markdown draws its bars
        assert squeezed(text) in markdown, text


@pytest.mark.parametrize("audience", AUDIENCES)
def test_all_carry_who_what_when_and_the_statements(site: Site, assessment: Assessment, audience: str) -> None:
    content = content_of(site, assessment, audience, "2026-03-05 10:00")
    needed = [
        assessment.site, site.address, site.extent, site.limitations, site.surveyed_by, site.notes,
        "2026-03 as found, 2026-03-02, by R. Ames", "18 °C", "general", "ohmwalk 0.1.0", "2026-03-05 10:00",
        "2 of 4 (50 %)", "! act", "~ watch", "? measure", "… incomplete", "✓ sound",
        "2 judgements could not be made", "1 circuit, with a reason", "P1-03", *assessment.cautions,
        *SAYS_AND_DOES_NOT_SAY, NOT_DESIGN_SPARE, limits_defer("general"), CAUSES_NOT_JUDGED,
    ]  # fmt: skip
    for words in (html_words(content), markdown_words(content), json_words(content) + squeezed(content.title)):
        assert not [text for text in needed if squeezed(text) not in words]


def test_causes_are_called_not_judged_only_while_they_are_not(site: Site, with_causes: Assessment) -> None:
    words = html_words(content_of(site, with_causes, "inspector"))
    assert squeezed(CAUSES_NOT_JUDGED) not in words
    assert squeezed("bad connection run 2, 155 mΩ (151 mΩ to 159 mΩ)") in words
    assert squeezed("millivolts across run 2 end, positive leg, at 4 A or more: tells the ends apart") in words


def test_no_clock_is_read(site: Site, assessment: Assessment) -> None:
    content = content_of(site, assessment, "inspector")
    assert content.made_at is None
    assert "Made at" not in list(texts_of(content.sections))
    assert "made_at" not in document(content)["report"]


def test_figures_are_the_same_in_every_form(site: Site, assessment: Assessment) -> None:
    content = content_of(site, assessment, "inspector")
    forms = {
        "html": html_words(content),
        "md": markdown_words(content),
        "json": json_words(content),
        "csv": squeezed(csv_report(content)),
    }
    for finding in assessment.findings:
        for number in number_words(finding):
            assert not [name for name, words in forms.items() if squeezed(number) not in words]
    for result in assessment.circuits:
        if result.drop is not None:
            for figure in (result.drop.measured, result.drop.computed, result.drop.excess):
                assert not [
                    n for n, words in forms.items() if n != "csv" and squeezed(figure_words(figure)) not in words
                ]


def test_csv_has_one_row_a_finding_the_most_urgent_first(site: Site, assessment: Assessment) -> None:
    text = csv_report(content_of(site, assessment, "inspector"))
    assert text.startswith(BYTE_ORDER_MARK)
    rows = list(csv.DictReader(io.StringIO(text.removeprefix(BYTE_ORDER_MARK), newline="")))
    assert tuple(rows[0]) == COLUMNS
    assert [row["finding"] for row in rows] == ["VD02/P1-01/run 2", "RD09/board P1/bus"]
    first = rows[0]
    assert first["place"] == "P1-01, run 2"
    assert first["status"] == "! act"
    assert first["numbers"] == "measured drop 2.020 ± 0.004 V; computed 0.95 ± 0.03 V; share 8.4 %"
    assert first["decided"] == "accepted by K. Sand, 2026-03-04 09:00"
    assert rows[1]["circuit"] == ""
    assert rows[1]["status"] == ""


def test_json_form_is_the_check_and_the_report(site: Site, assessment: Assessment) -> None:
    content = content_of(site, assessment, "supervisor")
    assert json.loads(json_report(content)) == document(content)


def cards_of(content: Content) -> list[FindingCard]:
    return [block for section in content.sections for block in section.blocks if isinstance(block, FindingCard)]


def test_the_electrician_finds_what_to_do_under_its_board_and_circuit(site: Site, assessment: Assessment) -> None:
    content = content_of(site, assessment, "electrician")
    titles = [section.title for section in content.sections]
    circuit = content.sections[titles.index("P1-01 · Sluice motor · ! act")]
    assert titles.index("P1, 24 V from PSU-1") < titles.index(circuit.title)
    (card,) = [block for block in circuit.blocks if isinstance(block, FindingCard)]
    assert [label for label, _ in card.rows] == ["Place", "Why", "If left", "Do", "Caution", "Decided"]
    assert len(cards_of(content)) == len(assessment.findings)


def test_the_inspector_sees_replaced_readings_and_the_electrician_does_not(site: Site, assessment: Assessment) -> None:
    replaced = "tag T0; REPLACED by T1, not judged: misread"
    assert replaced in list(texts_of(content_of(site, assessment, "inspector").sections))
    assert replaced not in list(texts_of(content_of(site, assessment, "electrician").sections))


def test_the_inspector_sees_where_each_value_comes_from(site: Site, assessment: Assessment) -> None:
    texts = list(texts_of(content_of(site, assessment, "inspector").sections))
    assert "13.72 m (typed “45 ft”), taped" in texts
    assert "8 m, from a drawing (assumed)" in texts
    assert "copper (assumed), stranded (assumed)" in texts
    assert "18 °C (the site's ambient, assumed)" in texts
    assert "22 °C, by a probe" in texts
    assert "24 V (taken from what feeds it)" in texts
    assert "2026-03 as found, round 1, 2026-03-02, load current 6.02 A at way" in texts


def test_the_inspector_sees_categories_ratings_and_what_was_read_with_the_loads_off(
    site: Site, assessment: Assessment
) -> None:
    off = replace(site.readings[0], id="m7", value=0.02, loads_off="yes")
    recorded = replace(
        site,
        sources=(replace(site.sources[0], category="CAT II"), *site.sources[1:]),
        boards=(replace(site.boards[0], category="CAT III"), *site.boards[1:]),
        instruments=(replace(site.instruments[0], rated_voltage_v=300.0),),
        readings=(*site.readings, off),
    )
    texts = list(texts_of(content_of(recorded, assessment, "inspector").sections))
    assert f"{site.sources[0].kind}, CAT II" in texts
    assert "Pump room, CAT III" in texts
    assert "CAT III 600 V, rated 300 V" in texts
    assert "loads off" in texts
    assert "2026-03 as found, round 1, 2026-03-02, load current 6.02 A at way" in texts


def test_a_circuit_with_nothing_recorded_says_so_everywhere(site: Site, assessment: Assessment) -> None:
    content = content_of(site, assessment, "inspector")
    (section,) = [section for section in content.sections if section.title.startswith("P1-04")]
    texts = list(texts_of(section))
    assert texts.count("not known") >= 2
    assert "device not known" in texts
    assert "No reading was taken." in texts
    assert not [block for block in section.blocks if isinstance(block, Line)]


def test_the_supervisor_signs_and_sees_the_worst_first(site: Site, assessment: Assessment) -> None:
    content = content_of(site, assessment, "supervisor")
    sections = {section.title: section.blocks for section in content.sections}
    (worst,) = sections["Worst circuits first"]
    assert isinstance(worst, Table)
    assert [row[0] for row in worst.rows] == ["P1-01"]
    (actions,) = sections["Open actions"]
    assert isinstance(actions, Table)
    assert actions.rows[0][-1] == "accepted by K. Sand, 2026-03-04 09:00"
    assert isinstance(sections["Signatures"][0], Blanks)


def test_branches_of_a_circuit_are_paths_of_their_own(site: Site, assessment: Assessment) -> None:
    content = content_of(site, assessment, "inspector")
    (line,) = [
        block
        for section in content.sections
        if section.title.startswith("P1-01")
        for block in section.blocks
        if isinstance(block, Line)
    ]
    assert [text_line(path) for path in line.paths] == [
        "bus ─┤breaker C 16 A├─ way (read 24.51 V) ━━ 13.72 m · 4 mm² ━━ p1 ━━ 8 m · 2.5 mm² ━━ p2 (read 22.49 V)",
        "p1 ━━ 3 m · 2.5 mm² ━━ p3",
    ]


@pytest.mark.parametrize("audience", AUDIENCES)
def test_an_empty_site_has_a_report(audience: str) -> None:
    content = content_of(Site(name="hut"), Assessment("0.1.0", "hut", "general", (), (), ()), audience)
    assert "hut" in html_words(content)
    assert markdown_report(content).startswith("# D.c. distribution audit: hut\n")
    assert csv_report(content).count("\r\n") == 1


def test_open_actions_are_the_most_severe_first_then_those_of_other_circuits_and_the_rest_is_counted(
    site: Site, assessment: Assessment
) -> None:
    """Eight soon findings of one circuit and one of another: the other is on the page; 8 + 1 + 1 − 6 = 4 are left out."""
    like = next(finding for finding in assessment.findings if finding.circuit is not None)
    tags = [circuit.circuit for circuit in assessment.circuits][:2]

    def finding(number: int, circuit: str, severity: Severity) -> Finding:
        return replace(like, id=f"X/{number}", circuit=circuit, title=f"found {number}", severity=severity)

    soon = [finding(number, tags[0], Severity.SOON) for number in range(8)]
    found = (*soon, finding(8, tags[1], Severity.SOON), finding(9, tags[0], Severity.IMMEDIATE))
    content = content_of(site, replace(assessment, findings=found), "supervisor")
    (section,) = [section for section in content.sections if section.title.startswith("Open")]
    table, rest = section.blocks
    assert isinstance(table, Table)
    assert isinstance(rest, Paragraph)
    assert [row[1] for row in table.rows] == ["found 9", "found 8", "found 0", "found 1", "found 2", "found 3"]
    assert rest.text == "and 4 more findings, in the inspector's report"
