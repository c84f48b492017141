"""A workbook is read as the CSV files would be."""

from __future__ import annotations

import csv
import io
import zipfile
from collections.abc import Callable
from datetime import date, datetime, time
from pathlib import Path
from typing import Any

import pytest
from openpyxl import Workbook

from audit.errors import IntakeRefused
from audit.intake.folder import read_folder
from audit.unload import folder_files, unload
from rules.record import Site

Sheets = dict[str, list[list[Any]]]

GOOD: Sheets = {
    "sources": [["source", "kind", "nominal [V]"], ["BATT", "battery", 48]],
    "circuits": [["circuit", "fed_from", "allowed_drop [%]", "notes"], ["C1", "BATT", None, None]],
    "runs": [["circuit", "run", "from", "to", "length [m]", "size"], ["C1", 1, "way", "p1", 10.5, "2.5 mm2"]],
}


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "site.toml").write_text('name = "Hut"\n')
    return tmp_path


@pytest.fixture
def write(folder: Path) -> Callable[[Sheets], Workbook]:
    """Writes ``survey.xlsx``; the workbook can be changed and saved again."""

    def written(sheets: Sheets) -> Workbook:
        book = Workbook()
        book.remove(book.worksheets[0])
        for name, rows in sheets.items():
            sheet = book.create_sheet(name)
            for row in rows:
                sheet.append(row)
        book.save(folder / "survey.xlsx")
        return book

    return written


def refusal(folder: Path) -> list[str]:
    with pytest.raises(IntakeRefused) as refused:
        read_folder(folder)
    return list(refused.value.lines)


def test_a_workbook_gives_the_same_site_as_csv_files(
    folder: Path, write: Callable[[Sheets], Workbook], tmp_path: Path
) -> None:
    write(GOOD)
    site = read_folder(folder)
    unload(site, tmp_path / "csv")
    again = read_folder(tmp_path / "csv")
    assert again == site
    assert [row.id for row in again.runs] == [row.id for row in site.runs]


