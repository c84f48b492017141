"""A folder goes in whole, or a line for everything that is wrong with it comes out."""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

import pytest

from audit.errors import IntakeRefused
from audit.intake.folder import read_folder, site_of
from rules.record import Feed, Site

Files = Mapping[str, str | bytes]

GOOD: dict[str, str] = {
    "site.toml": 'name = "Hut"\n',
    "sources.csv": "source,kind,nominal [V]\nBATT,battery,48\n",
    "boards.csv": "board,fed_by\nMDB,BATT\nB2,C1\n",
    "circuits.csv": "circuit,fed_from\nC1,MDB\nC2,B2\n",
    "runs.csv": (
        "circuit,run,from,to,length [m],size\n"
        "C1,1,way,p1,10,16 mm2\n"
        "C1,2,p1,p2,10,16 mm2\n"
        "C2,1,way,lamp,5,2.5 mm2\n"
    ),
    "loads.csv": "circuit,point,load,current [A]\nC2,lamp,LAMP,2\n",
    "instruments.csv": "instrument,quantity,range,accuracy [%],counts,resolution\nDMM,voltage,60,0.5,2,0.01\n",
    "readings.csv": "circuit,round,quantity,at,value,instrument\nC1,1,voltage,p1,47,DMM\n",
}  # fmt: skip
"""A small folder; each case exchanges some of its files."""


@pytest.fixture
def folder_of(tmp_path: Path) -> Callable[[Files], Path]:
    """Writes files into a folder of its own."""

    def write(files: Files) -> Path:
        folder = tmp_path / "hut"
        folder.mkdir()
        for name, content in files.items():
            (folder / name).write_bytes(content if isinstance(content, bytes) else content.encode())
        return folder

    return write


FolderOf = Callable[[Files], Path]


def refusal(folder: Path) -> list[str]:
    """The lines with which a folder is refused."""
    with pytest.raises(IntakeRefused) as refused:
        read_folder(folder)
    assert str(refused.value) == "\n".join(refused.value.lines)
    return list(refused.value.lines)


CASES = tomllib.loads(Path(__file__).with_name("bad_folders.toml").read_text(encoding="utf-8"))["case"]


@pytest.mark.parametrize("case", CASES, ids=[case["name"] for case in CASES])
def test_bad_input_is_refused_with_a_line_for_each_problem(case: dict[str, Any], folder_of: FolderOf) -> None:
    files = {name: text for name, text in GOOD.items() if name not in case.get("gone", [])}
    folder = folder_of(files | case.get("files", {}))
    before = sorted((path.name, path.read_bytes()) for path in folder.iterdir())
    assert refusal(folder) == case["lines"]
    assert sorted((path.name, path.read_bytes()) for path in folder.iterdir()) == before


@pytest.mark.parametrize(
    ("name", "content", "line"),
    [
        ("boards.csv", b"board,fed_by\nMDB,BATT\nB\xe9,C1\n", "boards.csv:3: byte 0xE9 is not UTF-8"),
        ("boards.csv", "board,fed_by\nMDB,BATT\n".encode("utf-16"), "boards.csv:1: byte 0xFF is not UTF-8"),
        ("boards.csv", b"\xef\xbb\xbfboard,fed_by\nMDB,BATT\n\xff", "boards.csv:3: byte 0xFF is not UTF-8"),
        ("site.toml", b'name = "Hut"\nextent = "\xff"\n', "site.toml:2: byte 0xFF is not UTF-8"),
    ],
)
def test_what_is_not_utf8_is_named_with_its_line(name: str, content: bytes, line: str, folder_of: FolderOf) -> None:
    """And it is the only line: nothing that refers to the unread table is called missing."""
    assert refusal(folder_of({**GOOD, name: content})) == [f"{line}; accepted: the file saved as UTF-8"]


def test_a_cell_of_a_megabyte_is_refused_with_its_place(folder_of: FolderOf) -> None:
    long = "x" * 1_000_000
    loads = f"circuit,point,load,current [A],notes\nC2,lamp,LAMP,2,{long}\nC2,lamp,FAN,{long},\n"
    assert refusal(folder_of(GOOD | {"loads.csv": loads})) == [
        "loads.csv:2:notes: text of 1,000,000 characters; accepted: up to 10,000 characters",
        f"loads.csv:3:current: '{'x' * 40}…' is too long; accepted is a number with a unit such as '2.5 A'",
    ]


def test_brackets_without_end_are_not_toml(folder_of: FolderOf) -> None:
    lines = refusal(folder_of(GOOD | {"site.toml": "name = " + "[" * 10_000}))
    assert lines == ["site.toml: is not TOML that can be read: brackets within brackets too deep; accepted: plain keys"]


@pytest.mark.parametrize(
    ("setting", "line"),
    [
        (
            f"nominal = 1{'0' * 400}",
            "site.toml:nominal: inf is not possible; accepted: a number in V from 0.001 to 10000",
        ),
        (
            f"ambient = -1{'0' * 400}",
            "site.toml:ambient: -inf is not possible; accepted: a number in degC from -90 to 400",
        ),
        (
            f"notes = 0x{'F' * 9_000}",
            "site.toml:notes: a number too large to be read is of the wrong kind; accepted: a text in quotes",
        ),
    ],
)
def test_whole_numbers_of_any_length_are_refused(setting: str, line: str, folder_of: FolderOf) -> None:
    assert refusal(folder_of(GOOD | {"site.toml": f'name = "Hut"\n{setting}\n'})) == [line]


