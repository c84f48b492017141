"""The tables as people read them: within 80 columns, nothing lost, in any encoding."""

from __future__ import annotations

import io

import pytest

from audit import cli
from audit.limit_words import limit_words
from audit.tables_text import print_table, print_tables
from rules import limits
from rules.record import Site
from rules.tables.loader import groups

NAMES = [group.name for group in groups()]
PROFILES = list(limits.names())


def printed(name: str = "", encoding: str = "utf-8") -> list[str]:
    """Lines of the list, or of one table, as a pipe of that encoding receives them."""
    pipe = io.TextIOWrapper(io.BytesIO(), encoding=encoding)
    if name:
        print_table(name, pipe)
    else:
        print_tables(pipe)
    pipe.seek(0)
    return pipe.read().splitlines()


@pytest.mark.parametrize("name", ["", *NAMES, *PROFILES])
def test_every_table_fits_80_columns_without_trailing_blanks_or_colour(name: str) -> None:
    for line in printed(name):
        assert len(line) <= 80
        assert line == line.rstrip()
        assert "\x1b" not in line


@pytest.mark.parametrize("name", ["", *NAMES, *PROFILES])
def test_every_table_can_be_printed_in_ascii(name: str) -> None:
    assert "\n".join(printed(name, "ascii")).isascii()


def test_the_list_says_of_each_group_what_it_is_where_from_and_how_sure() -> None:
    words = " ".join(" ".join(printed()).split())
    for group in groups():
        assert f"{group.name} {group.title} {group.source} · " in words
        assert f"{group.edition} · {group.status}" in words
    assert "IEC 60364-5-52 Table B.52.2 · edition 2009 · verified" in words


@pytest.mark.parametrize("name", NAMES)
def test_a_table_says_where_it_is_from_and_holds_every_value(name: str) -> None:
    group = next(group for group in groups() if group.name == name)
    lines = printed(name)
    words = " ".join(" ".join(lines).split())
    for text in (group.title, group.source, group.edition, group.status, group.unit, group.note):
        assert " ".join(text.split()) in words
    header = next(number for number, line in enumerate(lines) if line.split() == list(group.columns))
    rows = lines[header + 1 : header + 1 + len(group.rows)]
    for row, line in zip(group.rows, rows, strict=True):
        shown = line
        for cell in row:
            text = "–" if cell is None else cell if isinstance(cell, str) else f"{cell:.7g}"
            assert text in shown
            shown = shown[shown.index(text) + len(text) :]
        assert shown == ""


def test_numbers_stand_under_each_other() -> None:
    """The last digits of a column share a place; 18 AWG has no figure in two of them."""
    lines = printed("nec_310_16_copper")
    header = next(line for line in lines if line.startswith("size"))
    end = header.index("c90") + 3
    rows = [line for line in lines if " AWG " in line or " kcmil " in line]
    assert len(rows) == 21
    assert {len(line) for line in rows} == {end}
    assert rows[0].split() == ["18", "AWG", "–", "–", "14"]


def test_an_unknown_table_names_the_nearest(capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["tables", "iec_groping"]) == 2
    assert "did you mean 'iec_grouping'?" in capsys.readouterr().err


def test_the_list_names_every_profile_and_what_it_starts_from() -> None:
    words = " ".join(" ".join(printed()).split())
    assert "general General d.c. distribution in buildings" in words
    assert "battery-125 Station battery, 125 V, from battery-110" in words


@pytest.mark.parametrize("name", PROFILES)
def test_a_profile_is_printed_with_every_value_and_where_it_comes_from(name: str) -> None:
    profile = limits.of(Site(name="x", limits=name))
    words = " ".join(" ".join(printed(name)).split())
    assert profile.title in words
    for group in profile.groups.values():
        assert " ".join(group.title.split()) in words
        for stated, keys in group.by_source().items():
            assert " ".join(str(stated).split()) in words
            for key in keys:
                assert " ".join(limit_words(group, key).split()) in words
