"""
People's text to a number, and a number to people's text.

Inside the program every value is a plain float in its column's own unit. This is the one place where text
becomes such a number and the only module that imports pint, and only once a typed unit differs from the
column's. pint's own parser never sees what a person typed (it reads ``1,5 m`` as 15 m): a strict pattern
sets number and unit apart, and the unit must stand in the list of ``rules.unit_words``.

Numbers: a point is the decimal point, and so is a lone comma unless it could separate thousands, which it can
where one to three digits without a leading zero stand before it and exactly three after: ``2,5``, ``2,50``,
``0,125`` and ``1234,500`` are read, ``1,000`` and ``2,500`` are refused.

Letters of units count alike in both cases (``10a``, ``45 FT``), but for a first m or M: ``m`` is milli, ``M``
mega, and nothing is guessed between them: ``15 mohm``, ``15 Mohm``, while ``15 MOHM`` is refused.
"""

from __future__ import annotations

import math
import re
from decimal import Decimal
from functools import cache
from typing import Any

from rules.errors import InvalidQuantity, UnreadableText
from rules.unit_words import COLUMNS, DEFINITIONS, SAME_SIGNS, UNITS, key, nearest, spellings

_LONGEST_TEXT = 100
"""No quantity needs more characters; what is longer is refused before any pattern runs. [characters]"""

_PLAIN = re.compile(r"[+-]?([0-9]+(\.[0-9]+)?|\.[0-9]+)([eE][+-]?[0-9]+)?")
_NUMBER = re.compile(r"([+-]?)([0-9.,]+)([eE][+-]?[0-9]+)?")
_FEET_INCHES = re.compile(
    r"([0-9]+) *(?:ft|foot|feet|') *-? *([0-9]+(?:\.[0-9]+)?) *(?:in|inch|inches|\"|'')", re.IGNORECASE
)


def parse(text: str, unit: str) -> float:
    """
    Read a number with an optional unit.

    Parameters
    ----------
    text : str
        What a person typed: ``45 ft``, ``13.7m``, ``2,5``, ``4.1 mV``, ``77 °F``, ``45 ft 6 in``, ``45' 6"``.
    unit : str
        Unit of the record's column: m, V, A, ohm, W, s, degC, %, mm2, or empty for a pure number, which
        takes no unit at all. Text without a unit is already in it.

    Returns
    -------
    float
        The value in ``unit``, the nearest float to what was typed. [unit]

    Raises
    ------
    UnreadableText
        If the text is empty, no number, readable two ways, or its unit is unknown.
    InvalidQuantity
        If it is a number that cannot be: not finite, or of another dimension.

    Examples
    --------
    >>> parse("45 ft", "m")
    13.716
    >>> parse("2,5", "m"), parse("4.1 mV", "V"), parse("77 °F", "degC")
    (2.5, 0.0041, 25.0)
    >>> parse("1,000", "m")
    Traceback (most recent call last):
    rules.errors.UnreadableText: '1,000' can be read two ways: write 1000 or 1.000
    """
    target, example = COLUMNS[unit]
    cleaned = text.translate(SAME_SIGNS).strip()
    if (value := _plain_value(cleaned)) is not None:  # by far the most frequent
        return value
    accepted = f"a number with a unit such as {example!r}" if unit else f"a pure number such as {example!r}"
    if not cleaned:
        raise UnreadableText(f"the text is empty; accepted is {accepted}")
    if len(cleaned) > _LONGEST_TEXT:
        raise UnreadableText(f"{_quoted(text)} is too long; accepted is {accepted}")
    if feet_inches := _FEET_INCHES.fullmatch(cleaned):
        return _feet_inches(feet_inches, text, unit, accepted)
    number, typed_unit = _number(cleaned, text, accepted)
    if not typed_unit:
        return _finite(number, text)
    if not unit:
        raise InvalidQuantity(f"{_quoted(text)} has a unit; accepted is {accepted}")
    name = _known_unit(typed_unit, text, unit, accepted)
    return _finite(number if name == target else _converted(number, name, target), text)


def is_plain(text: str) -> bool:
    """
    Whether a text is the plain number in its column's own unit, so that no ``typed`` entry is needed.

    >>> is_plain("12.50"), is_plain("-3"), is_plain("1e-05"), is_plain("2,5"), is_plain("45 ft")
    (True, True, True, False, False)
    """
    return _plain_value(text.strip(" ")) is not None