def test_a_number_of_thousands_of_digits_is_no_toml(folder_of: FolderOf) -> None:
    (line,) = refusal(folder_of(GOOD | {"site.toml": f'name = "Hut"\nnominal = 1{"0" * 5_000}\n'}))
    assert line.startswith("site.toml: is not TOML: ")


def test_what_is_no_folder_is_refused(tmp_path: Path) -> None:
    for path in (tmp_path / "gone", tmp_path / "file"):
        if path.name == "file":
            path.write_text("")
        assert refusal(path) == [f"{path}: is not a folder; accepted: a site folder"]


def test_a_file_that_cannot_be_read_has_its_line(folder_of: FolderOf, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = folder_of(GOOD)

    read = Path.read_bytes

    def refuse(self: Path) -> bytes:
        if self.name in ("boards.csv", "site.toml"):
            raise PermissionError(13, "Permission denied")
        return read(self)

    monkeypatch.setattr(Path, "read_bytes", refuse)
    assert refusal(folder) == [
        "boards.csv: cannot be read: Permission denied; accepted: a file that you may read",
        "site.toml: cannot be read: Permission denied; accepted: a file that you may read",
    ]


def test_a_good_folder_becomes_a_site(folder_of: FolderOf) -> None:
    site = read_folder(folder_of(GOOD))
    assert (site.name, site.limits, site.own_limits) == ("Hut", "general", None)
    assert [row.tag for row in site.circuits] == ["C1", "C2"]
    assert site.boards[1].fed_by == (Feed("circuits", site.circuits[0].id),)
    assert [(run.from_point, run.to_point, run.one_way_length_m, run.size) for run in site.runs[:2]] == [
        ("way", "p1", 10.0, "16 mm2"),
        ("p1", "p2", 10.0, "16 mm2"),
    ]
    assert site.readings[0].circuit_id == site.circuits[0].id
    assert all(row.typed == () for row in (*site.runs, *site.loads, *site.readings))


def test_the_same_folder_gives_the_same_ids(folder_of: FolderOf) -> None:
    """Equal rows included: the n-th of them is the n-th reading."""
    row = "C1,1,voltage,p1,47,DMM\n"
    files = GOOD | {"readings.csv": GOOD["readings.csv"] + row + row}
    folder = folder_of(files)
    first, second = read_folder(folder), read_folder(folder)
    ids = [reading.id for reading in first.readings]
    assert ids == [reading.id for reading in second.readings]
    assert len(set(ids)) == 3
    (folder / "readings.csv").write_text(GOOD["readings.csv"] + row)
    assert [reading.id for reading in read_folder(folder).readings] == ids[:2]


def test_byte_order_mark_line_ends_and_empty_rows_do_not_matter(folder_of: FolderOf) -> None:
    files = {
        name: b"\xef\xbb\xbf" + text.replace("\n", "\r\n\r\n,,\r\n" if name == "loads.csv" else "\r\n").encode()
        for name, text in GOOD.items()
    }
    assert read_folder(folder_of(files)) == site_as(GOOD)


def site_as(files: dict[str, str]) -> Site:
    """The same site from plain texts."""
    tables = {}
    for name, text in files.items():
        if name.endswith(".csv"):
            header, *rows = (line.split(",") for line in text.splitlines())
            tables[name.removesuffix(".csv")] = [dict(zip(header, row, strict=True)) for row in rows]
    return site_of(tables, {"name": "Hut"})


def test_other_files_are_left_alone(folder_of: FolderOf) -> None:
    others: Files = {
        "readme.txt": "x",
        ".circuits.csv": "x",
        "~$survey.xlsx": "x",
        "expected.toml": "=",
        "photo.jpg": b"\xff",
    }
    assert read_folder(folder_of({**GOOD, **others})) == site_as(GOOD)


def test_settings_and_own_profile_are_read(folder_of: FolderOf) -> None:
    profile = '[drop]\nallowed_percent = 2\nsource = "ours"\n'
    settings = (
        'name = "Hut"\naddress = "Hill 1"\nlimits = "ours.toml"\nnominal = "48 V"\nambient = "77 degF"\n'
        'surveyed_by = "N"\nextent = "all"\nlimitations = "none"\nnotes = """a\nb"""\n'
        "[prior]\nas_recorded = 3\nother_metal = 1\n"
    )
    site = read_folder(folder_of(GOOD | {"site.toml": settings, "ours.toml": profile}))
    assert (site.address, site.surveyed_by, site.extent, site.limitations) == ("Hill 1", "N", "all", "none")
    assert (site.limits, site.own_limits, site.notes) == ("ours.toml", profile, "a\nb")
    assert (site.nominal_voltage_v, site.ambient_temperature_c) == (48.0, 25.0)
    assert site.typed == (("ambient_temperature_c", "77 degF"), ("nominal_voltage_v", "48 V"))
    assert site.prior == (("as recorded", 3.0), ("other metal", 1.0))


def test_plain_numbers_are_settings_in_their_own_unit() -> None:
    site = site_of({}, {"name": "Hut", "nominal": 48, "ambient": "25"})
    assert (site.nominal_voltage_v, site.ambient_temperature_c, site.typed) == (48.0, 25.0, ())
