"""
The doubt budget of a drop against the package ``uncertainties``, which propagates by derivatives of its own.

The drop of a device and two runs, a tap between them whose current was not read, is written out once more with one
independent variable for each doubt.
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import pytest
import uncertainties

from audit.intake.folder import site_of
from audit.report.phrases import doubt_rows
from rules import limits
from rules.assess import assess
from rules.calc.doubt import each_u, gain_u
from rules.diagnosis.budget import RECORD_GROUPS
from rules.record import Reading, Site

OHM_PER_M, ALPHA, CELSIUS = 1.83e-3, 0.00393, 35.0
"""10 mm² copper, class 2: IEC 60228:2004. [ohm/m, 1/K, degC]"""
JOINT_MEAN = 0.15e-3 * math.exp(math.log(2) ** 2 / 2)
JOINT_U = JOINT_MEAN * math.sqrt(math.exp(math.log(2) ** 2) - 1)
LENGTHS = (40.0, 25.0)
LOADS = (3.0, 5.0)
READ_A = 7.9
DEVICE_OHM = 0.6 * 3.5 / 16**2
"""One pole of a 16 A breaker B: typically 0.6 of the 3.5 W that its standard allows. [ohm]"""


def site() -> Site:
    """Two runs of a taped and a paced length, warm by the air; the current was read at the first alone."""
    common = {"circuit": "C1", "size": "10 mm2", "temperature": "35", "temperature_by": "air"}
    readings = [("voltage", "bus", "24.31", "M1"), ("voltage", "p2", "22.46", "M1"), ("current", "run 1", "7.90", "K1")]
    return site_of(
        {
            "sources": [{"source": "PSU", "kind": "power supply", "nominal": "24"}],
            "circuits": [
                {"circuit": "C1", "fed_from": "PSU", "device": "breaker B", "device_rating": "16", "device_poles": "1"}
            ],
            "runs": [
                common | {"run": "1", "from": "way", "to": "p1", "length": "40", "length_by": "tape"},
                common | {"run": "2", "from": "p1", "to": "p2", "length": "25", "length_by": "paced"},
            ],
            "loads": [
                {"circuit": "C1", "point": point, "load": point, "current": str(amps)}
                for point, amps in zip(("p1", "p2"), LOADS, strict=True)
            ],
            "instruments": [
                {"instrument": "M1", "quantity": "voltage", "accuracy": "0.5", "counts": "2", "resolution": "0.01"},
                {"instrument": "K1", "quantity": "current", "accuracy": "1.5", "counts": "3", "resolution": "0.01"},
            ],
            "readings": [
                {"circuit": "C1", "round": "1", "quantity": quantity, "at": at, "value": value, "instrument": meter}
                for quantity, at, value, meter in readings
            ],
        },
        {"name": "budget", "ambient": "20 degC"},
    )


def by_derivatives() -> tuple[Any, dict[str, float]]:
    """The excess with every doubt a variable, and what each name of the budget adds. [V]"""
    variable = uncertainties.ufloat
    doubts = {
        "length": [variable(1, 0.01), variable(1, 0.08)],
        "temperature": [variable(CELSIUS, 5.0)],
        "resistance per metre": [variable(1, 0.02)],
        "terminations": [variable(JOINT_MEAN, JOINT_U) for _ in range(8)],
        "device": [variable(1, 0.3)],
        "load share": [variable(0, 0.15 * LOADS[0] / sum(LOADS))],
        "meter gain": [variable(1, gain_u(0.5))],
        "meter counts": [variable(0, each_u(2, 0.01)), variable(0, each_u(2, 0.01))],
        "current gain": [variable(1, gain_u(1.5))],
        "current counts": [variable(0, each_u(3, 0.01))],
    }
    first_a = READ_A * doubts["current gain"][0] + doubts["current counts"][0]
    share = LOADS[1] / sum(LOADS)
    amps = (first_a, first_a * share + READ_A * doubts["load share"][0])
    joints = doubts["terminations"]
    computed = amps[0] * DEVICE_OHM * doubts["device"][0] + sum(
        amps[n]
        * (
            2 * LENGTHS[n] * doubts["length"][n] * OHM_PER_M * doubts["resistance per metre"][0]
            * (1 + ALPHA * (doubts["temperature"][0] - 20))
            + sum(joints[4 * n : 4 * n + 4])
        )
        for n in range(2)
    )  # fmt: skip
    start, end = (
        volts * doubts["meter gain"][0] + counts
        for volts, counts in zip((24.31, 22.46), doubts["meter counts"], strict=True)
    )
    excess = start - end - computed
    parts = excess.error_components()
    return excess, {name: math.sqrt(sum(parts[each] ** 2 for each in of)) for name, of in doubts.items()}


def test_the_excess_and_each_part_of_its_doubt() -> None:
    made = site()
    (result,) = assess(made, limits.of(made)).circuits
    assert result.drop is not None
    excess, parts = by_derivatives()
    assert result.drop.excess.value == pytest.approx(excess.nominal_value, rel=1e-9)
    assert result.drop.excess.u == pytest.approx(excess.std_dev, rel=1e-6)
    budget = {doubt.name: doubt.u_v for doubt in result.drop.budget}
    assert budget.keys() == parts.keys()
    for name, u in parts.items():
        assert budget[name] == pytest.approx(u, rel=1e-6), name


def test_every_part_names_the_group_of_the_profile_that_states_it() -> None:
    made = site()
    in_force = limits.of(made)
    (result,) = assess(made, in_force).circuits
    assert result.drop is not None
    for doubt in result.drop.budget:
        assert doubt.group == RECORD_GROUPS.get(doubt.name, "")
        assert not doubt.group or in_force.citation(doubt.group)


def test_the_budget_says_who_states_the_doubt_of_a_meter_that_is_not_recorded() -> None:
    """M1 and K1 are recorded; M0 is not: the profile's poor meter speaks for it, alone or beside M1."""
    by_record, by_none = site(), site()
    poor = tuple(replace(row, instrument="") if row.quantity == "voltage" else row for row in by_none.readings)
    mixed = tuple(replace(row, instrument="") if row.at == "bus" else row for row in by_none.readings)

    def stated(readings: tuple[Reading, ...]) -> dict[str, str]:
        this = replace(by_record, readings=readings)
        (circuit,) = assess(this, limits.of(this)).circuits
        assert circuit.drop is not None
        return {row.name: row.stated for row in doubt_rows(circuit.drop)}

    assert stated(by_record.readings)["meter counts"] == "record of instruments"
    assert stated(poor)["meter counts"] == "profile, poor_meter"
    assert stated(poor)["current gain"] == "record of instruments"
    assert stated(mixed)["meter counts"] == "profile, poor_meter and record of instruments"
