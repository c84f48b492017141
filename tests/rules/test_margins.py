"""Margins, where voltage is lost, peaks, losses, and what would do: stories on small circuits."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess, prepare
from rules.calc.peak import energy_kwh_a_year, lowest_at_peak_v
from rules.case import CircuitCase, case_of
from rules.margins import Margin, losses_of, margins_of
from rules.sufficient import sufficient_of

R = {"2.5": 7.41e-3, "4": 4.61e-3, "6": 3.08e-3, "10": 1.83e-3, "16": 1.15e-3}
"""IEC 60228:2004, class 2, by size in mm². [ohm/m]"""


def joints(size: str, number: int = 4) -> float:
    return number * 0.15e-3 * math.sqrt(10 / float(size)) * math.exp(math.log(2) ** 2 / 2)


def run(circuit: str, number: int, start: str, end: str, length: float, size: str, **more: str) -> dict[str, str]:
    cells = {
        "circuit": circuit,
        "run": str(number),
        "from": start,
        "to": end,
        "length": str(length),
        "size": f"{size} mm2",
    }
    return cells | {"length_by": "marks", "temperature": "20", "temperature_by": "probe"} | more


TABLES: dict[str, Any] = {
    "sources": [
        {
            "source": "BATT", "kind": "battery", "nominal": "24", "working": "26", "lowest": "21", "highest": "28.5",
            "resistance": "0.02",
        }
    ],
    "boards": [{"board": "DB", "fed_by": "F"}],
    "circuits": [
        {"circuit": "F", "fed_from": "BATT", "device": "breaker C", "device_rating": "16"},
        {"circuit": "C", "fed_from": "DB", "device": "none", "allowed_drop": "3"},
    ],
    "runs": [run("F", 1, "way", "db", 20, "10"), run("C", 1, "way", "p1", 15, "4"), run("C", 2, "p1", "p2", 10, "2.5")],
    "loads": [
        {"circuit": "C", "point": "p1", "load": "panel", "current": "3", "lowest": "20", "highest": "30"},
        {"circuit": "C", "point": "p2", "load": "lock", "current": "1", "lowest": "20.4", "highest": "28", "peak": "5"},
    ],
}  # fmt: skip
DEVICE = 0.6 * 3.5 / 16**2
FEEDER, FIRST, SECOND = (
    2 * 20 * R["10"] + joints("10"),
    2 * 15 * R["4"] + joints("4"),
    2 * 10 * R["2.5"] + joints("2.5"),
)


def case(tag: str = "C", **tables: Any) -> CircuitCase:
    site = site_of(TABLES | tables, {"name": "x", "nominal": "24 V", "ambient": "20 degC"})
    context = prepare(site, limits.of(site))
    return case_of(context, next(circuit for circuit in site.circuits if circuit.tag == tag))


def margin(load: str, **tables: Any) -> Margin:
    return next(found for found in margins_of(case(**tables)) if found.load.tag == load)


def test_voltages_and_margins() -> None:
    found = margin("lock")
    design = 26 - 4 * (DEVICE + FEEDER + FIRST) - SECOND
    hot = 1 + 0.00393 * 50
    conductors = 4 * (2 * 20 * R["10"] + 2 * 15 * R["4"]) + 2 * 10 * R["2.5"]
    rest = 4 * (DEVICE + joints("10") + joints("4")) + joints("2.5")
    worst = 21 - conductors * hot - rest
    assert (found.design_v, found.worst_v) == pytest.approx((design, worst), rel=1e-9)
    assert found.above_lowest_v == pytest.approx(design - 20.4)
    assert found.worst_above_lowest_v == pytest.approx(worst - 20.4)
    assert (found.most_v, found.below_highest_v) == pytest.approx((28.5, -0.5))


def test_the_path_accounts_for_every_volt() -> None:
    found = margin("lock")
    assert sum(lost.volts for lost in found.path) == pytest.approx(26 - (found.design_v or 0))
    assert sum(lost.share for lost in found.path) == pytest.approx(1)
    by_place = {(lost.what, lost.place): lost.volts for lost in found.path}
    assert by_place == pytest.approx(
        {
            ("device", "the device of F"): 4 * DEVICE,
            ("conductors", "run 1 of F"): 4 * 2 * 20 * R["10"],
            ("joints", "run 1 of F"): 4 * joints("10"),
            ("conductors", "run 1 of C"): 4 * 2 * 15 * R["4"],
            ("joints", "run 1 of C"): 4 * joints("4"),
            ("conductors", "run 2 of C"): 2 * 10 * R["2.5"],
            ("joints", "run 2 of C"): joints("2.5"),
        }
    )


def test_the_dip_at_a_peak() -> None:
    """5 A instead of 1 A through all of the path and the battery, the panel's 3 A as before."""
    peak = margin("lock").peak
    assert peak is not None
    path = DEVICE + FEEDER + FIRST + SECOND
    others = 26 - 3 * (DEVICE + FEEDER + FIRST)
    assert peak.design_v == pytest.approx(lowest_at_peak_v(others, 5.0, path, 0.02))
    assert peak.lowest_v is not None
    assert peak.lowest_v < peak.design_v - 5
    assert peak.source_ohm == 0.02


