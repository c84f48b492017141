"""What the interface asks of the user's settings."""

from __future__ import annotations

import getpass
from dataclasses import dataclass
from typing import Protocol


class UserSettings(Protocol):
    """Kept on this laptop, never in the site file."""

    @property
    def laptop(self) -> str:
        """Random id of this laptop."""

    @property
    def who_or_login(self) -> str:
        """The name, or that of the login where none is known."""

    @property
    def who(self) -> str:
        """The name to save under; empty while it is not known."""

    def remember_who(self, name: str, /) -> None:
        """Keep the name for the next time."""


@dataclass
class PassingSettings:
    """Settings that last as long as the program."""

    laptop: str
    who: str = ""

    @property
    def who_or_login(self) -> str:
        return self.who or getpass.getuser()

    def remember_who(self, name: str, /) -> None:
        self.who = name