def plain(value: float) -> str:
    """
    The shortest text that reads back as the same float; a whole number without ``.0``.

    >>> plain(13.716), plain(48.0), plain(1e-5)
    ('13.716', '48', '1e-05')

    Raises ``InvalidQuantity`` for NaN and infinity, which no file of ours holds.
    """
    value = float(value)
    if not math.isfinite(value):
        raise InvalidQuantity(f"{value} is no number that can be written")
    return repr(value + 0.0).removesuffix(".0")  # + 0.0 turns -0.0 into 0.0


# Conductor sizes


_MM2 = re.compile(r"mm ?(?:2|²|\^2)|sq\.? ?mm")
_AWG = re.compile(r"(?:#|no\.)? ?([0-9]{1,3}|0{4}|[1-9]/0) ?awg|awg ?#? ?([0-9]{1,3}|0{4}|[1-9]/0)|([1-9]/0)")


def parse_size(text: str) -> str:
    """
    Read a conductor size and write it the one way that the record and the tables hold it.

    A bare number is refused, since 10 may be AWG or mm². Whether a table has the size is not asked here.

    >>> [parse_size(t) for t in ("12awg", "#12 AWG", "AWG 0000", "4/0", "250 MCM", "2,5 mm²", "2.50 sq mm")]
    ['12 AWG', '12 AWG', '4/0 AWG', '4/0 AWG', '250 kcmil', '2.5 mm2', '2.5 mm2']

    Raises
    ------
    UnreadableText
        If the text is no size, or readable two ways.
    InvalidQuantity
        If an area is not above zero.
    """
    accepted = "a conductor size such as '12 AWG', '4/0 AWG', '250 kcmil' or '2.5 mm2'"
    cleaned = text.translate(SAME_SIGNS).strip().lower()
    if not cleaned:
        raise UnreadableText(f"the size is empty; accepted is {accepted}")
    if len(cleaned) > _LONGEST_TEXT:
        raise UnreadableText(f"{_quoted(text)} is too long; accepted is {accepted}")
    if gauge := _AWG.fullmatch(cleaned):
        number = gauge[1] or gauge[2] or gauge[3]
        if not number.strip("0"):
            number = f"{len(number)}/0"
        return f"{number.lstrip('0')} AWG"
    if "awg" in cleaned:
        raise UnreadableText(f"{_quoted(text)} is no AWG size; accepted is a whole number or 1/0 to 4/0")
    number, unit = _number(cleaned, text, accepted)
    if not unit:
        raise UnreadableText(f"{_quoted(text)} may be AWG, kcmil or mm2; accepted is {accepted}")
    if unit == "mm":
        raise UnreadableText(f"{_quoted(text)} is a length; accepted is an area such as '2.5 mm2', or AWG, or kcmil")
    standard = "kcmil" if unit in ("kcmil", "mcm") else "mm2" if _MM2.fullmatch(unit) else ""
    if not standard:
        raise UnreadableText(f"{_quoted(text)} is not {accepted}")
    if number <= 0:
        raise InvalidQuantity(f"a conductor size must be above 0 {standard}, got {_quoted(text)}")
    return f"{plain(_finite(number, text))} {standard}"


def show_size(size: str) -> str:
    """
    A size of the record as people write it.

    >>> show_size("2.5 mm2"), show_size("4/0 AWG")
    ('2.5 mm²', '4/0 AWG')
    """
    return size.replace("mm2", "mm²")


# Showing


_PREFIXES = ((6, "M"), (3, "k"), (0, ""), (-3, "m"), (-6, "µ"))
_MILLI_BELOW = {"ohm": Decimal(1), "ohm/m": Decimal(1), "V": Decimal("0.1"), "A": Decimal("0.1"), "W": Decimal("0.1")}
"""Units that take prefixes, and below what they are shown in thousandths: 0.71 V, but 155 mΩ. [unit]"""

_SIGNS = {"ohm": "Ω", "ohm/m": "Ω/m", "degC": "°C", "mm2": "mm²"}
_WIDEST = (Decimal("1e-12"), Decimal("1e15"))
"""What lies outside is shown with a power of ten."""


