"""The drop bar: one geometry, drawn with characters and as SVG."""

from __future__ import annotations

import math
from xml.etree import ElementTree

import pytest
from hypothesis import given
from hypothesis import strategies as st

from audit.report.bar import ASCII, BLOCKS, CELLS, Bar, drop_bar, svg_bar, text_bar

VOLTS = st.one_of(st.none(), st.floats(-1e6, 1e6), st.sampled_from([math.nan, math.inf, -math.inf]))


def made(measured: float | None, u: float | None, computed: float | None, allowed: float | None) -> Bar:
    bar = drop_bar(measured, u, computed, allowed, "words")
    assert bar is not None
    return bar


def test_measured_well_past_the_tick_inside_the_edge_shows_both() -> None:
    assert text_bar(made(2.5, 0.1, 1.0, 3.0)) == "▕███╵█████▒ ▏"


def test_past_the_allowed_drop_an_arrow_replaces_the_edge() -> None:
    assert text_bar(made(3.5, 0.1, 2.3, 3.0)) == "▕████████╵██▶"
    assert text_bar(made(3.5, 0.1, 3.2, 3.0)) == "▕███████████▶"


def test_computed_alone_is_a_tick() -> None:
    assert text_bar(made(None, None, 1.0, 3.0)) == "▕   ╵       ▏"
    assert text_bar(made(None, None, 3.1, 3.0)) == "▕           ▶"


def test_a_doubt_shows_even_where_it_is_narrow() -> None:
    assert BLOCKS.soft in text_bar(made(1.4, 0.001, 2.5, 3.0))
    assert BLOCKS.soft not in text_bar(made(1.4, None, 2.5, 3.0))


def test_less_than_nothing_points_left() -> None:
    assert text_bar(made(-0.2, 0.01, 1.0, 3.0)).startswith(BLOCKS.below)
    assert text_bar(made(-0.01, 0.02, 0.0, 3.0)).startswith(BLOCKS.left), "within its doubt of nothing"


def test_nothing_to_scale_by_or_to_draw_is_no_bar() -> None:
    assert drop_bar(1.0, 0.1, 1.0, None) is None
    assert drop_bar(1.0, 0.1, 1.0, 0.0) is None
    assert drop_bar(None, None, None, 3.0) is None
    assert text_bar(None) == " " * (CELLS + 2)
    assert svg_bar(None) == ""


@given(VOLTS, VOLTS, VOLTS, VOLTS, st.integers(1, 40), st.sampled_from([BLOCKS, ASCII]))
def test_any_bar_keeps_its_width_and_its_shares(
    measured: float | None, u: float | None, computed: float | None, allowed: float | None, cells: int, strokes: object
) -> None:
    bar = drop_bar(measured, u, computed, allowed)
    drawn = text_bar(bar, cells, ASCII if strokes is ASCII else BLOCKS)
    assert len(drawn) == cells + 2
    if strokes is ASCII:
        assert drawn.isascii()
    if bar is not None:
        shares = [bar.measured, bar.soft_from, bar.soft_to, bar.computed]
        assert all(share is None or 0 <= share <= 1 for share in shares)
        ElementTree.fromstring(svg_bar(bar))


@given(st.floats(0.01, 2.9), st.floats(0.001, 1.0))
def test_the_soft_end_is_the_measured_value_and_its_doubt(measured: float, u: float) -> None:
    bar = made(measured, u, None, 3.0)
    assert bar.soft_from == pytest.approx(max(0.0, (measured - u) / 3.0), abs=1e-6)
    assert bar.soft_to == pytest.approx(min(1.0, (measured + u) / 3.0), abs=1e-6)


def test_the_drawing_says_it_in_words_and_escapes_them() -> None:
    bar = drop_bar(1.0, 0.1, 1.0, 3.0, '"><script>')
    drawn = svg_bar(bar)
    assert "<script" not in drawn
    assert ElementTree.fromstring(drawn).attrib["aria-label"] == '"><script>'


def test_the_drawing_is_read_without_colour() -> None:
    """Reading, tick, edge and arrow are shapes of their own, whatever their ink."""
    shapes = [element.tag for element in ElementTree.fromstring(svg_bar(made(8.1, 0.1, 3.9, 5.0)))]
    assert shapes.count("polygon") == 2
    assert shapes.count("line") == 4
