"""
The errors of ``audit``.

AuditError
├── WrongUse        an option or name that a command cannot take
├── IntakeRefused   a site folder that does not hold together: a line for each problem, all in one go
├── TargetExists    something stands where a file or folder is to be written
├── WriteFailed     it could not be written: no permission, no space
└── SiteDamaged     a site file that is not whole
"""

from __future__ import annotations

from pathlib import Path


class AuditError(Exception):
    """Base of all errors that ``audit`` raises on purpose; its lines are fit for a user."""

    exit_status = 2

    def __init__(self, *lines: str) -> None:
        super().__init__("\n".join(lines))
        self.lines = lines
        """One line for each thing that is wrong."""


class WrongUse(AuditError):
    """An option or name that a command cannot take."""


class IntakeRefused(AuditError):
    """Input that was not taken in."""

    def __init__(self, lines: tuple[str, ...]) -> None:
        super().__init__("\n".join(lines))
        self.lines = lines
        """``FILE:ROW:COLUMN: what is wrong and what is accepted``, a line for each problem."""


class TargetExists(AuditError):
    """Nothing is overwritten unasked."""

    def __init__(self, target: Path) -> None:
        super().__init__(f"{target} exists already; accepted: another name, or --overwrite")


class WriteFailed(AuditError):
    """A file or folder that could not be written."""


class SiteDamaged(AuditError):
    """A site file that can be opened but is not whole."""

    exit_status = 3