def show(value: float, unit: str, u: float | None = None, *, digits: int = 4) -> str:
    """
    A value for people, with its unit and, where given, its standard uncertainty.

    With a doubt, the value ends at the doubt's last digit; the doubt has two digits where its first is 1,
    else one. Without a doubt, the value has ``digits`` significant digits and no trailing zeros; a digit
    before the point is never rounded away.

    Parameters
    ----------
    value : float
        The value. [unit]
    unit : str
        Unit of a figure or of a column; ``1`` is shown as a percentage, V, A, W, ohm and ohm/m with a prefix.
    u : float, optional
        Standard uncertainty; zero or ``None`` shows none. [unit]
    digits : int
        Significant digits without a doubt.

    Raises
    ------
    InvalidQuantity
        If a number is not finite, or the doubt negative.

    Examples
    --------
    >>> show(0.155, "ohm"), show(0.0041, "V"), show(52.9731, "V", 0.031), show(0.05, "1"), show(25, "degC")
    ('155 mΩ', '4.1 mV', '52.97 ± 0.03 V', '5 %', '25 °C')
    >>> show(0.7134, "V", 0.0142), show(-0.0001, "degC", 0.5)
    ('0.713 ± 0.014 V', '0.0 ± 0.5 °C')
    """
    number, doubt = _decimal(value), _decimal(u or 0.0)
    if doubt < 0:
        raise InvalidQuantity(f"a standard uncertainty must not be negative, got {u:g}")
    shift, sign = _scale(max(abs(number), doubt), unit)
    number, doubt = number.scaleb(shift), doubt.scaleb(shift)
    if not doubt:
        return f"{_rounded(number, digits)}{sign}"
    if not _WIDEST[0] <= doubt or not max(abs(number), doubt) < _WIDEST[1]:
        return f"{_rounded(number, digits)} ± {_rounded(doubt, 2)}{sign}"
    place = doubt.adjusted() - (doubt.as_tuple().digits[0] == 1)
    if number:
        place = max(place, number.adjusted() - 14)  # a float holds no more
    step = Decimal(1).scaleb(place)
    return f"{_fixed(number.quantize(step))} ± {_fixed(doubt.quantize(step))}{sign}"


def show_against(value: float, limit: float, unit: str) -> tuple[str, str]:
    """
    A value and the limit it is judged by, with as many digits as it takes to bear out the verdict.

    >>> show_against(0.0504, 0.05, "1"), show_against(0.0500004, 0.05, "1"), show_against(0.05, 0.05, "1")
    (('5.04 %', '5 %'), ('5.00004 %', '5 %'), ('5 %', '5 %'))
    """
    a, b = _decimal(value), _decimal(limit)
    shift, sign = _scale(max(abs(a), abs(b)), unit)
    a, b = a.scaleb(shift), b.scaleb(shift)
    # The limit was given as it is: it keeps its digits while there are few.
    pairs = ((_rounded(a, digits), _rounded(b, max(digits, 6))) for digits in range(3, 18))
    text, limit_text = next(pair for pair in pairs if Decimal(pair[0]).compare(Decimal(pair[1])) == a.compare(b))
    return text + sign, limit_text + sign  # 17 digits tell any two floats apart


def _decimal(value: float) -> Decimal:
    """The shortest decimal of a float: what is shown is rounded once, from it."""
    value = float(value)
    if not math.isfinite(value):
        raise InvalidQuantity(f"{value} is no number that can be shown")
    return Decimal(repr(value))


def _scale(largest: Decimal, unit: str) -> tuple[int, str]:
    """By how many powers of ten a value is shifted, and the sign to put behind it."""
    sign = _SIGNS.get(unit, unit)
    if unit == "1":
        return 2, " %"
    if unit not in _MILLI_BELOW or not largest:
        return 0, f" {sign}" if sign else ""
    largest = Decimal(f"{largest:.3e}")  # 999.96 V is shown as 1 kV
    reached = (
        (power, prefix)
        for power, prefix in _PREFIXES
        if largest >= (Decimal(1) if power > 0 else _MILLI_BELOW[unit]).scaleb(power)
    )
    power, prefix = next(reached, _PREFIXES[-1])
    return -power, f" {prefix}{sign}"


def _rounded(number: Decimal, digits: int) -> str:
    """A number to some significant digits, without trailing zeros; whole digits stay."""
    if number and not _WIDEST[0] <= abs(number) < _WIDEST[1]:
        return f"{number:.{digits}g}"
    place = min(0, number.adjusted() - digits + 1) if number else 0
    text = _fixed(number.quantize(Decimal(1).scaleb(place)))
    return text.rstrip("0").rstrip(".") if "." in text else text


def _fixed(number: Decimal) -> str:
    """Without power of ten; zero has no sign."""
    return f"{number if number else abs(number):f}"


# Reading


def _plain_value(text: str) -> float | None:
    """The value of a plain number that a float can hold, else ``None``."""
    if len(text) > _LONGEST_TEXT or not (found := _PLAIN.fullmatch(text)):
        return None
    value = float(text)
    vanished = value == 0 and found[1].strip("0.")
    return value + 0.0 if math.isfinite(value) and not vanished else None


