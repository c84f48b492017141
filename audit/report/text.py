"""
The text of ``ohmwalk check``: the walk with its drop bars, then findings, then what was not judged.

Plain where the output is no terminal: no colour, no escape sequence. Every text is put in as
``rich.text.Text``, so that nothing from the site is read as markup; signs that the output's encoding
lacks are written with letters.
"""

from __future__ import annotations

import sys
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import TextIO

from rich.cells import cell_len, set_cell_size
from rich.console import Console
from rich.text import Text

from audit.console import PlainConsole
from audit.report.bar import ASCII, BLOCKS, CELLS, legend, text_bar
from audit.report.phrases import (
    CAUSES_NOT_JUDGED,
    STATUS_MEANING,
    causes_are_judged,
    counted,
    drop_words,
    finding_place,
    limits_defer,
    next_reading_words,
    number_words,
    some_of,
    status_words,
)
from audit.report.records import board_title, location_of
from audit.report.sections import by_feed, by_severity, evidence_words, group_gaps
from rules.assessment import Assessment, CircuitResult, Finding, NextReading, Severity, Status
from rules.index import Index
from rules.record import Site
from rules.text import clean

PLAIN_WIDTH = 80
"""Columns where the output is no terminal."""
WIDEST = 110
"""Longer lines are hard to read."""

_LETTERS = {
    "✓": "+", "…": "...", "±": "+/-", "Ω": "ohm", "µ": "u", "²": "2", "°": "deg ", "×": "x", "−": "-", "–": "-",
    "—": "-", "·": "-", "“": '"', "”": '"', "’": "'", "≤": "<=", "≥": ">=", "Δ": "delta ", "√": "sqrt ", "\ufffd": "?",
}  # fmt: skip
"""How signs of ours are written where the encoding has none."""

_COLOURS = {
    Status.ACT: "#d55e00",
    Status.WATCH: "#e69f00",
    Status.SOUND: "#009e73",
    Status.MEASURE: "#56b4e9",
    Status.INCOMPLETE: "#56b4e9",
}
"""Of Okabe and Ito; the words and signs carry the meaning."""


@dataclass(frozen=True, slots=True)
class Page:
    """Where the text goes: what may be drawn there."""

    console: Console
    encoding: str

    def text(self, words: str, style: str = "") -> Text:
        """A text from anywhere, literal and fit for the output's encoding."""
        return Text(in_encoding(clean(words), self.encoding), style=style, no_wrap=False)

    def line(self, words: str = "", style: str = "", indent: int = 0) -> None:
        """A paragraph, wrapped, each of its lines indented."""
        self.hang(" " * indent, words, style)

    def hang(self, first: str, words: str, style: str = "") -> None:
        """A paragraph that hangs beside its first word: no trailing blanks, and none of its lines too wide."""
        indent = cell_len(first)
        room = max(20, self.console.width - indent)
        lines = self.text(words, style).wrap(self.console, room, overflow="fold") or [Text()]
        for number, line in enumerate(lines):
            line.rstrip()
            shown = Text.assemble(first if number == 0 else " " * indent, line)
            shown.rstrip()
            self.console.print(shown, no_wrap=True, overflow="ignore", crop=False)

    def pairs(self, rows: Iterable[tuple[str, str]], indent: int = 4) -> None:
        """Labels with their texts hanging beside them."""
        shown = [(label, words) for label, words in rows if words]
        widest = max((len(label) for label, _ in shown), default=0)
        for label, words in shown:
            self.hang(f"{' ' * indent}{label.ljust(widest)}  ", words)

    @property
    def has_blocks(self) -> bool:
        """The encoding holds the characters of the bar."""
        return in_encoding("▕█▒╵▏▶◀", self.encoding) == "▕█▒╵▏▶◀"


def console_for(stream: TextIO) -> Console:
    """A console for a stream: with colour on a terminal, else plain and 80 columns wide."""
    terminal = stream.isatty()
    width = None if terminal else PLAIN_WIDTH
    colours = "auto" if terminal else None
    console = PlainConsole(file=stream, force_terminal=terminal, width=width, color_system=colours)
    console.width = min(console.width, WIDEST)
    return console


