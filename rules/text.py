"""Text from outside: which characters may stand in it, how it is shown, and the nearest known word."""

from __future__ import annotations

import difflib
import re
from collections.abc import Collection, Iterable

MOST_CHARACTERS = 10_000
"""The longest text that a cell may hold."""

_FORBIDDEN = re.compile(
    "[\x00-\x1f\x7f-\x9f"  # C0, DEL, C1: they steer a terminal
    "\u061c\u200e\u200f\u202a-\u202e\u2066-\u2069"  # bidirectional controls: they show text in another order
    "\ud800-\udfff]"  # halves of surrogate pairs: no UTF-8 file can hold them
)
_NEWLINE_OR_TAB = re.compile(r"[\n\t]")
_MOST_COMPARED = 200_000
_MOST_SHOWN = 60


def forbidden_character(text: str, *, lines: bool = False) -> str | None:
    """
    The first character that may not stand in a text of the record, or ``None``.

    Parameters
    ----------
    text : str
        As read from a file or typed.
    lines : bool
        Newline and tab are allowed, as they are in notes.

    Examples
    --------
    >>> forbidden_character("pump\\x1b[2J")
    '\\x1b'
    >>> forbidden_character("see\\nbelow", lines=True) is None
    True
    """
    if text.isprintable():  # nearly every text is, and this is ten times as quick as the search
        return None
    for match in _FORBIDDEN.finditer(text):
        if not (lines and match.group() in "\n\t"):
            return match.group()
    return None


def clean(text: str, *, lines: bool = False) -> str:
    """
    The text as it may be shown: what may not stand in a text becomes U+FFFD.

    Newline and tab stay where ``lines`` is true and become a space where it is not.

    Examples
    --------
    >>> clean("a\\x1b[2J\\tb")
    'a\\ufffd[2J b'
    """
    if text.isprintable():
        return text
    if not lines:
        return _FORBIDDEN.sub("\ufffd", _NEWLINE_OR_TAB.sub(" ", text))
    return _FORBIDDEN.sub(lambda match: match.group() if match.group() in "\n\t" else "\ufffd", text)


def quoted(text: str) -> str:
    """
    The text in quotes, cleaned and cut, so that it fits into one line of an error.

    Examples
    --------
    >>> quoted("ten m")
    "'ten m'"
    """
    return f"'{clean(_cut(text))}'"


def _cut(text: str) -> str:
    return text if len(text) <= _MOST_SHOWN else text[: _MOST_SHOWN - 1] + "…"


def either(words: Collection[str], most: int = 12) -> str:
    """
    The words as a list in a sentence, long ones cut, the list after ``most``.

    Examples
    --------
    >>> either(["own", "structure", "shared:NAME"])
    'own, structure or shared:NAME'
    """
    shown = [clean(_cut(word)) for word in words]
    if len(shown) > most:
        return ", ".join(shown[:most]) + f" and {len(shown) - most} more"
    return " or ".join(filter(None, [", ".join(shown[:-1]), *shown[-1:]]))


def nearest(word: str, known: Collection[str]) -> str | None:
    """
    The known word that a misspelt one was most probably meant to be, or ``None``.

    Examples
    --------
    >>> nearest("lenght", ["length", "size", "material"])
    'length'
    >>> nearest("colour", ["length", "size"]) is None
    True
    """
    folded = word.casefold()
    for candidate in known:
        if candidate.casefold() == folded:
            return candidate
    matches = difflib.get_close_matches(word, known, n=1)
    return matches[0] if matches else None


def nearest_choice(word: str, choices: Collection[str]) -> str | None:
    """
    The choice that a misspelt word was most probably meant to be; none where a numeral is all that tells choices apart.

    >>> nearest_choice("brekaer B", ["breaker B", "fuse gG"]), nearest_choice("CAT 3", ["CAT II", "CAT III", "CAT IV"])
    ('breaker B', None)
    >>> nearest_choice("cat iii", ["CAT II", "CAT III", "CAT IV"])
    'CAT III'
    """
    near = nearest(word, choices)
    last = [choice.split()[-1] for choice in choices]
    by_numeral = len(last) > 1 and all(set(numeral) <= set("IVX") for numeral in last)
    return near if near is None or not by_numeral or near.casefold() == word.casefold() else None


class Suggestions:
    """
    Nearest known words for one pass over a record.

    A record of 100,000 circuits whose boards are all misspelt must not take hours to refuse: once it
    has compared ``_MOST_COMPARED`` words it suggests no more.
    """

    def __init__(self) -> None:
        self._compared = 0

    def ask(self, word: str, known: Iterable[str]) -> str:
        """``, did you mean 'B1-07'?``, or an empty text where nothing comes near."""
        if self._compared > _MOST_COMPARED:
            return ""
        words = list(known)
        self._compared += len(words)
        near = nearest(word[:_MOST_SHOWN], words)
        return "" if near is None else f", did you mean {quoted(near)}?"
