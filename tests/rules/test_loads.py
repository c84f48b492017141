"""What a load draws, from whichever figures its record gives."""

from __future__ import annotations

import pytest

from rules.loads import Drawn, drawn, kind_of
from rules.record import Load


def load(**fields: object) -> Load:
    return Load(id="1", circuit_id="c", point="p1", tag="lamp", **fields)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("fields", "kind"),
    [
        ({"current_a": 2.0}, "constant current"),
        ({"power_w": 60.0}, "constant power"),
        ({"resistance_ohm": 12.0}, "constant resistance"),
        ({"current_a": 2.0, "power_w": 48.0}, "constant power"),
        ({"current_a": 2.0, "kind": "constant resistance"}, "constant resistance"),
        ({}, ""),
    ],
)
def test_the_kind_follows_the_figure_unless_it_is_recorded(fields: dict[str, object], kind: str) -> None:
    assert kind_of(load(**fields)) == kind


@pytest.mark.parametrize(
    ("fields", "expected"),
    [
        ({"current_a": 2.0, "simultaneous": 0.5}, Drawn(current_a=1.0)),
        ({"power_w": 60.0, "simultaneous": 0.5}, Drawn(power_w=30.0)),
        ({"resistance_ohm": 12.0, "simultaneous": 0.5}, Drawn(conductance_s=0.5 / 12)),
        # a kind whose own figure is missing takes it from another at 24 V nominal
        ({"kind": "constant current", "power_w": 48.0}, Drawn(current_a=2.0)),
        ({"kind": "constant current", "resistance_ohm": 12.0}, Drawn(current_a=2.0)),
        ({"kind": "constant power", "current_a": 2.0}, Drawn(power_w=48.0)),
        ({"kind": "constant resistance", "current_a": 2.0, "simultaneous": 0.5}, Drawn(conductance_s=1 / 24)),
        ({"kind": "constant power"}, None),
        ({}, None),
        ({"current_a": 0.0}, Drawn()),
    ],
)
def test_what_is_drawn_at_24_v_nominal(fields: dict[str, object], expected: Drawn | None) -> None:
    got = drawn(load(**fields), 24.0)
    if expected is None:
        assert got is None
    else:
        assert got is not None
        assert (got.current_a, got.power_w, got.conductance_s) == pytest.approx(
            (expected.current_a, expected.power_w, expected.conductance_s)
        )


def test_without_a_nominal_voltage_another_figure_says_nothing() -> None:
    assert drawn(load(kind="constant power", current_a=2.0), None) is None


def test_current_at_a_voltage() -> None:
    assert Drawn(current_a=1.0, power_w=24.0, conductance_s=0.5).at(12.0) == pytest.approx(1 + 2 + 6)
