"""Resistance of protective devices."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from rules.calc.device import device_resistance_ohm
from rules.columns import Column
from rules.record import columns

DEVICE: Column = dict(columns("circuits"))["device"]


@pytest.mark.parametrize(
    ("device", "rating", "poles", "milliohm"),
    [
        ("breaker C", 6.0, 1, 1000 * 0.6 * 3.0 / 36),
        ("breaker B", 10.0, 2, 1000 * 2 * 0.6 * 3.0 / 100),
        ("breaker D", 13.0, 1, 1000 * 0.6 * 3.5 / 169),
        ("breaker C", 16.0, 1, 1000 * 0.6 * 3.5 / 256),
        ("breaker C", 63.0, 1, 1000 * 0.6 * 13.0 / 3969),
        ("fuse gG", 32.0, 1, 1000 * 0.6 * 3.0 / 1024),
        ("fuse gG", 63.0, 1, 1000 * 0.6 * 9.5 / 3969),
        ("fuse blade", 10.0, 1, 7.7),
        ("fuse blade", 15.0, 2, 9.3),
        ("fuse blade", 7.5, 1, 10.91),
        ("electronic", 10.0, 1, 15.0),
    ],
)
def test_typical_resistances(device: str, rating: float, poles: int, milliohm: float) -> None:
    """0.6 × largest loss / rating², from memory of IEC 60898-1 and IEC 60269-2; blade fuses and electronics as stated."""
    ohm = device_resistance_ohm(device, rating, poles)
    assert ohm == pytest.approx(milliohm / 1000)


@pytest.mark.parametrize(
    ("rating", "drop_v"), [(6.0, (0.2, 0.35)), (10.0, (0.13, 0.25)), (16.0, (0.1, 0.17)), (32.0, (0.06, 0.12))]
)
def test_breakers_drop_what_a_makers_table_shows(rating: float, drop_v: tuple[float, float]) -> None:
    """A maker's table as quoted in the trade: 6 A 0.2 to 0.35 V, 10 A 0.2 V, 16 A 0.13 V, 32 to 63 A 0.09 V a pole."""
    ohm = device_resistance_ohm("breaker C", rating)
    assert ohm is not None
    assert drop_v[0] <= ohm * rating <= drop_v[1]


def test_no_device_has_no_resistance() -> None:
    assert device_resistance_ohm("none", None) == device_resistance_ohm("none", 10.0, 2) == 0.0


@pytest.mark.parametrize(
    ("device", "rating"),
    [
        ("", 10.0),
        ("breaker C", None),
        ("breaker C", 0.0),
        ("breaker C", 160.0),
        ("fuse gG", 800.0),
        ("fuse blade", 12.0),
        ("contactor", 10.0),
    ],
)
def test_what_the_tables_do_not_hold_is_not_known(device: str, rating: float | None) -> None:
    assert device_resistance_ohm(device, rating) is None


@pytest.mark.parametrize("device", DEVICE.choices)
def test_every_recorded_device_has_a_figure_at_10_a(device: str) -> None:
    assert device_resistance_ohm(device, 10.0) is not None


@given(st.floats(0.1, 125), st.floats(0.1, 1), st.integers(1, 4))
def test_resistance_is_proportional_to_share_and_poles(rating: float, share: float, poles: int) -> None:
    one = device_resistance_ohm("breaker C", rating, 1, 1.0)
    assert one is not None
    assert device_resistance_ohm("breaker C", rating, poles, share) == pytest.approx(one * share * poles)