def test_alone_the_dip_is_the_plain_formula() -> None:
    """Vmin = Vs − Ipk (Rloop + Rsource)."""
    alone = [TABLES["loads"][1]]
    peak = margin("lock", loads=alone).peak
    assert peak is not None
    assert peak.design_v == pytest.approx(26 - 5 * (DEVICE + FEEDER + FIRST + SECOND + 0.02))


def test_a_source_of_unknown_resistance_is_said_to_be_left_out() -> None:
    sources = [TABLES["sources"][0] | {"resistance": ""}]
    peak = margin("lock", sources=sources, loads=[TABLES["loads"][1]]).peak
    assert peak is not None
    assert peak.source_ohm is None
    assert peak.design_v == pytest.approx(26 - 5 * (DEVICE + FEEDER + FIRST + SECOND))
    assert margin("panel").peak is None


def test_sources_in_parallel_put_the_batterys_resistance_first() -> None:
    more = [
        *TABLES["sources"],
        {"source": "RECT", "kind": "rectifier", "nominal": "24", "working": "27", "highest": "29"},
    ]
    circuits = [TABLES["circuits"][0] | {"fed_from": "MDB"}, TABLES["circuits"][1]]
    boards = [{"board": "MDB", "fed_by": "BATT + RECT"}, *TABLES["boards"]]
    found = margin("lock", sources=more, circuits=circuits, boards=boards)
    assert found.peak is not None
    assert found.peak.source_ohm == 0.02
    assert found.most_v == 29
    silent = [more[0], more[1] | {"highest": ""}]
    assert margin("lock", sources=silent, circuits=circuits, boards=boards).most_v is None


def test_what_is_not_known_is_none() -> None:
    runs = [TABLES["runs"][0], TABLES["runs"][1] | {"length": ""}, TABLES["runs"][2]]
    found = margin("lock", runs=runs)
    assert (found.design_v, found.worst_v, found.above_lowest_v, found.peak, found.path) == (None, None, None, None, ())
    loads = [row | {"lowest": "", "highest": ""} for row in TABLES["loads"]]
    found = margin("lock", loads=loads)
    assert (found.above_lowest_v, found.worst_above_lowest_v, found.below_highest_v) == (None, None, None)
    sources = [TABLES["sources"][0] | {"lowest": ""}]
    assert margin("lock", sources=sources).worst_v is None


def test_a_worst_case_may_be_given() -> None:
    judged = case()
    network = judged.context.network
    worst = network.worst(np.array([0.0, 0.0, 0.5]), np.zeros(2), np.ones(3))
    (_, before), (_, after) = margins_of(judged), margins_of(judged, worst)
    assert before.worst_v is not None
    assert after.worst_v == pytest.approx(before.worst_v - 0.5)


