"""
Words of ``ohmwalk drop``: each quantity is known by its unit, so that they may come in any order.

Nothing is guessed: a number without a unit and a text that can be read two ways are refused.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field

from audit.errors import WrongUse
from rules.columns import NEAREST_ZERO, Column
from rules.problems.settings import SETTINGS
from rules.record import METALS, STRANDINGS, columns
from rules.tables.conductors import area_mm2
from rules.text import quoted
from rules.unit_words import SAME_SIGNS, column_unit
from rules.units import parse, parse_size


@dataclass(frozen=True, slots=True)
class Quantity:
    """One thing that can be typed, and within which bounds: those of the record's column, where it has one."""

    name: str
    example: str
    unit: str
    column: Column = field(default_factory=lambda: Column(""))
    above: float | None = None
    """Where the record takes 0 and a drop does not."""


def _bounds(table: str, name: str) -> Column:
    return next(column for _, column in columns(table) if column.name == name)


LENGTH = Quantity("length", "29m", "m", _bounds("runs", "length"))
SIZE = Quantity("size", "4mm2 or 12AWG", "")
NOMINAL = Quantity("nominal voltage", "24V", "V", _bounds("circuits", "nominal"), above=0.0)
CURRENT = Quantity("current", "8A", "A", _bounds("loads", "current"), above=0.0)
POWER = Quantity("power", "60W", "W", _bounds("loads", "power"), above=0.0)
RESISTANCE = Quantity("load resistance", "3ohm", "ohm", _bounds("loads", "resistance"), above=0.0)
ALLOWED = Quantity("allowed drop", "5%", "%", _bounds("circuits", "allowed_drop"), above=0.0)
TEMPERATURE = Quantity("conductor temperature", "70C", "degC", _bounds("runs", "temperature"))
AMBIENT = Quantity("ambient temperature", "35C", "degC", SETTINGS["ambient"][1])
LOWEST = Quantity("lowest voltage", "20.4V", "V", _bounds("loads", "lowest"), above=0.0)
DUTY = Quantity("duty", "20%", "%", Column("duty", "number", "%", least=0, most=100))

BY_UNIT = {each.unit: each for each in (LENGTH, NOMINAL, CURRENT, POWER, RESISTANCE, ALLOWED, TEMPERATURE)}
"""What a unit says of a word; a size has no unit of its own but is told by its look."""
EXAMPLES = "29m 95ft 4mm2 12AWG 24V 8A 60W 3ohm 5% 70C"

_LOOKS_LIKE_A_SIZE = re.compile(r"awg|kcmil|mcm|^#|^[1-9]/0|mm ?(2|²|\^2)|sq", re.IGNORECASE)
_WAITS = re.compile(r"[+-]?[0-9.,]+(e[+-]?[0-9]+)?|[1-9]/0|#[0-9]+|[0-9.,]+ ?sq|awg", re.IGNORECASE)
"""A text that goes on in the next word: a number without its unit, ``AWG`` without its number."""
_NUMBER = re.compile(r"[+-]?[0-9.,]+(?:[eE][+-]?[0-9]+)?")
_FEET = re.compile(r"[0-9.]+ *(ft|foot|feet|')", re.IGNORECASE)
_INCHES = re.compile(r"[0-9.]+ *(in|inch|inches|\"|'')", re.IGNORECASE)

_CHOICES = {word: f"--material {word}" for word in METALS} | {word: f"--stranding {word}" for word in STRANDINGS}


def joined(words: Sequence[str]) -> list[str]:
    """
    Texts of quantities: a number and its unit may come as two words, feet and inches as four.

    >>> joined(["45", "ft", "6", "in", "AWG", "12", "1.5", "mm2", "8A"])
    ['45 ft 6 in', 'AWG 12', '1.5 mm2', '8A']
    """
    texts: list[str] = []
    for word in words:
        if texts and _WAITS.fullmatch(texts[-1]) and _goes_on(texts[-1], word):
            texts[-1] += f" {word}"
        else:
            texts.append(word)
    whole: list[str] = []
    for text in texts:
        if whole and _FEET.fullmatch(whole[-1]) and _INCHES.fullmatch(text):
            whole[-1] += f" {text}"
        else:
            whole.append(text)
    return whole


def quantity_of(text: str) -> Quantity:
    """
    What a text is about.

    >>> quantity_of("24 V").name, quantity_of("4/0").name, quantity_of("45 ft 6 in").name
    ('nominal voltage', 'size', 'length')

    Raises ``WrongUse`` where it is about nothing that is asked for, or readable two ways.
    """
    cleaned = text.translate(SAME_SIGNS).strip()
    if _LOOKS_LIKE_A_SIZE.search(cleaned):
        return SIZE
    if cleaned.casefold() in _CHOICES:
        raise WrongUse(f"{quoted(text)} is no quantity; write {_CHOICES[cleaned.casefold()]}")
    number = _NUMBER.match(cleaned)
    typed = cleaned[number.end() :].strip() if number else ""
    if number and not typed:
        raise WrongUse(f"{quoted(text)} has no unit, so that it may be anything; accepted is something like {EXAMPLES}")
    if number and typed.casefold() == "mm":
        raise WrongUse(
            f"{quoted(text)} can be read two ways: write {number.group()}mm2 for a size, or a length in m or ft"
        )
    unit = LENGTH.unit if _FEET.match(cleaned) else column_unit(typed)
    if unit not in BY_UNIT:
        raise WrongUse(f"{quoted(text)} is no quantity that is asked for; accepted is something like {EXAMPLES}")
    return BY_UNIT[unit]


def number(text: str, quantity: Quantity) -> float:
    """
    The value of a text in the unit of its quantity.

    >>> number("1.2 kW", POWER)
    1200.0

    Raises ``WrongUse`` outside the quantity's bounds, ``RulesError`` where it cannot be read.
    """
    value = parse(text, quantity.unit)
    least, most = quantity.column.least, quantity.column.most
    if quantity.above is not None and value <= quantity.above:
        bound = f"must be above {quantity.above:g}"
    elif least is not None and value < least:
        bound = f"must be {least:.12g} or more"
    elif most is not None and value > most:
        bound = f"must be {most:.12g} or less"
    elif 0 < abs(value) < NEAREST_ZERO:
        bound = f"must be {NEAREST_ZERO:g} or more"
    else:
        return value
    raise WrongUse(f"the {quantity.name} {bound} {quantity.unit}, got {quoted(text)}")


def size(text: str) -> str:
    """
    The canonical text of a size that the tables know.

    >>> size("AWG 12")
    '12 AWG'

    Raises ``RulesError`` where it cannot be read or no table has it.
    """
    canonical = parse_size(text)
    area_mm2(canonical)
    return canonical


def _goes_on(waiting: str, word: str) -> bool:
    """A unit goes on with a number, a number with ``AWG``; a word of an option with neither."""
    is_number = _NUMBER.match(word) is not None
    return is_number == (waiting.casefold() == "awg") and word.casefold() not in _CHOICES
