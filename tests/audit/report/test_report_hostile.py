"""Text from the site is data: no form runs it, links it or lets it steer a screen."""

from __future__ import annotations

import csv
import io
import re
from dataclasses import replace
from html.parser import HTMLParser

import pytest
from markdown_it import MarkdownIt

from audit.report.blocks import Content
from audit.report.content import AUDIENCES, content_of
from audit.report.csv import csv_report, safe_cell
from audit.report.html import html_report
from audit.report.markdown import escaped, markdown_report
from rules.assessment import Assessment
from rules.record import Site

OF_THE_PAGE = """
html head meta title style body header main section article figure h1 h2 h3 h4 h5 p ul li dl div dt dd bdi table caption
colgroup col thead tbody tr th td svg line polygon circle rect text
"""
OF_MARKDOWN = "h1 h2 h3 h4 p ul li strong em table thead tbody tr th td pre code br"


class Elements(HTMLParser):
    """The elements and attributes of a page, and its text."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.names: set[str] = set()
        self.attributes: set[str] = set()
        self.text = ""
        self.feed(text)
        self.close()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.names.add(tag)
        self.attributes |= {name for name, _ in attrs}

    def handle_data(self, data: str) -> None:
        self.text += data


@pytest.fixture(params=AUDIENCES)
def content(request: pytest.FixtureRequest, hostile_site: Site, hostile_assessment: Assessment) -> Content:
    return content_of(hostile_site, hostile_assessment, request.param)


def visible(text: str) -> str:
    """The text as it may be shown, without blanks."""
    return "".join("".join(c if c.isprintable() else "\ufffd" for c in text.replace("\n", " ")).split())


def has_control_codes(text: str) -> bool:
    return any((ord(c) < 32 and c not in "\r\n") or 0x7F <= ord(c) < 0xA0 or c in "\u202e\u202c" for c in text)


def test_the_page_holds_our_elements_alone(content: Content, hostile: str) -> None:
    text = html_report(content)
    page = Elements(text)
    assert page.names <= set(OF_THE_PAGE.split())
    assert not [name for name in page.attributes if name.startswith("on") or name in ("href", "src")]
    assert visible(hostile) in "".join(page.text.split())
    assert not has_control_codes(text)


def test_words_from_right_to_left_leave_figures_in_their_place(site: Site, assessment: Assessment) -> None:
    visits = (replace(site.visits[0], tag="ביקור 2 ראשון", kind=""),)
    text = html_report(content_of(replace(site, visits=visits), assessment, "inspector"))
    assert "<bdi>ביקור 2 ראשון</bdi>, 2026-03-02, by R. Ames" in text


def test_the_page_forbids_scripts_and_outside_content(content: Content) -> None:
    assert "content=\"default-src 'none'; style-src 'unsafe-inline'\"" in html_report(content)


def test_markdown_stays_text(content: Content, hostile: str) -> None:
    text = markdown_report(content)
    rendered = Elements(MarkdownIt("commonmark", {"html": True}).enable("table").enable("strikethrough").render(text))
    assert rendered.names <= set(OF_MARKDOWN.split())
    assert visible(hostile) in "".join(rendered.text.split())
    assert not has_control_codes(text)


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        ("http://x.example", r"http\://x.example"),
        ("www.x.example", r"www\.x.example"),
        ("a@x.example", r"a\@x.example"),
        ("10:12 and F2: lug", "10:12 and F2: lug"),
        ("- item", r"\- item"),
        ("1. one", r"1\. one"),
        ("1.4 V", "1.4 V"),
        ("a\nb\u2028c", "a b c"),
    ],
)
def test_what_a_reader_could_make_a_link_or_list_of_is_escaped(text: str, wanted: str) -> None:
    assert escaped(text) == wanted


def test_no_cell_of_the_table_of_findings_is_a_formula(content: Content, hostile: str) -> None:
    text = csv_report(content)
    rows = list(csv.reader(io.StringIO(text.removeprefix("\ufeff"), newline="")))
    assert len(rows) == 1 + len(content.assessment.findings)
    assert not [cell for row in rows for cell in row if re.match(r"\s*[=+\-@＝＋－＠\t\r]", cell)]
    assert not has_control_codes(text)
    assert any(visible(hostile) in visible(cell) for row in rows for cell in row)


@pytest.mark.parametrize("start", ["=", "+", "-", "@", "\t", "\r", " =", "＝"])
def test_a_cell_that_a_spreadsheet_would_run_begins_with_an_apostrophe(start: str) -> None:
    assert safe_cell(f"{start}1+1").startswith("'")


def test_letters_of_other_scripts_are_kept(site: Site, assessment: Assessment) -> None:
    for text in ("שלום عربى", "Türmchen Ørsted", "漢字 🔌"):
        assert safe_cell(text) == text
        assert escaped(text) == text