def in_encoding(text: str, encoding: str) -> str:
    r"""
    The text with what the encoding lacks written in letters.

    >>> in_encoding("155 mΩ ± 2 mΩ in Ω-хата", "ascii")
    '155 mohm +/- 2 mohm in ohm-\\u0445\\u0430\\u0442\\u0430'
    """
    try:
        text.encode(encoding)
    except UnicodeEncodeError:
        return "".join(_letter(character, encoding) for character in text)
    return text


def print_check(site: Site, assessment: Assessment, stream: TextIO | None = None) -> None:
    """
    Print what ``check`` says of a site.

    Parameters
    ----------
    assessment : Assessment
        The whole, or the part of it that concerns one circuit.
    stream : TextIO, optional
        Standard output where none is given.
    """
    out = sys.stdout if stream is None else stream
    page = Page(console_for(out), getattr(out, "encoding", None) or "utf-8")
    index = Index(site)
    _heading(page, site, assessment)
    _cautions(page, assessment)
    _walk(page, index, assessment)
    _findings(page, assessment)
    _unsettled(page, assessment.circuits)
    _next_readings(page, assessment.circuits)
    _changed_severities(page, assessment)
    _gaps(page, assessment)
    page.line()
    if not causes_are_judged(assessment.circuits):
        page.line(CAUSES_NOT_JUDGED)
    page.line(limits_defer(assessment.limits))
    page.line(
        "Says what was measured; not that anything is safe to touch or complies. ± is the standard uncertainty u."
    )


def _heading(page: Page, site: Site, assessment: Assessment) -> None:
    page.line(assessment.site, "bold")
    if site.address:
        page.line(site.address)
    own = " (the site's own)" if site.own_limits is not None else ""
    page.line(f"limits: {assessment.limits}{own}   ohmwalk {assessment.program}")
    if site.notes:
        page.line(site.notes.replace("\n", " "))
    read = sum(bool(result.visit) for result in assessment.circuits)
    summary = assessment.summary
    page.line()
    states = [f"{summary[str(status)]} {status_words(status)}" for status in STATUS_MEANING if summary[str(status)]]
    # two lines, since five statuses beside the share read are wider than a narrow terminal
    page.line(f"{read} of {counted(len(assessment.circuits), 'circuit')} read", "bold")
    page.line("   ".join(states), "bold")


def _cautions(page: Page, assessment: Assessment) -> None:
    if not assessment.cautions:
        return
    page.line()
    page.line("Before taking a live reading", "bold")
    for caution in assessment.cautions:
        page.hang("  - ", caution)


def _walk(page: Page, index: Index, assessment: Assessment) -> None:
    place = None
    page.line()
    if assessment.circuits:
        page.line(legend(BLOCKS if page.has_blocks else ASCII))
    tag_cells = min(14, max((cell_len(page.text(r.circuit).plain) for r in assessment.circuits), default=0))
    for feed, group in by_feed(index, assessment.circuits):
        location = location_of(index, feed)
        page.line()
        if location and location != place:
            page.line(location, "bold", indent=1)
        place = location
        page.line(board_title(index, feed), indent=3)
        for result in group:
            circuit = index.circuits.get(result.circuit_id)
            _circuit(page, result, circuit.description if circuit is not None else "", tag_cells)


def _circuit(page: Page, result: CircuitResult, description: str, tag_cells: int) -> None:
    """One line: tag, description, bar, share of the allowed drop, status."""
    drop = drop_words(result)
    bar = text_bar(drop.bar, CELLS, BLOCKS if page.has_blocks else ASCII)
    status = page.text(status_words(result.status), _COLOURS[result.status])
    share = page.text(drop.of_allowed)
    tag = page.text(result.circuit)
    if cell_len(tag.plain) > tag_cells:
        page.line(result.circuit, indent=5)
        tag = Text("")
    fixed = 5 + tag_cells + 2 + CELLS + 2 + 2 + max(13, cell_len(share.plain)) + 2 + 12
    room = max(8, page.console.width - fixed - 2)
    line = Text.assemble(
        " " * 5, set_cell_size(tag.plain, tag_cells), "  ", _fitted(page, description, room), "  ",
        bar, "  ", share.plain.ljust(13), "  ", status,
    )  # fmt: skip
    page.console.print(line, no_wrap=True, overflow="crop")


