"""What ties a circuit to what others share."""

from __future__ import annotations

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import prepare
from rules.diagnosis.habits import Habit, Tie, expected, order, shared
from rules.measured import posed_by, ties_by
from rules.record import Site

RUNS: list[dict[str, str]] = [
    {"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "20", "length_by": "paced", "size": "4 mm2"},
    {"circuit": "C1", "run": "2", "from": "p1", "to": "p2", "length": "10", "size": "2.5 mm2", "return_size": "4 mm2",
     "temperature": "30", "temperature_by": "air"},
]  # fmt: skip
INSTRUMENTS = [
    {"instrument": "M1", "quantity": "voltage", "accuracy": "0.5", "counts": "2", "resolution": "0.01"},
    {"instrument": "M1", "quantity": "resistance", "accuracy": "0.5", "counts": "2", "resolution": "0.01"},
    {"instrument": "T1", "quantity": "temperature", "accuracy": "1", "counts": "1", "resolution": "1"},
    {"instrument": "K1", "quantity": "current", "accuracy": "2", "counts": "2", "resolution": "0.01"},
]


def reading(quantity: str, at: str, value: float, instrument: str, **more: str) -> dict[str, str]:
    return {
        "circuit": "C1", "round": "1", "quantity": quantity, "at": at, "value": str(value), "instrument": instrument
    } | more  # fmt: skip


def ties(*readings: dict[str, str]) -> tuple[Tie, ...]:
    tables: dict[str, list[dict[str, str]]] = {
        "sources": [{"source": "PSU", "kind": "power supply", "nominal": "24"}],
        "circuits": [{"circuit": "C1", "fed_from": "PSU", "device": "none"}],
        "runs": RUNS,
        "loads": [{"circuit": "C1", "point": "p2", "load": "lamp", "current": "4"}],
        "instruments": INSTRUMENTS,
        "readings": list(readings),
    }
    site = site_of(tables, {"name": "x", "nominal": "24 V"})
    context = prepare(site, limits.of(site))
    measured = context.measured[site.circuits[0].id]
    problem = posed_by(context, measured)
    assert problem is not None
    return ties_by(context, measured, problem)


FIRST_RUN = (
    reading("voltage", "way", 24, "M1"),
    reading("voltage", "p1", 23.5, "M1"),
    reading("current", "run 1", 4, "K1"),
)
BOTH_RUNS = (*FIRST_RUN, reading("voltage", "p2", 23.1, "M1"))


def habits(*readings: dict[str, str]) -> set[Habit]:
    return {tie.habit for tie in ties(*readings)}


def test_a_circuit_is_tied_to_its_meters_its_ways_and_its_cable() -> None:
    assert habits(*FIRST_RUN) == {
        Habit("voltage", "M1", "1"),
        Habit("current", "K1", "1"),
        Habit("zero", "K1", "1"),
        Habit("length", "paced"),
        Habit("temperature", "assumed"),
        Habit("cable", "4 mm2 copper stranded"),
    }


def test_runs_that_no_reading_spans_tie_nothing() -> None:
    assert Habit("length", "drawing") not in habits(*FIRST_RUN)
    assert Habit("length", "drawing") in habits(*BOTH_RUNS)


def test_a_return_of_its_own_size_makes_another_cable() -> None:
    assert Habit("cable", "2.5 mm2 copper stranded with 4 mm2 copper") in habits(*BOTH_RUNS)


def test_a_temperature_that_was_read_is_probed() -> None:
    assert Habit("temperature", "air") in habits(*BOTH_RUNS)
    probed = habits(*BOTH_RUNS, reading("temperature", "run 2", 31, "T1"))
    assert Habit("temperature", "probe") in probed
    assert Habit("temperature", "air") not in probed


def test_a_meter_that_is_not_recorded_ties_nothing() -> None:
    unknown = tuple(row | {"instrument": ""} for row in FIRST_RUN)
    assert {habit.kind for habit in habits(*unknown)} == {"length", "temperature", "cable"}


def test_a_meter_of_another_visit_is_another() -> None:
    of_visit = tuple(row | {"visit": "spring"} for row in FIRST_RUN)
    assert Habit("voltage", "M1", "spring") in habits(*of_visit)


def test_a_dead_test_is_tied_to_the_ohmmeter() -> None:
    dead = reading("resistance", "way", 0.09, "M1", to="p1", leg="positive")
    assert habits(dead) & {Habit("resistance", "M1", "1"), Habit("voltage", "M1", "1")} == {
        Habit("resistance", "M1", "1")
    }


def test_a_clamps_gain_acts_with_what_it_read_and_its_zero_by_itself() -> None:
    weights = {tie.habit.kind: tie.weight for tie in ties(*FIRST_RUN) if tie.figure == "current"}
    assert weights == {"current": 4.0, "zero": 1.0}


def test_what_too_few_share_is_not_looked_at() -> None:
    one = (Tie("ohm", 0, Habit("length", "paced"), 1.0), Tie("ohm", 1, Habit("length", "paced"), 1.0))
    other = (Tie("ohm", 0, Habit("length", "tape"), 1.0),)
    assert shared([one, one, other], 2) == {Habit("length", "paced"): 2}


@pytest.mark.parametrize(
    ("habit", "probability", "spread"),
    [
        (Habit("voltage", "M1", "1"), 0.02, 0.06),
        (Habit("zero", "K1", "1"), 0.01, 0.2),
        (Habit("length", "paced"), 0.05, 1.5 * 0.08),
        (Habit("temperature", "assumed"), 0.05, 1.5 * 8),
        (Habit("cable", "4 mm2"), 0.02, 0.04),
    ],
)
def test_the_profile_says_what_is_expected_of_each(habit: Habit, probability: float, spread: float) -> None:
    found = expected(habit, limits.of(Site(name="x")))
    assert found.probability == probability
    assert found.spread == pytest.approx(spread)


def test_habits_have_words_and_an_order() -> None:
    some = [Habit("cable", "2.5 mm2 copper stranded"), Habit("length", "paced"), Habit("voltage", "DV-1", "1")]
    assert [habit.words for habit in sorted(some, key=order)] == [
        "voltmeter DV-1",
        "paced lengths",
        "cable 2.5 mm² copper stranded",
    ]