def test_losses_and_what_they_cost_in_a_year() -> None:
    feeder = {loss.place: loss for loss in losses_of(case("F"))}
    assert feeder["run 1 of F"].watts == pytest.approx(16 * FEEDER)
    assert feeder["the device of F"].watts == pytest.approx(16 * DEVICE)
    assert feeder["run 1 of F"].kwh_a_year(0.25) == pytest.approx(16 * FEEDER * 8.76 * 0.25)
    assert energy_kwh_a_year(100, 1) == pytest.approx(876)


def test_losses_of_circuits_on_one_return_add_to_the_whole() -> None:
    """Two circuits of 3 A and 1 A: the return's 4² R, a part to each by its own current."""
    circuits = [{"circuit": tag, "fed_from": "BATT", "device": "none"} for tag in ("A", "B")]
    runs = [run(tag, 1, "way", "box", 20, "4", **{"return": "shared:N"}) for tag in ("A", "B")]
    loads = [{"circuit": tag, "point": "box", "load": tag, "current": amps} for tag, amps in (("A", "3"), ("B", "1"))]
    tables = {"boards": [], "circuits": circuits, "runs": runs, "loads": loads}
    leg = 20 * R["4"] + joints("4", 2)
    a, b = case("A", **tables), case("B", **tables)
    assert sum(x.watts for found in (a, b) for x in losses_of(found)) == pytest.approx(9 * leg + leg + 16 * leg)
    by_what = {lost.what: lost.volts for lost in margins_of(a)[0].path}
    assert by_what["shared return"] == pytest.approx(4 * 20 * R["4"])
    assert by_what["joints of the shared return"] == pytest.approx(4 * joints("4", 2))


