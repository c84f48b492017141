"""Which characters may stand in text from outside, and how the rest is shown."""

from __future__ import annotations

import unicodedata

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rules.text import Suggestions, clean, either, forbidden_character, quoted

BIDIRECTIONAL = [0x061C, 0x200E, 0x200F, *range(0x202A, 0x202F), *range(0x2066, 0x206A)]


def test_exactly_controls_bidirectional_controls_and_surrogates_are_forbidden() -> None:
    forbidden = {code for code in range(0x110000) if forbidden_character(chr(code)) is not None}
    controls = {code for code in range(0x110000) if unicodedata.category(chr(code)) in ("Cc", "Cs")}
    assert forbidden == controls.union(BIDIRECTIONAL)


def test_lines_may_hold_newline_and_tab_alone() -> None:
    controls = [chr(code) for code in range(32)]
    assert [c for c in controls if forbidden_character(c, lines=True) is None] == ["\t", "\n"]


@pytest.mark.parametrize("text", ["=SUM(A1)", "<b>[red]{{x}}", "مرتفع", "מרתף", "🔋👩‍🔧", "Ω µ ° ²", "a\u00a0b\u2028c"])
def test_ordinary_text_stays_as_it_is(text: str) -> None:
    assert forbidden_character(text) is None
    assert clean(text) == text


@given(st.text())
def test_clean_text_holds_nothing_forbidden(text: str) -> None:
    assert forbidden_character(clean(text)) is None
    assert forbidden_character(clean(text, lines=True), lines=True) is None
    assert len(clean(text)) == len(text)


def test_newlines_stay_only_where_lines_are_shown() -> None:
    assert clean("a\n\tb\x07") == "a  b\ufffd"
    assert clean("a\n\tb\x07", lines=True) == "a\n\tb\ufffd"


def test_quoted_text_fits_into_a_line() -> None:
    assert quoted("a\nb\x00") == "'a b\ufffd'"
    assert quoted("x" * 1_000_000) == "'" + "x" * 59 + "…'"


def test_lists_of_words_are_cut() -> None:
    assert either([]) == ""
    assert either(["way"]) == "way"
    assert either(["way", "p1"]) == "way or p1"
    assert either([f"p{n}" for n in range(5)], most=3) == "p0, p1, p2 and 2 more"


def test_suggestions_end_once_many_words_were_compared() -> None:
    suggestions = Suggestions()
    assert suggestions.ask("B1-70", ["B1-07"]) == ", did you mean 'B1-07'?"
    known = [f"{n:06}" for n in range(200_001)]
    suggestions.ask("?", known)
    assert suggestions.ask("B1-70", ["B1-07"]) == ""
