"""The text of ``check``: fits 80 columns, is plain in a pipe, and shows site text as it is."""

from __future__ import annotations

import io
import re
from dataclasses import replace

import pytest
from rich.cells import cell_len

from audit.report.phrases import CAUSES_NOT_JUDGED
from audit.report.text import print_check
from rules.assessment import STATUS_SIGNS, Assessment, Status
from rules.record import Site


def printed(site: Site, assessment: Assessment, encoding: str = "utf-8") -> str:
    """What a pipe of that encoding receives."""
    raw = io.BytesIO()
    stream = io.TextIOWrapper(raw, encoding=encoding, newline="\n")
    print_check(site, assessment, stream)
    stream.flush()
    return raw.getvalue().decode(encoding)


def flat(text: str) -> str:
    return " ".join(text.split())


def test_it_fits_80_columns_without_trailing_blanks(site: Site, with_causes: Assessment) -> None:
    lines = printed(site, with_causes).splitlines()
    assert max(cell_len(line) for line in lines) <= 80
    assert not [line for line in lines if line != line.rstrip()]


@pytest.mark.parametrize("variable", ["FORCE_COLOR", "TTY_COMPATIBLE", "CLICOLOR_FORCE"])
def test_a_pipe_receives_no_escape_sequence(
    site: Site, assessment: Assessment, monkeypatch: pytest.MonkeyPatch, variable: str
) -> None:
    monkeypatch.setenv(variable, "1")
    assert "\x1b" not in printed(site, assessment)


def test_a_terminal_receives_colour(site: Site, assessment: Assessment, monkeypatch: pytest.MonkeyPatch) -> None:
    class Terminal(io.StringIO):
        def isatty(self) -> bool:
            return True

    monkeypatch.delenv("NO_COLOR", raising=False)
    monkeypatch.setenv("TERM", "xterm-256color")
    monkeypatch.setenv("COLUMNS", "200")
    stream = Terminal()
    print_check(site, assessment, stream)
    assert "\x1b[" in stream.getvalue()


def test_the_walk_has_one_line_a_circuit_in_walking_order(site: Site, assessment: Assessment) -> None:
    text = printed(site, assessment)
    walk = text[text.index(" Pump room") : text.index("2 findings")]
    assert re.findall(r"P1-0\d", walk) == ["P1-01", "P1-02", "P1-03", "P1-04"]
    line = next(line for line in walk.splitlines() if "P1-01" in line)
    assert line.split() == ["P1-01", "Sluice", "motor", "▕████████╵██▶", "8.4", "of", "5", "%", "!", "act"]
    assert "P1, 24 V from PSU-1" in walk


def test_counts_are_words_with_signs(site: Site, assessment: Assessment) -> None:
    lines = printed(site, assessment).splitlines()
    first = next(number for number, line in enumerate(lines) if "circuits read" in line)
    assert flat(" ".join(lines[first : first + 2])) == "2 of 4 circuits read 1 ! act 1 ? measure 2 … incomplete"


def test_cautions_stand_before_the_walk(site: Site, assessment: Assessment) -> None:
    text = printed(site, assessment)
    places = [text.index(caution) for caution in assessment.cautions]
    assert text.index("Before taking a live reading") < min(places) < max(places) < text.index(" Pump room")


def test_findings_come_by_severity_with_all_that_is_known(site: Site, assessment: Assessment) -> None:
    text = flat(printed(site, assessment))
    assert text.index("SOON (1)") < text.index("NOTE (1)")
    finding = assessment.findings[1]
    for part in (finding.id, finding.title, finding.why, finding.remedy, finding.caution, finding.source):
        assert part in text
    assert "P1-01, run 2: Measured drop above computed" in text
    assert "measured drop 2.020 ± 0.004 V; computed 0.95 ± 0.03 V; share 8.4 %" in text
    assert "if left the motor may stall" in text
    assert "nan" not in text


def test_not_judged_stands_with_its_reason(site: Site, assessment: Assessment) -> None:
    assert "Not judged (a gap is not a pass) VD01 P1-03; P1-04 no run is recorded" in flat(printed(site, assessment))


def test_it_says_that_causes_are_not_judged_only_while_they_are_not(
    site: Site, assessment: Assessment, with_causes: Assessment
) -> None:
    assert CAUSES_NOT_JUDGED in flat(printed(site, assessment))
    assert CAUSES_NOT_JUDGED not in flat(printed(site, with_causes))
    assert "bad connection, probability 0.93" in flat(printed(site, with_causes))


def test_a_closed_pipe_is_left_to_the_caller(site: Site, assessment: Assessment) -> None:
    class Closed(io.StringIO):
        def write(self, text: str) -> int:
            raise BrokenPipeError

    with pytest.raises(BrokenPipeError):
        print_check(site, assessment, Closed())


@pytest.mark.parametrize("encoding", ["ascii", "latin-1", "cp1252", "cp437"])
def test_signs_that_an_encoding_lacks_become_letters(site: Site, assessment: Assessment, encoding: str) -> None:
    text = printed(replace(site, notes="Ω-хата"), assessment, encoding)
    assert "P1-01" in text
    if encoding == "ascii":
        assert "[########|##>" in text
        assert "2.020 +/- 0.004 V" in text
        assert r"ohm-\u0445" in text


@pytest.mark.parametrize("status", list(Status))
def test_every_status_sign_can_be_written_in_ascii(site: Site, assessment: Assessment, status: Status) -> None:
    circuits = (replace(assessment.circuits[0], status=status),)
    text = printed(site, replace(assessment, circuits=circuits), "ascii")
    assert re.search(rf"\S+ {status}\n", text)
    assert "\\u" not in text
    assert STATUS_SIGNS[status] in printed(site, replace(assessment, circuits=circuits))


def test_hostile_text_is_shown_and_not_obeyed(hostile_site: Site, hostile_assessment: Assessment, hostile: str) -> None:
    text = printed(hostile_site, hostile_assessment)
    assert not [c for c in text if (ord(c) < 32 and c != "\n") or 0x7F <= ord(c) < 0xA0 or c in "\u202e\u202c"]
    assert max(cell_len(line) for line in text.splitlines()) <= 80
    visible = "".join(c if c.isprintable() else "\ufffd" for c in hostile.replace("\n", " "))
    assert "".join(visible.split()) in "".join(text.split())


def test_an_empty_site_is_said_to_be_empty(site: Site) -> None:
    text = printed(Site(name="hut"), Assessment("0.1.0", "hut", "general", (), (), ()))
    assert "0 of 0 circuits read" in text
    assert "0 findings" in text
