"""What is said or asked only where a person sits at a terminal."""

from __future__ import annotations

import sys
from collections.abc import Iterable
from pathlib import Path

_LARGE = 2_000_000
"""Size of input from which on it is worth saying; some tens of thousands of rows. [bytes]"""
_ERASE = "\r\x1b[K"


def is_terminal() -> bool:
    """Whether keys come from a terminal and lines go to one."""
    return sys.stdin.isatty() and sys.stdout.isatty()


class Progress:
    """
    What a long intake is doing, on standard error.

    A line that is written over at each stage and gone at the end; nothing for small input or in a pipe.
    """

    def __init__(self, sources: Iterable[Path]) -> None:
        self._shown = sys.stderr.isatty() and sum(map(_size, sources)) >= _LARGE

    def stage(self, what: str) -> None:
        """Say what begins."""
        if self._shown:
            sys.stderr.write(f"{_ERASE}{what} …")
            sys.stderr.flush()

    def __enter__(self) -> Progress:
        return self

    def __exit__(self, *_: object) -> None:
        if self._shown:
            sys.stderr.write(_ERASE)
            sys.stderr.flush()


def _size(path: Path) -> int:
    try:
        return sum(map(_size, path.iterdir())) if path.is_dir() else path.stat().st_size
    except OSError:  # told when it is read
        return 0
