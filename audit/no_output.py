"""Standing in for a standard output that was closed before the program began (``>&-``)."""

from __future__ import annotations

import io
import os

from audit.errors import WrongUse


class NoOutput(io.TextIOBase):
    """A stream for text that nobody can get: whoever writes to it is told so."""

    encoding = "utf-8"
    errors = "strict"

    def __init__(self) -> None:
        super().__init__()
        # Holds descriptor 1, so that no file of ours gets it and takes what is meant for standard output.
        self._held = os.open(os.devnull, os.O_WRONLY)

    def writable(self) -> bool:
        return True

    def write(self, text: object) -> int:
        """
        Refuse.

        Raises
        ------
        WrongUse
            Always, but for an empty text.
        """
        if not text:
            return 0
        raise WrongUse("standard output is closed; accepted: a terminal, a file or a pipe")

    def close(self) -> None:
        if not self.closed:
            os.close(self._held)
        super().close()
