"""The user's own folder: name, laptop, recent files. Nothing in it may stand in the way of a survey."""

from __future__ import annotations

import json
import os
import re
from pathlib import Path

import click
import pytest

from audit.errors import WrongUse
from audit.settings import MOST_RECENT, UserSettings


def test_the_folder_is_where_the_platform_keeps_settings_or_where_the_variable_says(
    home: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert UserSettings().folder == home
    monkeypatch.delenv("OHMWALK_HOME")
    assert UserSettings().folder == Path(click.get_app_dir("ohmwalk"))
    assert not home.exists()


# --- who writes


def test_who_writes_is_the_first_that_is_given(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("getpass.getuser", lambda: "login")
    assert (UserSettings().who, UserSettings().who_or_login) == ("", "login")
    UserSettings().remember_who("Kept")
    assert UserSettings().who == "Kept"
    monkeypatch.setenv("OHMWALK_BY", "Variable")
    assert UserSettings().who == "Variable"
    assert UserSettings("Option").who == UserSettings("Option").who_or_login == "Option"
    monkeypatch.setenv("OHMWALK_BY", "  ")
    assert UserSettings().who == "Kept"


def test_a_name_that_is_kept_counts_at_once_and_leaves_other_settings(home: Path) -> None:
    home.mkdir()
    (home / "settings.json").write_text('{"colour": "plain", "by": "Old"}')
    settings = UserSettings()
    settings.remember_who(" Ann Öz ")
    assert settings.who == UserSettings().who == "Ann Öz"
    assert json.loads((home / "settings.json").read_text()) == {"colour": "plain", "by": "Ann Öz"}


@pytest.mark.parametrize("name", ["", "  ", "a\x1b[2J", "two\nlines", "\u202eabc", "x" * 201])
def test_what_cannot_be_a_name_is_refused(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(WrongUse, match=r"^--by: .*accepted: a name") as refused:
        UserSettings(name)
    assert str(refused.value).isprintable()
    with pytest.raises(WrongUse, match=r"^name: "):
        UserSettings().remember_who(name)
    if name.strip():
        monkeypatch.setenv("OHMWALK_BY", name)
        with pytest.raises(WrongUse, match=r"^OHMWALK_BY: "):
            UserSettings()


@pytest.mark.parametrize("error", [KeyError("no such user"), OSError("no user name"), ImportError("no pwd")])
def test_a_system_that_knows_no_name_has_one_all_the_same(error: Exception, monkeypatch: pytest.MonkeyPatch) -> None:
    def nameless() -> str:
        raise error

    monkeypatch.setattr("getpass.getuser", nameless)
    assert UserSettings().who_or_login == "unknown"


# --- the laptop


def test_the_laptop_gets_a_random_id_once() -> None:
    first = UserSettings().laptop
    assert re.fullmatch("[0-9a-f]{32}", first)
    assert UserSettings().laptop == first


def test_another_home_is_another_laptop(tmp_path: Path) -> None:
    assert UserSettings(folder=tmp_path / "a").laptop != UserSettings(folder=tmp_path / "b").laptop


# --- recent site files


def test_recent_files_come_latest_first_and_those_that_are_gone_are_marked(tmp_path: Path) -> None:
    settings = UserSettings()
    assert settings.recent() == ()
    for name in ("a", "b", "a"):
        (tmp_path / name).touch()
        settings.opened(tmp_path / name)
    (tmp_path / "b").unlink()
    assert [(site.path.name, site.is_there) for site in UserSettings().recent()] == [("a", True), ("b", False)]


def test_a_relative_path_is_found_again_from_elsewhere(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    UserSettings().opened(Path("a"))
    monkeypatch.chdir("/")
    assert UserSettings().recent()[0].path == tmp_path / "a"


def test_no_more_than_some_files_are_remembered(tmp_path: Path) -> None:
    settings = UserSettings()
    for n in range(MOST_RECENT + 3):
        settings.opened(tmp_path / str(n))
    names = [site.path.name for site in settings.recent()]
    assert names == [str(n) for n in range(MOST_RECENT + 2, 2, -1)]


def test_a_name_that_is_no_unicode_is_remembered(tmp_path: Path) -> None:
    path = tmp_path / os.fsdecode(b"\xff.ohmwalk")
    UserSettings().opened(path)
    assert UserSettings().recent()[0].path == path


# --- what is damaged or cannot be written


@pytest.mark.parametrize("content", [b"", b"{", b"[1]", b"\xff\xfe", b'"x"', b"[" * 5000])
def test_damaged_settings_are_a_line_and_nothing_stops(
    content: bytes, home: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr("getpass.getuser", lambda: "login")
    home.mkdir()
    (home / "settings.json").write_bytes(content)
    settings = UserSettings()
    assert settings.who == ""
    assert settings.who_or_login == "login"
    settings.tell()
    told = capsys.readouterr()
    assert told.out == ""
    assert re.fullmatch(rf"{re.escape(str(home))}/settings\.json: is damaged.*\n", told.err)
    settings.tell()
    assert capsys.readouterr().err == ""
    settings.remember_who("Ann")
    assert UserSettings().who == "Ann"


def test_a_kept_name_that_is_none_is_passed_over(home: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("getpass.getuser", lambda: "login")
    home.mkdir()
    (home / "settings.json").write_text('{"by": ["Ann"]}')
    settings = UserSettings()
    assert settings.who_or_login == "login"
    assert settings.complaints == [f'{home / "settings.json"}: "by" is no name; it is passed over']


def test_a_damaged_list_of_recent_files_begins_anew(home: Path, tmp_path: Path) -> None:
    home.mkdir()
    (home / "recent.json").write_text('{"a": 1}')
    settings = UserSettings()
    assert settings.recent() == ()
    assert len(settings.complaints) == 1
    settings.opened(tmp_path / "a")
    (home / "recent.json").write_text(json.dumps([str(tmp_path / "a"), 7, "", "nul\x00"]))
    assert [(site.path.name, site.is_there) for site in UserSettings().recent()] == [("a", False), ("nul\x00", False)]


def test_a_damaged_laptop_id_is_replaced_and_told(home: Path) -> None:
    home.mkdir()
    (home / "laptop").write_text("")
    settings = UserSettings()
    new = settings.laptop
    assert settings.complaints == [f"{home / 'laptop'}: is damaged; this laptop gets a new id"]
    assert UserSettings().laptop == new


def test_a_folder_that_cannot_be_written_is_told_and_the_session_goes_on(tmp_path: Path) -> None:
    (tmp_path / "file").touch()
    settings = UserSettings("Ann", folder=tmp_path / "file")
    assert re.fullmatch("[0-9a-f]{32}", settings.laptop)
    assert settings.laptop == settings.laptop
    settings.opened(tmp_path / "a")
    assert settings.who == "Ann"
    assert any("laptop: cannot be written: " in line for line in settings.complaints)
    assert any("recent.json: cannot be written: " in line for line in settings.complaints)


def test_what_fails_half_way_leaves_the_old_settings(home: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    UserSettings().remember_who("Ann")

    def full(_: int) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "fsync", full)
    settings = UserSettings()
    settings.remember_who("Bob")
    assert settings.complaints == [f"{home / 'settings.json'}: cannot be written: No space left on device"]
    assert UserSettings().who == "Ann"
    assert os.listdir(home) == ["settings.json"]
