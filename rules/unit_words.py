"""The units that people may type, what the record's columns hold, and what pint is told of both."""

from __future__ import annotations

import re
from functools import cache

UNITS: dict[str, tuple[str, str]] = {
    "metre": ("length", "m metre metres meter meters"),
    "centimetre": ("length", "cm"),
    "millimetre": ("length", "mm"),
    "kilometre": ("length", "km"),
    "foot": ("length", "ft foot feet '"),
    "inch": ("length", 'in inch inches "'),
    "yard": ("length", "yd yard yards"),
    "volt": ("voltage", "V volt volts"),
    "microvolt": ("voltage", "µV microvolt microvolts"),
    "millivolt": ("voltage", "mV millivolt millivolts"),
    "kilovolt": ("voltage", "kV kilovolt kilovolts"),
    "ampere": ("current", "A amp amps ampere amperes"),
    "microampere": ("current", "µA microamp microamps"),
    "milliampere": ("current", "mA milliamp milliamps"),
    "kiloampere": ("current", "kA kiloamp kiloamps"),
    "ohm": ("resistance", "Ω ohm ohms"),
    "microohm": ("resistance", "µΩ uohm uohms microohm microohms microhm microhms"),
    "milliohm": ("resistance", "mΩ mohm mohms milliohm milliohms"),
    "kiloohm": ("resistance", "kΩ kohm kohms kiloohm kilohm kilohms"),
    "megaohm": ("resistance", "MΩ Mohm Mohms megaohm megohm megohms Megohm Megohms"),
    "watt": ("power", "W watt watts"),
    "milliwatt": ("power", "mW milliwatt milliwatts"),
    "kilowatt": ("power", "kW kilowatt kilowatts"),
    "second": ("time", "s sec secs second seconds"),
    "millisecond": ("time", "ms millisecond milliseconds"),
    "minute": ("time", "min mins minute minutes"),
    "hour": ("time", "h hr hrs hour hours"),
    "celsius": ("temperature", "°C C degC ℃ celsius"),
    "fahrenheit": ("temperature", "°F F degF ℉ fahrenheit"),
    "kelvin": ("temperature", "K kelvin"),
    "percent": ("percentage", "% percent pct"),
    "square_millimetre": ("area", "mm² mm2 sqmm sq.mm"),
    "square_centimetre": ("area", "cm² cm2"),
}
"""pint name of each accepted unit: what it measures and how people write it, the usual way first."""

COLUMNS: dict[str, tuple[str, str]] = {
    "m": ("metre", "12.5 m"),
    "V": ("volt", "4.1 mV"),
    "A": ("ampere", "2.5 A"),
    "ohm": ("ohm", "15 mΩ"),
    "W": ("watt", "60 W"),
    "s": ("second", "0.2 s"),
    "degC": ("celsius", "25 °C"),
    "%": ("percent", "5 %"),
    "mm2": ("square_millimetre", "2.5 mm²"),
    "": ("", "12.5"),
}
"""Units of the record's columns: pint name and what a cell may say."""

DEFINITIONS = """
micro- = 1e-6
milli- = 1e-3
centi- = 1e-2
kilo- = 1e3
mega- = 1e6
metre = [length]
inch = 0.0254 * metre
foot = 12 * inch
yard = 3 * foot
square_millimetre = 1e-6 * metre ** 2
square_centimetre = 1e-4 * metre ** 2
volt = [voltage]
ampere = [current]
ohm = [resistance]
watt = [power]
second = [time]
minute = 60 * second
hour = 60 * minute
kelvin = [temperature]; offset: 0
celsius = kelvin; offset: 273.15
fahrenheit = 5 / 9 * kelvin; offset: 233.15 + 200 / 9
"""
"""All that pint is told; a registry with its whole default file takes 250 times as long to make."""

SAME_SIGNS = str.maketrans(
    {
        "\u2212": "-",  # minus sign
        "\u00b5": "µ",
        "\u03bc": "µ",  # Greek mu
        "\u2126": "Ω",  # ohm sign
        "\u212a": "K",  # kelvin sign
        "\u00ba": "°",  # masculine ordinal, beside the degree sign on some keyboards
        "\u2032": "'",
        "\u2019": "'",
        "\u2033": '"',
        "\u201d": '"',
        **dict.fromkeys(
            "\u00a0\u1680\u2000\u2001\u2002\u2003\u2004\u2005\u2006\u2007\u2008\u2009\u200a\u202f\u205f", " "
        ),
    }
)
"""Signs that people's keyboards and spreadsheets put for the same thing."""


def key(typed: str) -> str:
    """One spelling for all that mean the same unit."""
    typed = re.sub(r"^(°|deg|sq\.?) ", r"\1", typed, flags=re.IGNORECASE)
    for sign, letters in (("Ω", "ohm"), ("µ", "u"), ("°", "deg"), ("²", "2"), ("^2", "2")):
        typed = typed.replace(sign, letters)
    return typed[:1] + typed[1:].lower() if typed[:1] in ("m", "M") else typed.lower()


@cache
def spellings() -> dict[str, str]:
    """Key of every accepted spelling → pint name."""
    return {key(word): name for name, (_, words) in UNITS.items() for word in words.split()}


def nearest(typed: str, kind: str) -> str:
    """The accepted spelling of a kind of unit that a typed one comes nearest to."""
    from difflib import get_close_matches

    words = {word.lower(): word for measured, spelt in UNITS.values() if measured == kind for word in spelt.split()}
    return words[get_close_matches(typed.lower(), words, n=1, cutoff=0)[0]]


def column_unit(typed: str) -> str | None:
    """
    The unit of a record's column that measures the same as a typed one; ``None`` for an unknown unit.

    >>> column_unit("ft"), column_unit("kW"), column_unit("mΩ"), column_unit("furlong")
    ('m', 'W', 'ohm', None)
    """
    name = spellings().get(key(typed.translate(SAME_SIGNS).strip()))
    if name is None:
        return None
    return next((unit for unit, (base, _) in COLUMNS.items() if unit and UNITS[base][0] == UNITS[name][0]), None)