@pytest.mark.parametrize("name", ["plant_48v", "doors_24v_12v"])
def test_sample_sites_read_alike_from_a_workbook(name: str, folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    sample = Path(__file__).parents[2] / "sample_sites" / name
    site: Site = read_folder(sample)
    files = folder_files(site)
    (folder / "site.toml").write_text(files["site.toml"])
    tables = {file.removesuffix(".csv"): text for file, text in files.items() if file.endswith(".csv")}
    write(
        {
            table: [[_cell(cell) for cell in row] for row in csv.reader(io.StringIO(text))]
            for table, text in tables.items()
        }
    )
    assert read_folder(folder) == site


def _cell(text: str) -> str | float:
    """A number where a spreadsheet would hold one."""
    try:
        return float(text)
    except ValueError:
        return text


@pytest.mark.parametrize(
    ("value", "number_format", "text"),
    [
        (3.0, "General", "3"),
        (0.1 + 0.2, "General", "0.3"),
        (1234567.5, "#,##0.00", "1234567.5"),
        (True, "General", "TRUE"),
        (date(2026, 3, 14), "dd.mm.yyyy", "2026-03-14"),
        (datetime(2026, 3, 14), "yyyy-mm-dd", "2026-03-14"),
        (datetime(2026, 3, 14), "yyyy-mm-dd hh:mm", "2026-03-14T00:00:00"),
        (datetime(2026, 3, 14, 9, 30), "yyyy-mm-dd hh:mm", "2026-03-14T09:30:00"),
        (time(9, 30), "hh:mm", "09:30:00"),
        ("  padded ", "General", "  padded "),
        (45, '0.0" ft"', "45 ft"),
        (5, '0" mA"', "5 mA"),
        (3.5, "0.0\\%", "3.5%"),
        (3.5, '0.0"%"', "3.5%"),
        (0.035, "0.0%", "3.5 %"),
        (7, "000", "007"),
        (7.5, "00.0", "07.5"),
        (12000, '0.0,"k"', "12k"),
        (-5, '0" A";[Red]-0" A"', "-5 A"),
        (-5, "#,##0.00_);(#,##0.00)", "-5"),
        (-5, '0" A"', "-5 A"),
        (0, '0;-0;"none"', "none"),
        (0.5, "# ?/?", "0.5"),
        (1e-7, "0.00E+00", "1e-07"),
        (5, 'General" V"', "5 V"),
        (5, "[$EUR-407] 0.00", "EUR5"),
    ],
)
def test_cells_are_read_as_people_see_them(
    value: object, number_format: str, text: str, folder: Path, write: Callable[[Sheets], Workbook]
) -> None:
    book = write(GOOD)
    cell = book["circuits"]["D2"]
    cell.value, cell.number_format = value, number_format
    book.save(folder / "survey.xlsx")
    assert read_folder(folder).circuits[0].notes == text


@pytest.mark.parametrize(
    ("value", "number_format", "why"),
    [
        (-5, "0.0;[Red]0.0", "shows a negative number without its sign"),
        (5, ";;;", "shows nothing of the cell's number"),
        (5551234, "000-0000", "shows text between digits"),
        (5, '[>3]0" A";0" V"', "depends on the value"),
    ],
)
def test_a_number_that_its_format_changes_is_refused_with_its_line(
    value: float, number_format: str, why: str, folder: Path, write: Callable[[Sheets], Workbook]
) -> None:
    book = write(GOOD)
    cell = book["runs"]["E2"]
    cell.value, cell.number_format = value, number_format
    book.save(folder / "survey.xlsx")
    (line,) = refusal(folder)
    assert line.startswith("survey.xlsx[runs]:2:length: the number format ")
    assert why in line


def test_a_unit_in_a_number_format_counts_and_padded_tags_keep_their_digits(
    folder: Path, write: Callable[[Sheets], Workbook]
) -> None:
    book = write(GOOD)
    length, tag, named = book["runs"]["E2"], book["circuits"]["A2"], book["runs"]["A2"]
    length.value, length.number_format = 10, '0.0" ft"'
    for cell in (tag, named):
        cell.value, cell.number_format = 7, "000"
    book.save(folder / "survey.xlsx")
    site = read_folder(folder)
    assert site.runs[0].one_way_length_m == pytest.approx(3.048)
    assert site.runs[0].typed == (("one_way_length_m", "10 ft"),)
    assert site.circuits[0].tag == "007"


def in_sheet(path: Path, name: str, old: bytes, new: bytes) -> None:
    """Exchange bytes in one part of a workbook."""
    with zipfile.ZipFile(path) as archive:
        parts = {part: archive.read(part) for part in archive.namelist()}
    assert old in parts[name]
    parts[name] = parts[name].replace(old, new)
    with zipfile.ZipFile(path, "w") as archive:
        for part, content in parts.items():
            archive.writestr(part, content)


def test_a_row_beyond_the_last_is_refused(
    folder: Path, write: Callable[[Sheets], Workbook], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("audit.intake.workbook._MOST_ROWS", 1_000)  # a million take seconds
    write(GOOD)
    in_sheet(folder / "survey.xlsx", "xl/worksheets/sheet3.xml", b'<row r="2"', b'<row r="2000000000"')
    assert refusal(folder) == ["survey.xlsx[runs]:1001: a row stands beyond the last; accepted: up to 1,000 rows"]


def test_a_row_of_too_many_cells_is_refused(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    book = write(GOOD)
    book["runs"].cell(2, 16_384).value = 1
    book.save(folder / "survey.xlsx")
    assert refusal(folder) == ["survey.xlsx[runs]:2: the row has 16,384 cells; accepted: up to 1,000"]


def test_a_gap_of_empty_rows_keeps_the_line_of_what_follows(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    book = write(GOOD)
    book["runs"].append([])
    book["runs"].cell(50_000, 1).value = "C9"
    book.save(folder / "survey.xlsx")
    assert any(line.startswith("survey.xlsx[runs]:50000:circuit: 'C9' ") for line in refusal(folder))


def test_a_percentage_is_read_with_its_sign(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    book = write(GOOD)
    book["circuits"]["C2"].value, book["circuits"]["C2"].number_format = 0.035, "0.0%"
    book.save(folder / "survey.xlsx")
    circuit = read_folder(folder).circuits[0]
    assert (circuit.allowed_drop_percent, circuit.typed) == (3.5, (("allowed_drop_percent", "3.5 %"),))


def test_text_that_looks_like_a_formula_is_text(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    book = write(GOOD)
    book["circuits"]["D2"].value = "=SUM(A1)"
    book["circuits"]["D2"].data_type = "s"
    book.save(folder / "survey.xlsx")
    assert read_folder(folder).circuits[0].notes == "=SUM(A1)"


def test_a_formula_without_a_value_is_not_read_as_empty(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    book = write(GOOD)
    book["runs"]["E2"].value = "=5+5"
    book["circuits"]["D2"].value = "#DIV/0!"
    book.save(folder / "survey.xlsx")
    assert refusal(folder) == [
        "survey.xlsx[circuits]:2:notes: the formula gives '#DIV/0!'; accepted: a value",
        "survey.xlsx[runs]:2:length: the formula has no stored value; accepted: a value, or the file saved by a "
        "spreadsheet program",
    ]


def test_problems_name_workbook_sheet_and_line(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    runs = [*GOOD["runs"], [], ["C1", 2, "p9", "p2", "ten", "2.5 mm2"], ["C1", 3, "p1", "p3", 1, "2.5 mm2", "x"]]
    write(GOOD | {"runs": runs, "loads": []})
    assert refusal(folder) == [
        "survey.xlsx[runs]:4:from: run 2 starts nowhere: no earlier run ends at 'p9'; accepted: way or p1",
        "survey.xlsx[runs]:4:length: 'ten' is not a number with a unit such as '12.5 m'",
        "survey.xlsx[runs]:5: the row has 7 cells, the header 6; accepted: as many as the header",
        "survey.xlsx[loads]: is empty; accepted: a header row, and below it a row for each entry",
    ]


def test_a_sheet_that_is_no_table_is_refused_unless_empty(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    write(GOOD | {"Sheet1": []})
    assert read_folder(folder).name == "Hut"
    write(GOOD | {"load": [["circuit"]]})
    (line,) = refusal(folder)
    assert line.startswith("survey.xlsx[load]: no table has this name; accepted: a sheet named sources, ")
    assert line.endswith("did you mean loads?")


def test_a_table_stands_in_one_file_alone(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    write(GOOD)
    (folder / "runs.csv").write_text("circuit,run,from,to,length [m],size\nC1,1,way,p1,10,2.5 mm2\n")
    assert refusal(folder) == ["survey.xlsx[runs]: the table stands in runs.csv too; accepted: each table once"]


def test_a_damaged_workbook_is_one_line(folder: Path, write: Callable[[Sheets], Workbook]) -> None:
    write(GOOD)
    content = (folder / "survey.xlsx").read_bytes()
    whole = io.BytesIO(content)
    with zipfile.ZipFile(whole) as archive, zipfile.ZipFile(folder / "cut.xlsx", "w") as cut:
        for name in archive.namelist():
            cut.writestr(name, archive.read(name)[:200])
    without_sheets = (folder / "cut.xlsx").read_bytes()
    (folder / "cut.xlsx").unlink()
    for damaged in (b"", b"PK\x03\x04", content[: len(content) // 2], b"circuit,run\n", without_sheets):
        (folder / "survey.xlsx").write_bytes(damaged)
        lines = [line for line in refusal(folder) if not line.startswith(("runs.csv", "circuits.csv"))]
        (line,) = lines
        assert line.startswith("survey.xlsx: cannot be read as an XLSX workbook (")


def test_a_workbook_that_unpacks_without_end_is_refused(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("audit.intake.workbook._MOST_BYTES", 1_000)
    with zipfile.ZipFile(folder / "survey.xlsx", "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/workbook.xml", b"0" * 1_001)
    assert "survey.xlsx: holds 1,001 bytes unpacked; accepted: up to 1,000" in refusal(folder)