def _quoted(text: str) -> str:
    """The text in quotes for an error line: cut when long, anything that could garble a terminal escaped."""
    return repr(text if len(text) <= 40 else text[:40] + "…")


def _number(cleaned: str, text: str, accepted: str) -> tuple[Decimal, str]:
    """The number that a text starts with, and what follows it."""
    if re.fullmatch(r"[+-]?(nan|inf|infinity)", cleaned, re.IGNORECASE):
        raise InvalidQuantity(f"{_quoted(text)} is no finite number; accepted is {accepted}")
    found = _NUMBER.match(cleaned)
    if not found:
        raise UnreadableText(f"{_quoted(text)} is not {accepted}")
    sign, digits, power = found[1], found[2], found[3] or ""
    rest = cleaned[found.end() :].strip()
    if rest[:1].isdecimal():
        raise UnreadableText(f"{_quoted(text)} holds a space between digits; accepted is {accepted}")
    if re.fullmatch(r"[1-9][0-9]{0,2},[0-9]{3}", digits):
        whole, _, part = digits.partition(",")
        raise UnreadableText(f"{_quoted(text)} can be read two ways: write {sign}{whole}{part} or {sign}{whole}.{part}")
    if digits.count(",") + digits.count(".") > 1:
        raise UnreadableText(f"{_quoted(text)} has more than one point or comma; accepted is {accepted}")
    if power and abs(int(power[1:])) > 5000:  # beyond any float; decimals of such a power are slow or overflow
        raise InvalidQuantity(f"{_quoted(text)} is too {'small' if '-' in power else 'large'} a number")
    digits = digits.replace(",", ".")
    if digits.endswith("."):
        raise UnreadableText(f"{_quoted(text)} is not {accepted}")
    return Decimal(sign + digits + power), rest


def _finite(number: Decimal, text: str) -> float:
    """The nearest float; refused where a float cannot hold the number."""
    value = float(number)
    if not math.isfinite(value):
        raise InvalidQuantity(f"{_quoted(text)} is too large a number")
    if value == 0 and number != 0:
        raise InvalidQuantity(f"{_quoted(text)} is too small a number; write 0 if it is zero")
    return value + 0.0


def _feet_inches(found: re.Match[str], text: str, unit: str, accepted: str) -> float:
    if unit != "m":
        raise InvalidQuantity(f"{_quoted(text)} is a length; accepted is {accepted}")
    feet, inches = Decimal(found[1]), Decimal(found[2])
    if inches >= 12:
        raise InvalidQuantity(f"{_quoted(text)} has {inches} inches beside feet; accepted is less than 12")
    return _finite(_converted(12 * feet + inches, "inch", "metre"), text)


def _known_unit(typed: str, text: str, unit: str, accepted: str) -> str:
    """The pint name of a typed unit that measures what the column holds."""
    if typed in ("MOHM", "MOHMS"):
        raise UnreadableText(f"{_quoted(text)} can be read two ways: write mohm (milli) or Mohm (mega)")
    kind = UNITS[COLUMNS[unit][0]][0]
    name = spellings().get(key(typed))
    if name is None:
        if not typed.isalpha() or len(typed) > 20:
            raise UnreadableText(f"{_quoted(text)} is not {accepted}")
        raise UnreadableText(f"{_quoted(text)} has an unknown unit; did you mean {nearest(typed, kind)!r}?")
    if UNITS[name][0] != kind:
        raise InvalidQuantity(f"{_quoted(text)} is a {UNITS[name][0]}, not a {kind}; accepted is {accepted}")
    return name


@cache
def _line(name: str, target: str) -> tuple[Decimal, Decimal]:
    """Factor and offset from one unit to another: pint is asked once a pair, then it is plain arithmetic."""
    registry = _registry()
    at_zero, at_one = (registry.Quantity(Decimal(n), name).to(target).magnitude for n in (0, 1))
    return at_one - at_zero, at_zero


def _converted(number: Decimal, name: str, target: str) -> Decimal:
    factor, offset = _line(name, target)
    return number * factor + offset


@cache
def _registry() -> Any:  # its own type's name would import pint
    """The one registry; in decimals, so that 45 ft is 13.716 m and not 13.716000000000001 m."""
    import pint

    registry: Any = pint.UnitRegistry(None, non_int_type=Decimal)
    for definition in DEFINITIONS.strip().splitlines():
        registry.define(definition)
    return registry
