"""
How a spreadsheet shows a number: its number format's own texts, padding and scale, by ECMA-376 part 1, 18.8.31.

The digits that a format hides by rounding are kept: the value is what was entered.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from rules.text import quoted

_DIGITS = 15
"""Significant digits that a spreadsheet shows of a number at most."""
_TOKEN = re.compile(
    r'"(?P<text>[^"]*)"|\\(?P<escaped>.)|_(?P<space>.)|\*(?P<fill>.)|\[(?P<bracket>[^\]]*)\]'
    r"|(?P<exponent>[Ee][+-][0#?]+)|(?P<digit>[0#?.,])|(?P<percent>%)|(?P<other>.)",
    re.DOTALL,
)
_COLOUR = re.compile(r"black|blue|cyan|green|magenta|red|white|yellow|color ?\d+", re.IGNORECASE)
_SECTION = re.compile(r'(?:"[^"]*"|\\.|\[[^\]]*\]|[^;"\\\[])*', re.DOTALL)
_MOST_SECTIONS = 4


class NotShown(Exception):
    """A number format whose number cannot be told as people see it; caught within intake."""


@dataclass(slots=True)
class _Section:
    """What one section of a format shows around the digits."""

    before: str = ""
    after: str = ""
    integer: str = ""
    """Placeholders before the decimal point."""
    has_digits: bool = False
    thousands: int = 0
    """Commas after the last digit, each of which divides what is shown by 1000."""
    percents: int = 0
    plain: bool = False
    """The number stands in a form of its own: General, a fraction, a power of ten."""


def shown(value: float, number_format: str) -> str:
    """
    A number as people see it, with all its digits.

    Parameters
    ----------
    value : float
        What the cell holds.
    number_format : str
        The cell's format as the workbook has it.

    Raises
    ------
    NotShown
        If the format shows another number, or none.

    Examples
    --------
    >>> shown(45, '0.0" ft"'), shown(7, "000"), shown(0.035, "0.0%"), shown(3.5, '0.0"%"')
    ('45 ft', '007', '3.5 %', '3.5%')
    """
    sections = _sections(number_format)
    negative = value < 0
    own_negative = negative and len(sections) > 1
    place = 1 if own_negative else 2 if value == 0 and len(sections) > 2 else 0
    section = _read(sections[place], number_format)
    if not section.has_digits and not section.plain:
        text = (section.before + section.after).strip()
        if not text:
            raise NotShown(f"the number format {quoted(number_format)} shows nothing of the cell's number")
        return text
    number = _number(abs(value), section)
    before, after = section.before, section.after
    if own_negative:
        if "(" in before and ")" in after:
            before, after = before.replace("(", "", 1), after.replace(")", "", 1)
        elif "-" in before:
            before = before.replace("-", "", 1)
        else:
            raise NotShown(f"the number format {quoted(number_format)} shows a negative number without its sign")
    sign = "-" if negative else ""
    return f"{before.strip()}{sign}{number}{after.rstrip()}"


def _sections(number_format: str) -> list[str]:
    """The parts for positive, negative, zero and text."""
    parts: list[str] = []
    at = 0
    while at <= len(number_format) and len(parts) < _MOST_SECTIONS:
        found = _SECTION.match(number_format, at)
        end = found.end() if found else at
        parts.append(number_format[at:end])
        at = end + 1
    return parts[:3]


def _read(text: str, number_format: str) -> _Section:
    """The parts of one section."""
    section = _Section()
    if text.strip().casefold() in ("general", "standard", "@", "") and not (text == "" and number_format):
        section.plain = True
        return section
    if re.match(r"general", text, re.IGNORECASE):  # General" V"
        section.plain, text = True, text[len("general") :]
    is_fraction = "/" in re.sub(r'"[^"]*"|\\.|\[[^\]]*\]', "", text)
    in_decimals = ended = False
    commas = 0
    for found in _TOKEN.finditer(text):
        kind, content = found.lastgroup, found[found.lastgroup or 0]
        if kind == "digit":
            if ended and not is_fraction:
                raise NotShown(f"the number format {quoted(number_format)} shows text between digits")
            if content == ",":
                commas += section.has_digits
                continue
            section.has_digits, commas = True, 0
            in_decimals = in_decimals or content == "."
            if not in_decimals:
                section.integer += content
        elif kind == "exponent":
            section.plain = True
        elif kind == "percent":
            section.percents += 1
            ended = section.has_digits
        elif kind == "fill":
            continue
        else:
            literal = _literal(kind, content, number_format)
            if section.has_digits or section.plain:
                ended = ended or bool(literal)
                section.after += "" if is_fraction and literal in (" ", "/") else literal
            else:
                section.before += literal
    section.thousands = commas
    section.plain = section.plain or is_fraction
    return section


def _literal(kind: str | None, content: str, number_format: str) -> str:
    """The text that a token shows."""
    if kind == "space":
        return " "
    if kind != "bracket":
        return content
    if content.startswith("$"):  # a currency and a language: [$EUR-407]
        return content[1:].partition("-")[0]
    if _COLOUR.fullmatch(content):
        return ""
    raise NotShown(f"the number format {quoted(number_format)} depends on the value")


def _number(value: float, section: _Section) -> str:
    """The digits, with the sign of a percentage."""
    scaled = value * 100**section.percents / 1000**section.thousands
    number = f"{scaled:.{_DIGITS}g}"
    least = section.integer.count("0")
    if not section.plain and "e" not in number:
        whole, point, decimals = number.partition(".")
        number = whole.zfill(least) + point + decimals
    return f"{number} {'%' * section.percents}" if section.percents else number
