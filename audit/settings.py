"""
What belongs to the person at this laptop and not to a site: name, the laptop's id, recent site files, drafts.

It lies in the user's settings folder: ``OHMWALK_HOME``, else where the platform keeps settings.

```
settings.json   {"by": "Ann"}: the person's name
laptop          the laptop's random id, made once
recent.json     paths of the site files opened last, the latest first
drafts/         what was being typed
```

Nothing in here may stand in the way of a survey: what cannot be read or written is a line in ``complaints``,
and the work goes on without it.
"""

from __future__ import annotations

import getpass
import json
import os
import re
import secrets
from contextlib import suppress
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import click

from audit.errors import WrongUse
from rules.text import clean, forbidden_character, quoted

HOME_VARIABLE = "OHMWALK_HOME"
BY_VARIABLE = "OHMWALK_BY"
MOST_RECENT = 20
"""How many site files are remembered."""
_LONGEST_NAME = 200
_LAPTOP = re.compile(r"[0-9a-f]{32}")
_NAMELESS = "unknown"
"""Who writes where even the system knows no name, as in a container."""


@dataclass(frozen=True, slots=True)
class RecentSite:
    """A site file that was opened."""

    path: Path
    is_there: bool
    """``False`` for one that was moved or deleted, or lies on a stick that is not plugged in."""


class UserSettings:
    """The settings folder of one user, read when something is asked for."""

    folder: Path
    complaints: list[str]
    """What could not be read or written, a line each, for whoever shows lines."""

    def __init__(self, by: str | None = None, folder: Path | None = None) -> None:
        """
        Open the settings.

        Parameters
        ----------
        by
            The name given with ``--by``, which goes before every other.
        folder
            Where they lie; the user's settings folder unless given.

        Raises
        ------
        WrongUse
            If a name from ``--by`` or ``OHMWALK_BY`` cannot be one.
        """
        home = os.environ.get(HOME_VARIABLE) or click.get_app_dir("ohmwalk")
        self.folder = Path(home) if folder is None else folder
        self.complaints = []
        self._given = None if by is None else _name("--by", by)
        from_environment = os.environ.get(BY_VARIABLE, "").strip()
        if self._given is None and from_environment:
            self._given = _name(BY_VARIABLE, from_environment)
        self._laptop: str | None = None

    # --- who writes

    @property
    def who(self) -> str:
        """
        Who writes, as a person said: ``--by``, else ``OHMWALK_BY``, else the name in the settings.

        Empty where no one has said; the interface then asks at the first save.
        """
        return self._given or self._kept_name()

    @property
    def who_or_login(self) -> str:
        """Who writes; the login name where no one has said."""
        return self.who or _login_name()

    def remember_who(self, name: str) -> None:
        """
        Keep the person's name for the next time.

        Raises
        ------
        WrongUse
            If it cannot be a name.
        """
        self._given = _name("name", name)
        kept = self._read_json("settings.json", dict)
        self._write("settings.json", json.dumps({**kept, "by": self._given}, indent=2) + "\n")

    def _kept_name(self) -> str:
        name = self._read_json("settings.json", dict).get("by", "")
        if isinstance(name, str) and _wrong_with_name(name) is None:
            return name.strip()
        if name != "":
            self._complain(self.folder / "settings.json", '"by" is no name; it is passed over')
        return ""

    # --- the laptop

    @property
    def laptop(self) -> str:
        """Random id of this laptop, made when it is first asked for; 32 hexadecimal digits."""
        if self._laptop is None:
            self._laptop = self._kept_laptop() or self._new_laptop()
        return self._laptop

    def _kept_laptop(self) -> str | None:
        text = self._read("laptop")
        if text is None:
            return None
        if _LAPTOP.fullmatch(text.strip()):
            return text.strip()
        self._complain(self.folder / "laptop", "is damaged; this laptop gets a new id")
        return None

    def _new_laptop(self) -> str:
        id_ = secrets.token_hex(16)
        self._write("laptop", id_ + "\n")
        return id_

    # --- recent site files

    def recent(self) -> tuple[RecentSite, ...]:
        """The site files opened last, the latest first, those that are gone marked."""
        paths = [Path(path) for path in self._read_json("recent.json", list) if isinstance(path, str) and path]
        return tuple(RecentSite(path, _is_there(path)) for path in dict.fromkeys(paths))

    def opened(self, path: Path) -> None:
        """Remember a site file as the one opened last."""
        latest = str(path.absolute())
        before = [str(site.path) for site in self.recent() if str(site.path) != latest]
        self._write("recent.json", json.dumps([latest, *before][:MOST_RECENT], indent=2) + "\n")

    # --- drafts

    @property
    def drafts(self) -> Path:
        """The folder of drafts; it need not be there."""
        return self.folder / "drafts"

    # --- complaints

    def tell(self) -> None:
        """Say on standard error what could not be read or written, each thing once; for commands that write lines."""
        for line in self.complaints:
            click.echo(line, err=True)
        self.complaints.clear()

    # --- files

    def _read(self, name: str) -> str | None:
        """The text of a file; ``None`` where it is not there or cannot be read."""
        try:
            return (self.folder / name).read_text(encoding="utf-8")
        except FileNotFoundError:
            return None
        except UnicodeDecodeError:
            self._complain(self.folder / name, "is damaged (not UTF-8); it is passed over")
        except OSError as error:
            self._complain(self.folder / name, f"cannot be read: {error.strerror}")
        return None

    def _read_json(self, name: str, kind: type[Any]) -> Any:
        """What a JSON file holds; an empty ``kind`` where it is not there or is damaged."""
        text = self._read(name)
        if text is None:
            return kind()
        try:
            found = json.loads(text)
        except (ValueError, RecursionError):
            found = None
        if isinstance(found, kind):
            return found
        self._complain(self.folder / name, "is damaged; it is passed over")
        return kind()

    def _write(self, name: str, text: str) -> None:
        """Write a file whole or not at all."""
        part = self.folder / f".{name}.{secrets.token_hex(4)}"
        try:
            self.folder.mkdir(parents=True, exist_ok=True)
            with part.open("w", encoding="utf-8") as file:
                file.write(text)
                file.flush()
                os.fsync(file.fileno())
            os.replace(part, self.folder / name)
        except OSError as error:
            self._complain(self.folder / name, f"cannot be written: {error.strerror}")
            with suppress(OSError):
                part.unlink()

    def _complain(self, path: Path, what: str) -> None:
        line = f"{clean(str(path))}: {what}"
        if line not in self.complaints:
            self.complaints.append(line)


def _name(place: str, text: str) -> str:
    wrong = _wrong_with_name(text)
    if wrong is not None:
        raise WrongUse(f"{place}: {wrong}; accepted: a name of up to {_LONGEST_NAME} characters")
    return text.strip()


def _wrong_with_name(text: str) -> str | None:
    if not text.strip():
        return "the name is empty"
    if len(text) > _LONGEST_NAME:
        return f"the name has {len(text):,} characters"
    return f"{quoted(text)} holds control characters" if forbidden_character(text.strip()) is not None else None


def _login_name() -> str:
    try:
        name = getpass.getuser()
    except (KeyError, OSError, ImportError):  # a user id without a name; what is raised differs by version
        return _NAMELESS
    return clean(name.strip())[:_LONGEST_NAME] or _NAMELESS


def _is_there(path: Path) -> bool:
    try:
        return path.is_file()
    except (OSError, ValueError):  # a name that no disk can hold
        return False
