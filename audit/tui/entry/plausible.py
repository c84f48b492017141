"""Whether a typed value can hardly be what the meter shows: it is asked for twice, never forbidden."""

from __future__ import annotations

from rules.cautions import highest_voltage_v
from rules.index import Index
from rules.nominal import nominal_v
from rules.record import Circuit, Figure, Reading
from rules.units import is_plain, show

ABOVE_HIGHEST = 1.2
"""Of the highest voltage named for the system. Our own default."""
FAR_FROM_COMPUTED = 0.3
"""Of nominal, between what is read and what is computed. Our own default."""
ABOVE_RATING = 1.5
"""Of the rating of the circuit's device. Our own default."""
SMALL = ("joint", "drop")
"""Quantities that meters show in V as well as in mV."""


def unit_complaint(text: str, quantity: str) -> str:
    """
    What is missing where a number alone may be V or mV; empty where nothing is.

    >>> unit_complaint("4.1", "joint")
    'V or mV? A joint needs its unit: 4.1 mV or 0.8 V'
    >>> unit_complaint("4.1 mV", "joint"), unit_complaint("53.4", "voltage")
    ('', '')
    """
    if quantity in SMALL and is_plain(text.strip()):
        return f"V or mV? A {quantity} needs its unit: 4.1 mV or 0.8 V"
    return ""


def doubt_about(reading: Reading, index: Index, computed: Figure | None = None) -> str:
    """
    Why a reading is hardly what the meter shows, in a few words; empty where nothing speaks against it.

    Parameters
    ----------
    reading : Reading
        As it would be saved.
    computed : Figure
        What is computed for its place; without it, or where it is computed from this reading itself, the nominal
        voltage stands in.
    """
    circuit = index.circuits.get(reading.circuit_id)
    nominal = nominal_v(circuit or Circuit(id="", fed_from=reading.board), index)
    value = reading.value
    if reading.quantity == "voltage":
        return _doubt_about_voltage(reading, index, nominal, computed)
    if reading.quantity in SMALL and nominal is not None and abs(value) > nominal:
        return f"{_words(reading)} is more than the nominal {show(nominal, 'V')}"
    rating = circuit.rated_current_a if circuit is not None else None
    if reading.quantity == "current" and rating is not None and abs(value) > ABOVE_RATING * rating:
        return f"{_words(reading)} is more than {ABOVE_RATING:g} times the device's {show(rating, 'A')}"
    return ""


def _doubt_about_voltage(reading: Reading, index: Index, nominal: float | None, computed: Figure | None) -> str:
    value, highest = reading.value, highest_voltage_v(index.site)
    if highest and abs(value) > ABOVE_HIGHEST * highest:
        return f"{_words(reading)} is far above the highest named, {show(highest, 'V')}"
    if reading.leg not in ("", "both"):
        return ""  # of one pole to earth: either sign, and anything from nothing to the whole
    if value < 0:
        return f"{_words(reading)} has the wrong sign: are the leads swapped?"
    is_of_others = computed is not None and computed.value != value
    expected = computed.value if computed is not None and is_of_others else nominal
    if nominal is None or expected is None or abs(value - expected) <= FAR_FROM_COMPUTED * nominal:
        return ""
    return f"{_words(reading)} is far from the {'computed' if is_of_others else 'nominal'} {show(expected, 'V')}"


def _words(reading: Reading) -> str:
    return show(reading.value, reading.unit, digits=9)
