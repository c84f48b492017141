"""The terminal as commands write to it."""

from __future__ import annotations

from rich.console import Console


class PlainConsole(Console):
    """Site text is literal, numbers are not coloured, and a reader who leaves is no error of ours."""

    def __init__(self, **options: object) -> None:
        super().__init__(highlight=False, markup=False, emoji=False, **options)  # type: ignore[arg-type]

    def on_broken_pipe(self) -> None:
        """Leave it to ``audit.cli``, which ends quietly; rich would end with status 1."""
        raise BrokenPipeError