class TestSufficient:
    def test_the_smallest_size_and_the_fewest_conductors(self) -> None:
        """4 A over 15 m and 1 A over 10 m: 0.553 + 0.150 V of 0.72 V allowed, not beyond doubt; 4 mm² throughout is."""
        judged = case()
        by_size, by_number = sufficient_of(judged, judged.loads[1])
        assert by_size is not None
        assert by_size.drop_v == pytest.approx(4 * FIRST + 2 * 10 * R["4"] + joints("4"), rel=1e-6)
        assert (by_size.size, by_size.runs, by_size.parallel) == ("4 mm2", ("run 2",), 1)
        assert by_number is not None
        assert (by_number.size, by_number.runs, by_number.parallel) == ("", ("run 1", "run 2"), 2)

    def test_a_circuit_that_conforms_needs_nothing(self) -> None:
        judged = case(circuits=[TABLES["circuits"][0], TABLES["circuits"][1] | {"allowed_drop": "10"}])
        by_size, by_number = sufficient_of(judged, judged.loads[1])
        assert by_size is not None
        assert by_size.runs == ()
        assert by_size.drop_v == pytest.approx(4 * FIRST + SECOND)
        assert by_number is not None
        assert (by_number.runs, by_number.parallel) == ((), 1)

    def test_nothing_on_the_ladder_may_be_enough(self) -> None:
        judged = case(circuits=[TABLES["circuits"][0], TABLES["circuits"][1] | {"allowed_drop": "0.01"}])
        assert sufficient_of(judged, judged.loads[1]) == (None, None)

    def test_constant_power_draws_less_behind_a_larger_conductor(self) -> None:
        loads = [{"circuit": "C", "point": "p2", "load": "drive", "power": "300"}]
        judged = case(loads=loads, circuits=[TABLES["circuits"][0], TABLES["circuits"][1] | {"allowed_drop": "8"}])
        by_size, _ = sufficient_of(judged, judged.loads[0])
        assert by_size is not None
        size = by_size.size.removesuffix(" mm2")
        bus = judged.context.network.design.voltage_v[judged.context.network.nodes_of[judged.circuit.id]["bus"]]
        ohm = 2 * 25 * R[size] + 2 * joints(size)
        assert by_size.drop_v == pytest.approx(bus - (bus + (bus**2 - 4 * 300 * ohm) ** 0.5) / 2, rel=1e-6)

    def test_what_hangs_further_down_stays(self) -> None:
        """The feeder has a load of its own beside the board's 4 A."""
        loads = [*TABLES["loads"], {"circuit": "F", "point": "db", "load": "sign", "current": "6"}]
        circuits = [TABLES["circuits"][0] | {"allowed_drop": "3"}, TABLES["circuits"][1]]
        judged = case("F", loads=loads, circuits=circuits)
        by_size, _ = sufficient_of(judged, judged.loads[0])
        assert by_size is not None
        assert by_size.size == "16 mm2"
        assert by_size.drop_v == pytest.approx(10 * (DEVICE + 2 * 20 * R["16"] + joints("16")), rel=1e-6)

    def test_a_shared_return_keeps_what_the_others_put_into_it(self) -> None:
        circuits = [{"circuit": tag, "fed_from": "BATT", "device": "none", "allowed_drop": "3"} for tag in ("A", "B")]
        more = {"return": "shared:N", "return_size": "16 mm2"}
        runs = [run(tag, 1, "way", "box", 30, "4", **more) for tag in ("A", "B")]
        loads = [{"circuit": tag, "point": "box", "load": tag, "current": "4"} for tag in ("A", "B")]
        judged = case("A", boards=[], circuits=circuits, runs=runs, loads=loads)
        by_size, _ = sufficient_of(judged, judged.loads[0])
        assert by_size is not None
        back = 8 * (30 * R["16"] + joints("16", 2))
        assert by_size.size == "6 mm2"
        assert by_size.drop_v == pytest.approx(4 * (30 * R["6"] + joints("6", 2)) + back, rel=1e-6)

    def test_in_a_mesh_no_single_way_is_the_loads(self) -> None:
        runs = [*TABLES["runs"], run("C", 3, "way", "p2", 30, "2.5")]
        judged = case(runs=runs)
        assert sufficient_of(judged, judged.loads[1]) == (None, None)

    def test_vd01_says_it_with_numbers(self) -> None:
        circuits = [TABLES["circuits"][0], TABLES["circuits"][1] | {"allowed_drop": "2"}]
        site = site_of(TABLES | {"circuits": circuits}, {"name": "x", "nominal": "24 V", "ambient": "20 degC"})
        (found,) = [f for f in assess(site, limits.of(site)).findings if f.rule == "VD01" and f.circuit == "C"]
        assert found.remedy == (
            "Measure the drop of each run at a known current; then 6 mm² in runs 1, 2 (0.436 V, 1.82 %) or "
            "2 times the conductors in runs 1, 2 (0.357 V, 1.49 %) would do by the drop alone, or choose a shorter way or a "
            "nearer board."
        )
        assert found.numbers["drop at sufficient size"].value == pytest.approx(
            4 * (2 * 15 * R["6"] + joints("6")) + 2 * 10 * R["6"] + joints("6"), rel=1e-6
        )

    def test_vd03_says_what_would_do_in_the_circuit_alone(self) -> None:
        """Of 5 % of 24 V, 1.2 V, its feeder leaves the circuit what it does not lose itself."""
        runs = [run("F", 1, "way", "db", 70, "10"), *TABLES["runs"][1:]]
        site = site_of(TABLES | {"runs": runs}, {"name": "x", "nominal": "24 V", "ambient": "20 degC"})
        (found,) = [f for f in assess(site, limits.of(site)).findings if f.rule == "VD03" and f.circuit == "C"]
        assert "in this circuit alone" in found.remedy
        numbers = found.numbers
        feeder_v = numbers["drop"].value - numbers["behind the board"].value
        assert numbers["drop"].value > 0.05 * 24 > feeder_v + numbers["drop at sufficient size"].value
