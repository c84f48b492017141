"""Doubt of computed drops, the state at the highest source voltage, and the largest current of a branch."""

from __future__ import annotations

import math

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import prepare
from rules.context import Context
from rules.doubts import drop_u
from rules.loads import Drawn
from rules.one_run import OneRun, answer
from rules.record import Run
from rules.worst import largest_current_a

LOOP_20C = 2 * 30 * 4.61e-3
"""30 m of 4 mm² class 2 at 20 °C, IEC 60228:2004. [ohm]"""
JOINTS = 4 * 0.15e-3 * (10 / 4) ** 0.5 * math.exp(math.log(2) ** 2 / 2)
"""Four healthy terminations on 4 mm², the mean of a log-normal. [ohm]"""
ALPHA = 0.00393
"""IEC 60028. [1/K]"""


def context_of(load: dict[str, str], temperature: float = 20.0, **source: str) -> Context:
    """One run of 30 m behind a battery of 24 V, with one load."""
    site = site_of(
        {
            "sources": [{"source": "B", "kind": "battery", "nominal": "24", "lowest": "21", "highest": "29", **source}],
            "circuits": [{"circuit": "C", "fed_from": "B", "device": "none"}],
            "runs": [
                {"circuit": "C", "run": "1", "from": "way", "to": "p", "length": "30", "length_by": "marks",
                 "size": "4 mm2", "temperature": str(temperature), "temperature_by": "assumed"},
            ],
            "loads": [{"circuit": "C", "point": "p", "load": "L", **load}],
        },
        {"name": "doubts"},
    )  # fmt: skip
    return prepare(site, limits.of(site))


def node_of(context: Context) -> int:
    return context.network.nodes_of[context.site.circuits[0].id]["p"]


class TestGrowth:
    """The derivative of a drop against its resistance, beside the closed form of one run."""

    def test_constant_power(self) -> None:
        """d ln(Vs − V) / d ln R of V = (Vs + √(Vs² − 4 P R)) / 2 is 1 / (1 − P R / V²)."""
        context, ohm = context_of({"power": "300"}), LOOP_20C + JOINTS
        volts = (24 + math.sqrt(24**2 - 4 * 300 * ohm)) / 2
        node, bus = node_of(context), int(context.network.parent[node_of(context)])
        assert context.network.growth("design", node, bus) == pytest.approx(1 / (1 - 300 * ohm / volts**2), rel=1e-3)

    def test_constant_resistance(self) -> None:
        """Vs R / (R + R_load): the drop grows by R_load / (R + R_load)."""
        context, ohm = context_of({"resistance": "2"}), LOOP_20C + JOINTS
        node = node_of(context)
        grown = context.network.growth("design", node, int(context.network.parent[node]))
        assert grown == pytest.approx(2 / (2 + ohm), rel=1e-3)

    def test_constant_current(self) -> None:
        context = context_of({"current": "6"})
        assert context.network.growth("lowest", node_of(context), 0) == 1.0


def test_doubt_near_collapse_is_that_of_one_run() -> None:
    """``ohmwalk drop`` has its doubt by the derivative of the closed form; a site's must be the same."""
    context = context_of({"power": "300"}, temperature=70.0, lowest="21")
    node = node_of(context)
    branches = list(context.network.way_up(node))[:-1]
    run = Run(
        id="r", circuit_id="c", number=1, one_way_length_m=30.0, length_by="marks", size="4 mm2",
        conductor_temperature_c=70.0, temperature_by="assumed",
    )  # fmt: skip
    asked = OneRun(run=run, nominal_v=21.0, draws=Drawn(power_w=300.0), allowed_percent=3.0, ambient_c=20.0)
    alone = answer(asked, context.limits).carried
    assert alone is not None
    assert alone.drop.u is not None
    assert drop_u(context, branches, "lowest") == pytest.approx(alone.drop.u, rel=5e-3)
    assert alone.drop.u > 1.5 * 300 / alone.at_load.value * 0.02 * LOOP_20C  # far beyond that of a steady current


def test_no_drop_is_in_doubt_by_more_than_its_source_has() -> None:
    hot = LOOP_20C * (1 + ALPHA * 50) + JOINTS
    watts = 21**2 / (4 * hot) * 0.9999
    context = context_of({"power": str(watts)})
    branches = list(context.network.way_up(node_of(context)))[:-1]
    assert 1.0 < drop_u(context, branches, "lowest") <= 21.0


class TestHighest:
    def test_conductors_are_cold_and_the_source_at_its_highest(self) -> None:
        """29 V behind the resistance at 20 °C, though 60 °C is recorded."""
        context = context_of({"current": "6"}, temperature=60.0)
        volts = context.network.highest.voltage_v[node_of(context)]
        assert volts == pytest.approx(29 - 6 * (LOOP_20C + JOINTS), abs=1e-3)

    def test_a_colder_conductor_stays_as_recorded(self) -> None:
        context = context_of({"current": "6"}, temperature=0.0)
        volts = context.network.highest.voltage_v[node_of(context)]
        assert volts == pytest.approx(29 - 6 * (LOOP_20C * (1 - ALPHA * 20) + JOINTS), abs=1e-3)

    def test_highest_not_recorded_is_a_gap(self) -> None:
        context = context_of({"current": "6"}, highest="")
        assert context.network.gap_of(node_of(context), highest=True) == "the highest voltage of B is not known"


class TestLargestCurrent:
    """At the voltage that makes it largest, behind the resistances of that state."""

    def test_constant_resistance_draws_most_at_the_highest_voltage(self) -> None:
        context = context_of({"resistance": "2"}, temperature=60.0)
        largest = largest_current_a(context.network, node_of(context))
        assert largest == pytest.approx(29 / (2 + LOOP_20C + JOINTS), rel=1e-5)

    def test_constant_power_draws_most_at_the_lowest_voltage(self) -> None:
        context, hot = context_of({"power": "200"}), LOOP_20C * (1 + ALPHA * 50) + JOINTS
        volts = (21 + math.sqrt(21**2 - 4 * 200 * hot)) / 2
        assert largest_current_a(context.network, node_of(context)) == pytest.approx(200 / volts, rel=1e-5)