def _fitted(page: Page, words: str, cells: int) -> str:
    """A text in exactly so many cells; where it is cut, it says so."""
    shown = page.text(words).plain
    if cell_len(shown) <= cells:
        return set_cell_size(shown, cells)
    mark = in_encoding("…", page.encoding)
    return set_cell_size(shown, cells - len(mark)) + mark


def _findings(page: Page, assessment: Assessment) -> None:
    evidence = evidence_words(assessment)
    severity: Severity | None = None
    page.line()
    page.line(f"{counted(len(assessment.findings), 'finding')}", "bold")
    for finding in by_severity(assessment.findings):
        if finding.severity is not severity:
            severity = finding.severity
            number = sum(other.severity is severity for other in assessment.findings)
            page.line()
            page.line(f"{str(severity).upper()} ({number})", "bold", indent=1)
        page.line()
        page.line(f"{finding_place(finding)}: {finding.title}", "bold", indent=2)
        page.pairs(_finding_rows(finding, evidence(finding)))


def _finding_rows(finding: Finding, evidence: str) -> Iterator[tuple[str, str]]:
    yield "why", finding.why
    yield "claims", evidence
    yield "numbers", some_of(number_words(finding))
    yield "if left", some_of(finding.consequences)
    yield "do", finding.remedy
    yield "caution", finding.caution
    yield "source", finding.source
    yield "id", finding.id


def _unsettled(page: Page, circuits: Iterable[CircuitResult]) -> None:
    """Why circuits are neither sound nor under a finding; equal reasons stand together."""
    reasons: dict[tuple[Status, str], list[str]] = {}
    for result in circuits:
        if result.status in (Status.MEASURE, Status.INCOMPLETE):
            reasons.setdefault((result.status, result.why), []).append(result.circuit)
    if not reasons:
        return
    page.line()
    page.line("To measure or to complete", "bold")
    for (status, why), tags in reasons.items():
        page.line(f"{status_words(status)}  {', '.join(tags)}", indent=2)
        page.line(why, indent=4)


def _next_readings(page: Page, circuits: Iterable[CircuitResult]) -> None:
    """What to read next on each circuit that is not settled; readings with the same cautions stand together."""
    by_caution: dict[str, list[tuple[str, NextReading]]] = {}
    for result in circuits:
        if (following := result.next_reading) is not None:
            by_caution.setdefault(following.caution, []).append((result.circuit, following))
    if not by_caution:
        return
    page.line()
    page.line("What to read next", "bold")
    for caution, readings in by_caution.items():
        for tag, reading in readings:
            page.line(f"{tag}  {next_reading_words(reading)}", indent=2)
            page.line(reading.why, indent=4)
        whose = ", ".join(dict.fromkeys(tag for tag, _ in readings))
        page.pairs([("caution", f"{whose}: {caution}" if caution else "")], indent=2)


def _changed_severities(page: Page, assessment: Assessment) -> None:
    """Rules that the limits profile raises or lowers, with its reason; those switched off are not judged."""
    changes = [change for change in assessment.rule_changes if change.severity is not None]
    if changes:
        page.line()
        page.line("Changed by the limits profile", "bold")
    for change in changes:
        page.line(f"{change.words}.", indent=2)


def _gaps(page: Page, assessment: Assessment) -> None:
    if not assessment.not_judged:
        return
    page.line()
    page.line("Not judged (a gap is not a pass)", "bold")
    for rule, why, places in group_gaps(assessment.not_judged):
        page.line(f"{rule}  {places}", indent=2)
        page.line(why, indent=4)


def _letter(character: str, encoding: str) -> str:
    try:
        character.encode(encoding)
    except UnicodeEncodeError:
        return _LETTERS.get(character, character.encode("ascii", "backslashreplace").decode("ascii"))
    return character
