"""Bytes of a file to text: UTF-8, with or without byte order mark."""

from __future__ import annotations


class NotUtf8(Exception):
    """Bytes that are not UTF-8; caught within intake, which names the file."""

    def __init__(self, line: int, what: str) -> None:
        super().__init__(what)
        self.line = line
        """Line on which the first such byte stands."""
        self.what = what


def decode(content: bytes) -> str:
    """
    The text of a file.

    Raises
    ------
    NotUtf8
        With the line and the value of the first byte that is not UTF-8.
    """
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        # error.object is what was left after the byte order mark, if there was one
        line = error.object.count(b"\n", 0, error.start) + 1
        byte = error.object[error.start]
        raise NotUtf8(line, f"byte 0x{byte:02X} is not UTF-8; accepted: the file saved as UTF-8") from None
