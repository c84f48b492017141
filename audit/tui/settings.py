"""What the interface asks of the user's settings."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol


class UserSettings(Protocol):
    """Kept on this laptop, never in the site file."""

    laptop: str
    """Random id of this laptop."""

    @property
    def who(self) -> str:
        """The name to save under; empty while it is not known."""

    def remember_who(self, who: str) -> None:
        """Keep the name for the next time."""


@dataclass
class PassingSettings:
    """Settings that last as long as the program."""

    laptop: str
    who: str = ""

    def remember_who(self, who: str) -> None:
        self.who = who
