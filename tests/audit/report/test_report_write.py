"""Writing a report: the ending chooses the form, and a target is whole or untouched."""

from __future__ import annotations

import json
import stat
from pathlib import Path

import pytest

from audit.errors import TargetExists, WriteFailed, WrongUse
from audit.report.write import FORMS, check_target, write_report
from rules.assessment import Assessment
from rules.record import Site


@pytest.mark.parametrize("ending", FORMS)
def test_each_ending_writes_its_form(site: Site, assessment: Assessment, tmp_path: Path, ending: str) -> None:
    target = tmp_path / f"audit{ending}"
    write_report(site, assessment, target)
    text = target.read_text(encoding="utf-8")
    assert {
        ".html": text.startswith("<!doctype html>"),
        ".md": text.startswith("# D.c. distribution audit"),
        ".csv": text.startswith('\ufeff"site"'),
        ".json": text.startswith("{"),
    }[ending]
    assert [path.name for path in tmp_path.iterdir()] == [target.name]
    assert stat.S_IMODE(target.stat().st_mode) & 0o400


def test_an_upper_case_ending_is_the_same_form(site: Site, assessment: Assessment, tmp_path: Path) -> None:
    write_report(site, assessment, tmp_path / "AUDIT.JSON", "supervisor", made_at="today")
    report = json.loads((tmp_path / "AUDIT.JSON").read_text(encoding="utf-8"))["report"]
    assert (report["for"], report["made_at"]) == ("supervisor", "today")


def test_two_runs_write_the_same_bytes(site: Site, assessment: Assessment, tmp_path: Path) -> None:
    for ending in FORMS:
        for name in ("a", "b"):
            write_report(site, assessment, tmp_path / f"{name}{ending}")
        assert (tmp_path / f"a{ending}").read_bytes() == (tmp_path / f"b{ending}").read_bytes()


@pytest.mark.parametrize(
    ("name", "line"),
    [
        ("audit.htm", "no report has the ending '.htm', did you mean '.html'?; accepted: .html, .md, .csv or .json"),
        ("audit", "no report has 'audit' without an ending; accepted: .html, .md, .csv or .json"),
        ("audit.exe", "no report has the ending '.exe'; accepted: .html, .md, .csv or .json"),
    ],
)
def test_an_unknown_ending_is_refused(site: Site, assessment: Assessment, tmp_path: Path, name: str, line: str) -> None:
    with pytest.raises(WrongUse) as refused:
        write_report(site, assessment, tmp_path / name)
    assert str(refused.value) == line
    assert not list(tmp_path.iterdir())


def test_an_unknown_audience_is_refused(site: Site, assessment: Assessment, tmp_path: Path) -> None:
    with pytest.raises(WrongUse, match="did you mean 'inspector'"):
        write_report(site, assessment, tmp_path / "a.md", "inspectors")


def test_what_is_there_stays_unless_told_otherwise(site: Site, assessment: Assessment, tmp_path: Path) -> None:
    target = tmp_path / "audit.md"
    target.write_text("mine", encoding="utf-8")
    with pytest.raises(TargetExists):
        write_report(site, assessment, target)
    assert target.read_text(encoding="utf-8") == "mine"
    write_report(site, assessment, target, overwrite=True)
    assert target.read_text(encoding="utf-8") != "mine"


def test_a_link_to_nothing_counts_as_there(tmp_path: Path) -> None:
    (tmp_path / "audit.md").symlink_to(tmp_path / "gone.md")
    with pytest.raises(TargetExists):
        check_target(tmp_path / "audit.md", overwrite=False)


@pytest.mark.parametrize("overwrite", [False, True])
def test_a_folder_is_no_target(tmp_path: Path, overwrite: bool) -> None:
    (tmp_path / "audit.md").mkdir()
    with pytest.raises(WriteFailed, match="is a folder"):
        check_target(tmp_path / "audit.md", overwrite)


def test_a_missing_folder_is_named(tmp_path: Path) -> None:
    with pytest.raises(WriteFailed, match="is not there; make it first"):
        check_target(tmp_path / "none" / "audit.md", overwrite=False)


def test_a_failed_write_leaves_what_was_there(
    site: Site, assessment: Assessment, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def full(descriptor: int) -> None:
        raise OSError(28, "No space left on device")

    target = tmp_path / "audit.md"
    target.write_text("mine", encoding="utf-8")
    monkeypatch.setattr("os.fsync", full)
    with pytest.raises(WriteFailed, match="could not be written: No space left on device"):
        write_report(site, assessment, target, overwrite=True)
    assert target.read_text(encoding="utf-8") == "mine"
    assert [path.name for path in tmp_path.iterdir()] == ["audit.md"]
