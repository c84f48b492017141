"""Whatever stands in a folder, it is taken in or refused with lines: nothing else happens, and nothing is written."""

from __future__ import annotations

from contextlib import suppress
from pathlib import Path
from tempfile import TemporaryDirectory

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from audit.errors import IntakeRefused
from audit.intake.folder import read_folder, site_of
from rules.consistency import problems
from rules.record import TABLES, Site, columns
from rules.text import forbidden_character

SAMPLE = Path(__file__).parents[2] / "sample_sites" / "doors_24v_12v"
FILES = {path.name: path.read_bytes() for path in sorted(SAMPLE.iterdir()) if path.suffix in (".csv", ".toml")}
HARM = (b"", b"\x00", b'"', b'""', b",", b";", b"\n", b"\r", b"[", b"]", b"=", b"\xff", b"\xef\xbb\xbf", b"\xe2\x80\xae",
        b"1e999", b"nan", b"-", b"1,000", b"run 1", b"way", b"bus", b"board:", b" + ", b":", b"shared:", b"\x1b[2J")  # fmt: skip
"""Pieces that have a meaning somewhere."""

quick = settings(max_examples=100, deadline=None, suppress_health_check=[HealthCheck.too_slow])


def take_in(files: dict[str, bytes]) -> Site | None:
    """The site of a folder of these files; ``None`` where it is refused. Anything else is a fault."""
    with TemporaryDirectory() as folder:
        for name, content in files.items():
            (Path(folder) / name).write_bytes(content)
        site, lines = read(Path(folder))
        assert {path.name: path.read_bytes() for path in Path(folder).iterdir()} == files
    assert (site is None) == bool(lines)
    assert all(forbidden_character(line) is None for line in lines)
    return site


def read(folder: Path) -> tuple[Site | None, tuple[str, ...]]:
    """The site, or the lines of its refusal."""
    try:
        return read_folder(folder), ()
    except IntakeRefused as refused:
        return None, refused.lines


@st.composite
def harmed(draw: st.DrawFn) -> dict[str, bytes]:
    """The sample site with bytes of one file exchanged, taken out or put in."""
    name = draw(st.sampled_from(sorted(FILES)))
    content = FILES[name]
    for _ in range(draw(st.integers(1, 3))):
        start = draw(st.integers(0, len(content)))
        end = start + draw(st.integers(0, 12))
        piece = draw(st.one_of(st.sampled_from(HARM), st.binary(max_size=4)))
        content = content[:start] + piece + content[end:]
    return FILES | {name: content}


@given(harmed())
@quick
def test_a_harmed_folder_is_refused_or_holds_together(files: dict[str, bytes]) -> None:
    site = take_in(files)
    assert site is None or problems(site) == ()


@given(st.sampled_from([f"{table}.csv" for table in TABLES] + ["site.toml", "survey.xlsx"]), st.binary(max_size=400))
@quick
def test_any_bytes_are_refused_or_read(name: str, content: bytes) -> None:
    take_in(FILES | {name: content})


@st.composite
def any_tables(draw: st.DrawFn) -> dict[str, list[dict[str, str]]]:
    """Tables with the right headers and any text in their cells."""
    words = st.sampled_from(
        ["", "A", "B", "1", "2", "way", "p1", "run 1", "voltage", "battery", "board:A", "A:p1", "A + B", "5 m"]
    )
    cell = st.one_of(words, st.text(max_size=6))
    tables = {}
    for table in draw(st.sets(st.sampled_from(sorted(TABLES)))):
        names = [column.name for _, column in columns(table) if column.header or draw(st.integers(0, 3)) == 0]
        tables[table] = draw(st.lists(st.fixed_dictionaries(dict.fromkeys(names, cell)), max_size=4))
    return tables


@given(any_tables())
@quick
def test_any_texts_in_cells_are_refused_or_read(tables: dict[str, list[dict[str, str]]]) -> None:
    try:
        site = site_of(tables)
    except IntakeRefused:
        # What is refused for what its cells mean, and not for what cannot be read, has problems.
        with suppress(IntakeRefused):
            assert problems(site_of(tables, check=False))
    else:
        assert problems(site) == ()
