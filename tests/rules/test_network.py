"""From the record to a solved network: feeders, boards, converters, parallel sources, and what is not known."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess, prepare
from rules.assessment import Assessment
from rules.nominal import nominal_v
from rules.record import Site

Tables = dict[str, list[dict[str, str]]]

PLANT: Tables = {
    "sources": [
        {"source": "RECT", "kind": "rectifier", "nominal": "48", "working": "54", "lowest": "50"},
        {"source": "BATT", "kind": "battery", "nominal": "48", "working": "52", "lowest": "42"},
    ],
    "boards": [{"board": "MDB", "fed_by": "RECT + BATT"}, {"board": "DB1", "fed_by": "F1"}],
    "circuits": [
        {"circuit": "F1", "fed_from": "MDB", "device": "none"},
        {"circuit": "C1", "fed_from": "DB1", "device": "none"},
    ],
    "runs": [
        {
            "circuit": "F1",
            "run": "1",
            "from": "way",
            "to": "end",
            "length": "30",
            "size": "16 mm2",
            "temperature": "20",
        },
        {"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "10", "size": "4 mm2", "temperature": "20"},
    ],
    "loads": [{"circuit": "C1", "point": "p1", "load": "shelf", "current": "10"}],
}


def joints(area: float) -> float:
    return float(4 * 0.15e-3 * (10 / area) ** 0.5 * math.exp(math.log(2) ** 2 / 2))


F1_OHM = 2 * 30 * 1.15e-3 + joints(16)
C1_OHM = 2 * 10 * 4.61e-3 + joints(4)
"""IEC 60228:2004, class 2: 16 mm² 1.15 Ω/km, 4 mm² 4.61 Ω/km. [ohm]"""


def plant(**tables: list[dict[str, str]]) -> Site:
    return site_of(PLANT | tables, {"name": "x", "nominal": "48 V"})


def judged(site: Site) -> Assessment:
    return assess(site, limits.of(site))


def design(assessment: Assessment, circuit: str, point: str) -> float | None:
    result = next(r for r in assessment.circuits if r.circuit == circuit)
    figure = next(p for p in result.points if p.point == point).design
    return None if figure is None else figure.value


def without(table: list[dict[str, str]], *tags: str) -> list[dict[str, str]]:
    return [row for row in table if not set(row.values()) & set(tags)]


def test_parallel_sources_stand_at_the_highest_working_voltage() -> None:
    assert design(judged(plant()), "C1", "p1") == pytest.approx(54 - 10 * (F1_OHM + C1_OHM), rel=1e-6)


def test_the_lowest_is_the_batterys() -> None:
    site = plant()
    network = prepare(site, limits.of(site)).network
    held = network.node_of["boards", site.boards[0].id]
    assert network.held_lowest_v[held] == 42


def test_without_a_battery_the_lowest_of_the_sources_counts() -> None:
    sources = [row | {"kind": "rectifier"} for row in PLANT["sources"]]
    site = plant(sources=sources)
    network = prepare(site, limits.of(site)).network
    assert network.held_lowest_v[network.node_of["boards", site.boards[0].id]] == 42


def test_a_converter_is_a_constant_power_load_where_it_is_fed() -> None:
    """24 V × 20 A / 0.8 = 600 W at the end of F1; its own output stands at its own voltage."""
    tables: Any = {
        "sources": [
            *PLANT["sources"],
            {"source": "CONV", "kind": "converter", "nominal": "24", "fed_from": "F1:end", "efficiency": "80"},
        ],
        "circuits": [*PLANT["circuits"], {"circuit": "K1", "fed_from": "CONV", "device": "none"}],
        "runs": [
            *PLANT["runs"],
            {"circuit": "K1", "run": "1", "from": "way", "to": "p1", "length": "1", "size": "10 mm2"},
        ],
        "loads": [{"circuit": "K1", "point": "p1", "load": "drive", "current": "20"}],
    }
    assessment = judged(plant(**tables))
    end = design(assessment, "F1", "end")
    assert end == pytest.approx((54 + (54**2 - 4 * 600 * F1_OHM) ** 0.5) / 2, rel=1e-9)
    assert design(assessment, "K1", "way") == pytest.approx(24)


def test_an_unknown_load_leaves_every_voltage_behind_its_feeder_open() -> None:
    loads = [*PLANT["loads"], {"circuit": "F1", "point": "end", "load": "rest", "current": ""}]
    assessment = judged(plant(loads=loads))
    assert design(assessment, "C1", "p1") is None
    assert design(assessment, "F1", "way") == pytest.approx(54)
    assert "what rest on F1 draws is not known" in {gap.why for gap in assessment.not_judged}


RING: Any = [
    *PLANT["runs"],
    {"circuit": "C1", "run": "2", "from": "p1", "to": "p2", "length": "20", "size": "4 mm2", "temperature": "20"},
    {"circuit": "C1", "run": "3", "from": "way", "to": "p2", "length": "30", "size": "4 mm2", "temperature": "20"},
]


def test_a_ring_within_a_circuit() -> None:
    """10 A at p1: run 1 against runs 2 and 3 in series, joints included; the currents are in inverse proportion."""
    one, rest = C1_OHM, 2 * 50 * 4.61e-3 + 2 * joints(4)
    assessment = judged(plant(runs=RING))
    assert design(assessment, "C1", "p1") == pytest.approx(54 - 10 * F1_OHM - 10 * one * rest / (one + rest), rel=1e-9)
    site = plant(runs=RING)
    network = prepare(site, limits.of(site)).network
    by_run = {run.name: network.design.current_a[network.node_at_run_end[run.id]] for run in site.runs[1:]}
    around = 10 * one / (one + rest)
    assert by_run == pytest.approx({"run 1": 10 - around, "run 2": -around, "run 3": around})


def test_a_run_of_unknown_length_leaves_its_whole_mesh_open() -> None:
    runs = [*RING[:3], RING[3] | {"length": ""}]
    assessment = judged(plant(runs=runs))
    assert design(assessment, "C1", "p1") is None
    assert design(assessment, "C1", "way") == pytest.approx(54 - 10 * F1_OHM, rel=1e-6)
    (gap,) = {g.why for g in assessment.not_judged if g.rule == "VD01"}
    assert gap == "the length of run 3 is not known"
    assert [f.rule for f in assessment.findings] == ["RC01"]


TIE: Any = {
    "boards": [*PLANT["boards"], {"board": "DB2", "fed_by": "F2"}],
    "circuits": [
        *PLANT["circuits"],
        {"circuit": "F2", "fed_from": "MDB", "device": "none"},
        {"circuit": "T", "fed_from": "DB2", "device": "none"},
    ],
    "runs": [
        *PLANT["runs"],
        PLANT["runs"][0] | {"circuit": "F2", "length": "60"},
        PLANT["runs"][0] | {"circuit": "T", "to": "board:DB1", "length": "15"},
    ],
}


def test_a_tie_between_two_boards() -> None:
    """10 A at DB1: through F1 alone, or through F2 and the tie."""
    other = F1_OHM + joints(16) + 2 * 45 * 1.15e-3  # 60 m + 15 m in two runs
    assessment = judged(plant(**TIE))
    drop = 10 * F1_OHM * other / (F1_OHM + other)
    assert design(assessment, "C1", "way") == pytest.approx(54 - drop, rel=1e-9)
    assert design(assessment, "T", "board:DB1") == pytest.approx(54 - drop, rel=1e-9)
    assert design(assessment, "F2", "end") == pytest.approx(54 - drop * (F1_OHM + 2 * 30 * 1.15e-3) / other, rel=1e-9)


def test_a_board_fed_from_two_circuits() -> None:
    """Intake refuses it; a site file may hold it all the same. Two equal feeders carry half each."""
    tables: Any = {
        "boards": [PLANT["boards"][0], {"board": "DB1", "fed_by": "F1 + F2"}],
        "circuits": [*PLANT["circuits"], {"circuit": "F2", "fed_from": "MDB", "device": "none"}],
        "runs": [*PLANT["runs"], PLANT["runs"][0] | {"circuit": "F2"}],
    }
    assessment = judged(site_of(PLANT | tables, {"name": "x"}, check=False))
    assert design(assessment, "C1", "way") == pytest.approx(54 - 5 * F1_OHM, rel=1e-9)


def test_a_feeder_may_name_the_board_at_its_end() -> None:
    """``board:TAG`` of the board that the circuit feeds is where it ends, and closes nothing."""
    runs = [PLANT["runs"][0] | {"to": "board:DB1"}, PLANT["runs"][1]]
    assessment = judged(plant(runs=runs))
    assert design(assessment, "C1", "p1") == pytest.approx(54 - 10 * (F1_OHM + C1_OHM), rel=1e-9)
    assert design(assessment, "F1", "board:DB1") == pytest.approx(54 - 10 * F1_OHM, rel=1e-9)


def test_current_driven_back_into_a_source_is_not_computed() -> None:
    """A run from the 24.5 V board to the 24.1 V one: a supply's voltage while it is fed is not known."""
    tables: Any = {
        "sources": [
            {"source": "A", "kind": "power supply", "nominal": "24", "working": "24.5", "lowest": "22"},
            {"source": "B", "kind": "power supply", "nominal": "24", "working": "24.1", "lowest": "22"},
        ],
        "boards": [{"board": "TA", "fed_by": "A"}, {"board": "TB", "fed_by": "B"}],
        "circuits": [
            {"circuit": "T", "fed_from": "TA", "device": "none"},
            {"circuit": "C", "fed_from": "TB", "device": "none"},
        ],
        "runs": [
            {
                "circuit": "T",
                "run": "1",
                "from": "way",
                "to": "board:TB",
                "length": "10",
                "size": "4 mm2",
                "temperature": "20",
            },
            {
                "circuit": "C",
                "run": "1",
                "from": "way",
                "to": "p1",
                "length": "10",
                "size": "4 mm2",
                "temperature": "20",
            },
        ],
        "loads": [{"circuit": "C", "point": "p1", "load": "lamp", "current": "1"}],
    }
    assessment = judged(plant(**tables))
    assert design(assessment, "T", "board:TB") is None
    assert design(assessment, "C", "p1") == pytest.approx(24.1 - C1_OHM)
    heavy = tables | {"loads": [{"circuit": "C", "point": "p1", "load": "lamp", "current": "9"}]}
    # 0.4 V drive 4.3 A through the tie; the lamp takes more than that from the board, so B gives the rest
    assert design(judged(plant(**heavy)), "T", "board:TB") == pytest.approx(24.1)


SHARED: Any = {
    "circuits": [{"circuit": f"C{k}", "fed_from": "MDB", "device": "none"} for k in (1, 2, 3)],
    "boards": PLANT["boards"][:1],
    "runs": [
        {
            "circuit": f"C{k}", "run": "1", "from": "way", "to": "box", "length": length, "size": "1.5 mm2",
            "temperature": "20", "return": "shared:N", "return_size": "2.5 mm2" if k == 1 else "",
        }
        for k, length in ((1, "40"), (2, "30"), (3, "40"))
    ],
    "loads": [{"circuit": f"C{k}", "point": "box", "load": f"lamp {k}", "current": "2"} for k in (1, 2, 3)],
}  # fmt: skip
OWN = 12.1e-3, joints(1.5) / 2
BACK = 40 * 7.41e-3 + joints(2.5) / 2
"""IEC 60228:2004, class 2: 1.5 mm² 12.1 Ω/km, 2.5 mm² 7.41 Ω/km; the return is as long as the longest run."""


def test_a_shared_return_carries_the_sum() -> None:
    assessment = judged(plant(**SHARED))
    for circuit, length in (("C1", 40), ("C2", 30), ("C3", 40)):
        assert design(assessment, circuit, "box") == pytest.approx(
            54 - 2 * (length * OWN[0] + OWN[1]) - 6 * BACK, rel=1e-9
        )
        assert design(assessment, circuit, "way") == pytest.approx(54)


def test_one_unknown_length_leaves_a_shared_return_open() -> None:
    runs = [SHARED["runs"][0], SHARED["runs"][1] | {"length": ""}, SHARED["runs"][2]]
    assessment = judged(plant(**SHARED | {"runs": runs}))
    assert design(assessment, "C1", "box") is None
    assert "the length of run 1 is not known" in {g.why for g in assessment.not_judged if g.circuit == "C1"}


def test_one_unknown_load_makes_a_shared_return_carry_at_least_so_much() -> None:
    loads = [SHARED["loads"][0] | {"current": ""}, *SHARED["loads"][1:]]
    circuits = [row | {"allowed_drop": "1"} for row in SHARED["circuits"]]
    assessment = judged(plant(**SHARED | {"loads": loads, "circuits": circuits}))
    (found,) = [f for f in assessment.findings if f.rule == "VD01" and f.circuit == "C2"]
    assert found.why.startswith("at least ")
    assert found.numbers["drop"].value == pytest.approx(2 * (30 * OWN[0] + OWN[1]) + 4 * BACK, rel=1e-9)


def test_a_structure_return_is_said_not_to_be_computed() -> None:
    runs = [PLANT["runs"][0], PLANT["runs"][1] | {"return": "structure"}]
    assessment = judged(plant(runs=runs))
    assert "run 1 returns through the structure, whose resistance is not known" in {
        g.why for g in assessment.not_judged
    }


def test_a_device_in_both_legs_does_not_part_them() -> None:
    circuits = [
        PLANT["circuits"][0],
        PLANT["circuits"][1] | {"device": "breaker C", "device_rating": "16", "device_poles": "2"},
    ]
    both = [circuits[0], circuits[1] | {"device_leg": "both"}]
    ohm = 2 * 0.6 * 3.5 / 16**2
    for given in (circuits, both):
        assessment = judged(plant(circuits=given))
        assert design(assessment, "C1", "way") == pytest.approx(54 - 10 * (F1_OHM + ohm), rel=1e-9)


CONVERTER: Any = {
    "sources": [
        *PLANT["sources"],
        {"source": "CONV", "kind": "converter", "nominal": "24", "fed_from": "F1:end", "efficiency": "80"},
    ],
    "circuits": [*PLANT["circuits"], {"circuit": "K1", "fed_from": "CONV", "device": "none"}],
    "runs": [*PLANT["runs"], {"circuit": "K1", "run": "1", "from": "way", "to": "p1", "length": "1", "size": "10 mm2"}],
    "loads": [{"circuit": "K1", "point": "p1", "load": "drive", "current": "20"}],
}


def test_a_converter_feeds_a_board_of_its_own() -> None:
    board = {"board": "KB", "fed_by": "CONV"}
    circuits = [*PLANT["circuits"], {"circuit": "K1", "fed_from": "KB", "device": "none"}]
    assessment = judged(plant(**CONVERTER | {"boards": [*PLANT["boards"], board], "circuits": circuits}))
    assert design(assessment, "F1", "end") == pytest.approx((54 + (54**2 - 4 * 600 * F1_OHM) ** 0.5) / 2, rel=1e-9)


def test_converters_behind_converters() -> None:
    """24 V × 10 A / 0.8 = 300 W out of 36 V, 300 W / 0.5 = 600 W out of the 48 V plant."""
    tables: Any = {
        "sources": [
            *PLANT["sources"],
            {"source": "INNER", "kind": "converter", "nominal": "24", "fed_from": "K0:far", "efficiency": "80"},
            {"source": "OUTER", "kind": "converter", "nominal": "36", "fed_from": "F1:end", "efficiency": "50"},
        ],
        "circuits": [
            *PLANT["circuits"],
            {"circuit": "K0", "fed_from": "OUTER", "device": "none"},
            {"circuit": "K1", "fed_from": "INNER", "device": "none"},
        ],
        "runs": [
            *PLANT["runs"],
            {"circuit": "K0", "run": "1", "from": "way", "to": "far", "length": "0", "size": "300 mm2"},
            {"circuit": "K1", "run": "1", "from": "way", "to": "p1", "length": "1", "size": "10 mm2"},
        ],
        "loads": [{"circuit": "K1", "point": "p1", "load": "drive", "current": "10"}],
    }
    assessment = judged(plant(**tables))
    assert design(assessment, "F1", "end") == pytest.approx((54 + (54**2 - 4 * 600 * F1_OHM) ** 0.5) / 2, rel=1e-3)


def test_a_converter_holds_its_lowest_voltage_while_the_plant_is_at_its_lowest() -> None:
    """22 V × 20 A / 0.8 = 550 W out of the battery's 42 V, through conductors of 70 °C."""
    sources = [*CONVERTER["sources"][:2], CONVERTER["sources"][2] | {"lowest": "22"}]
    site = plant(**CONVERTER | {"sources": sources})
    network = prepare(site, limits.of(site)).network
    nodes = {circuit.tag: network.nodes_of[circuit.id] for circuit in site.circuits}
    hot_ohm = (F1_OHM - joints(16)) * (1 + 0.00393 * 50) + joints(16)
    expected = (42 + (42**2 - 4 * 550 * hot_ohm) ** 0.5) / 2
    assert network.lowest.voltage_v[nodes["F1"]["end"]] == pytest.approx(expected, rel=1e-9)
    assert network.lowest.voltage_v[nodes["K1"]["way"]] == pytest.approx(22)


def test_a_converter_below_the_voltage_of_a_battery_beside_it_gives_nothing() -> None:
    """The busbar has the battery's 26 V, so that the converter draws nothing at the end of F1."""
    beside = {"source": "BAT2", "kind": "battery", "nominal": "24", "working": "26", "lowest": "21"}
    circuits = [*PLANT["circuits"], {"circuit": "K1", "fed_from": "KB", "device": "none"}]
    boards = [*PLANT["boards"], {"board": "KB", "fed_by": "CONV + BAT2"}]
    tables = CONVERTER | {"sources": [*CONVERTER["sources"], beside], "circuits": circuits, "boards": boards}
    assessment = judged(plant(**tables))
    assert design(assessment, "K1", "way") == pytest.approx(26)
    assert design(assessment, "F1", "end") == pytest.approx(54)


def nested(current: str, efficiency: str = "80") -> Site:
    """INNER takes its power from K0, which OUTER feeds at the end of F1."""
    return plant(
        sources=[
            *PLANT["sources"],
            {"source": "INNER", "kind": "converter", "nominal": "24", "fed_from": "K0:far", "efficiency": efficiency},
            {"source": "OUTER", "kind": "converter", "nominal": "36", "fed_from": "F1:end", "efficiency": "50"},
        ],
        circuits=[
            *PLANT["circuits"],
            {"circuit": "K0", "fed_from": "OUTER", "device": "none"},
            {"circuit": "K1", "fed_from": "INNER", "device": "none"},
        ],
        runs=[
            *PLANT["runs"],
            {"circuit": "K0", "run": "1", "from": "way", "to": "far", "length": "1", "size": "300 mm2"},
            {"circuit": "K1", "run": "1", "from": "way", "to": "p1", "length": "1", "size": "10 mm2"},
        ],
        loads=[
            {"circuit": "K1", "point": "p1", "load": "drive", "current": current},
            {"circuit": "C1", "point": "p1", "load": "shelf", "current": "1"},
        ],
    )


def test_an_inner_converter_goes_with_the_outer_one() -> None:
    """24 V × 200 A / 0.8 / 0.5 = 12 kW where 10.2 kW could be had: both converters and all that hangs on them."""
    assessment = judged(nested("200"))
    for circuit, point in (("K0", "far"), ("K1", "way"), ("K1", "p1")):
        assert design(assessment, circuit, point) is None
    assert design(judged(nested("10")), "K1", "way") == pytest.approx(24)


def test_what_an_inner_converter_draws_leaves_the_outer_one_open() -> None:
    assessment = judged(nested("10", efficiency=""))
    for circuit, point in (("K0", "far"), ("F1", "end")):
        assert design(assessment, circuit, point) is None
    assert design(assessment, "F1", "way") == pytest.approx(54)


def test_a_converter_of_no_voltage_draws_what_is_not_known() -> None:
    sources = [*CONVERTER["sources"][:2], CONVERTER["sources"][2] | {"nominal": ""}]
    assessment = judged(site_of(PLANT | CONVERTER | {"sources": sources}, {"name": "x"}, check=False))
    assert design(assessment, "F1", "end") is None
    assert design(assessment, "F1", "way") == pytest.approx(54)


def test_the_doubt_of_a_device_is_in_the_computed_drop() -> None:
    """A 16 A breaker B of two poles, 30 % of 2 × 0.6 × 3.5 W / (16 A)² at 10 A, squared, is what it adds."""
    ohm = 2 * 0.6 * 3.5 / 16**2
    squares = []
    for device in ({"device": "none"}, {"device": "breaker B", "device_rating": "16", "device_poles": "2"}):
        circuits = [PLANT["circuits"][0], PLANT["circuits"][1] | device]
        result = next(r for r in judged(plant(circuits=circuits)).circuits if r.circuit == "C1")
        assert result.design_drop is not None
        squares.append((result.design_drop.u or 0.0) ** 2)
    assert squares[1] - squares[0] == pytest.approx((0.3 * ohm * 10) ** 2, rel=1e-6)


@pytest.mark.parametrize(
    "change",
    [
        {"sources": [*CONVERTER["sources"][:2], CONVERTER["sources"][2] | {"efficiency": ""}]},
        {"loads": [CONVERTER["loads"][0] | {"current": ""}]},
    ],
)
def test_what_a_converter_draws_may_be_unknown(change: Any) -> None:
    assessment = judged(plant(**CONVERTER | change))
    assert design(assessment, "F1", "end") is None
    assert design(assessment, "F1", "way") == pytest.approx(54)


def test_a_converter_that_cannot_be_supplied_takes_its_loads_with_it() -> None:
    """54² / (4 × 0.0716 Ω) = 10.2 kW could be had of 12 kW."""
    loads = [CONVERTER["loads"][0] | {"current": "400"}]
    assessment = judged(plant(**CONVERTER | {"loads": loads}))
    assert design(assessment, "K1", "p1") is None
    (found,) = [f for f in assessment.findings if f.rule == "NW01"]
    assert found.circuit == "K1"
    assert "through run 1 of F1 at most" in found.why
    assert found.numbers["at most W"].value == pytest.approx(54**2 / (4 * F1_OHM), rel=1e-6)


def test_a_load_that_collapses_leaves_the_rest_of_the_site_as_it_is() -> None:
    tables: Any = {
        "circuits": [*PLANT["circuits"], {"circuit": "C2", "fed_from": "DB1", "device": "none"}],
        "runs": [*PLANT["runs"], PLANT["runs"][1] | {"circuit": "C2"}],
        "loads": [*PLANT["loads"], {"circuit": "C2", "point": "p1", "load": "typing slip", "power": "600 kW"}],
    }
    assessment = judged(plant(**tables))
    assert design(assessment, "C1", "p1") == pytest.approx(54 - 10 * (F1_OHM + C1_OHM), rel=1e-9)
    assert design(assessment, "C2", "p1") is None
    assert [f.circuit for f in assessment.findings if f.rule == "NW01"] == ["C2"]


def test_a_load_on_a_board_that_nothing_feeds() -> None:
    circuits = [row | {"fed_from": "DB1"} for row in PLANT["circuits"]]  # F1 feeds DB1 and hangs on it
    assessment = judged(site_of(PLANT | {"circuits": circuits}, {"name": "x"}, check=False))
    assert {f.why for f in assessment.findings if f.rule == "RC01"} == {
        "nothing in the record feeds F1",
        "nothing in the record feeds C1",
    }
    (loop,) = [f for f in assessment.findings if f.rule == "RC02"]
    assert "'DB1' is fed by itself, through 'F1'" in loop.why
    assert all(result.points == () for result in assessment.circuits)


def test_worst_takes_what_readings_support() -> None:
    site = plant()
    network = prepare(site, limits.of(site)).network
    none, factor = np.zeros(2), np.ones(2)
    node = network.nodes_of[site.circuits[1].id]["p1"]
    same = network.worst(none, none, factor)
    np.testing.assert_allclose(same.voltage_v, network.lowest.voltage_v, rtol=1e-12)
    hot = 1 + 0.00393 * 50
    worse = network.worst(np.array([0.0, 0.010]), np.array([0.0, 0.5]), np.array([1.0, 1.6]))
    lost = 10 * (0.010 + 0.6 * (C1_OHM - joints(4)) * hot) + 0.5
    assert same.voltage_v[node] - worse.voltage_v[node] == pytest.approx(lost, rel=1e-6)


def test_the_return_may_be_of_another_size_and_metal() -> None:
    """Positive leg 4 mm² copper, negative leg 16 mm² aluminium: 4.61 + 1.91 Ω/km (IEC 60228:2004)."""
    runs = [PLANT["runs"][0], PLANT["runs"][1] | {"return_size": "16 mm2", "return_material": "aluminium"}]
    lost = 10 * (10 * (4.61e-3 + 1.91e-3) + (joints(4) + joints(16)) / 2)
    assessment = judged(plant(runs=runs))
    bus, end = design(assessment, "C1", "way"), design(assessment, "C1", "p1")
    assert bus is not None
    assert end is not None
    assert bus - end == pytest.approx(lost, rel=1e-4)


def test_parallel_conductors_share_the_current_but_not_the_joints() -> None:
    runs = [PLANT["runs"][0], PLANT["runs"][1] | {"parallel": "2"}]
    assessment = judged(plant(runs=runs))
    bus, end = design(assessment, "C1", "way"), design(assessment, "C1", "p1")
    assert bus is not None
    assert end is not None
    assert bus - end == pytest.approx(10 * (10 * 4.61e-3 + joints(4)), rel=1e-4)


def test_nominal_voltage_comes_from_the_nearest_that_states_it() -> None:
    site = plant()
    index = prepare(site, limits.of(site)).index
    by_tag = {circuit.tag: circuit for circuit in site.circuits}
    assert nominal_v(by_tag["C1"], index) == 48  # the source's, through board, feeder and board
    sources = [row | {"nominal": ""} for row in PLANT["sources"]]
    bare = site_of(PLANT | {"sources": sources}, {"name": "x", "nominal": "50 V"})
    index = prepare(bare, limits.of(bare)).index
    assert nominal_v(bare.circuits[1], index) == 50  # the site's


def test_a_temperature_that_nobody_recorded_is_the_profiles() -> None:
    runs = [{name: cell for name, cell in row.items() if name != "temperature"} for row in PLANT["runs"]]
    assessment = judged(plant(runs=runs))
    warm = 1 + 0.00393 * 5  # 25 °C
    end = design(assessment, "C1", "p1")
    assert end == pytest.approx(
        54 - 10 * ((F1_OHM - joints(16)) * warm + joints(16) + (C1_OHM - joints(4)) * warm + joints(4)), rel=1e-6
    )


def test_a_board_hangs_on_the_feeder_that_leads_somewhere() -> None:
    """The first of its feeders is not in the record; intake refuses that, a combined site file may hold it."""
    boards = [PLANT["boards"][0], {"board": "DB1", "fed_by": "GONE + F1"}]
    assessment = judged(site_of(PLANT | {"boards": boards}, {"name": "x"}, check=False))
    assert design(assessment, "C1", "p1") == pytest.approx(54 - 10 * (F1_OHM + C1_OHM), rel=1e-9)


def test_a_run_that_starts_nowhere_or_goes_nowhere_is_left_out() -> None:
    runs = [
        *PLANT["runs"],
        PLANT["runs"][1] | {"run": "2", "from": "p9", "to": "p3"},
        PLANT["runs"][1] | {"run": "3", "from": "p1", "to": "p1"},
    ]
    assessment = judged(site_of(PLANT | {"runs": runs}, {"name": "x"}, check=False))
    assert design(assessment, "C1", "p1") == pytest.approx(54 - 10 * (F1_OHM + C1_OHM), rel=1e-9)
    assert {f.rule for f in assessment.findings if f.circuit == "C1"} == {"RC02"}


def test_a_run_to_a_board_that_is_not_there_closes_nothing() -> None:
    runs = [*PLANT["runs"], PLANT["runs"][1] | {"run": "2", "from": "p1", "to": "board:GONE"}]
    assessment = judged(site_of(PLANT | {"runs": runs}, {"name": "x"}, check=False))
    assert design(assessment, "C1", "p1") == pytest.approx(54 - 10 * (F1_OHM + C1_OHM), rel=1e-9)


@pytest.mark.parametrize("loads", [[PLANT["loads"][0] | {"current": "-3"}], [PLANT["loads"][0] | {"point": "p7"}]])
def test_a_load_that_cannot_be_does_not_stop_the_rest(loads: list[dict[str, str]]) -> None:
    assessment = judged(site_of(PLANT | {"loads": loads}, {"name": "x"}, check=False))
    assert design(assessment, "F1", "way") == pytest.approx(54)
    assert "RC02" in {f.rule for f in assessment.findings}


def test_two_unknown_loads_behind_one_feeder() -> None:
    loads = [
        *PLANT["loads"],
        {"circuit": "F1", "point": "end", "load": "one", "current": ""},
        {"circuit": "C1", "point": "p1", "load": "two", "current": ""},
    ]
    assessment = judged(plant(loads=loads))
    assert design(assessment, "C1", "p1") is None
    assert {f.where for f in assessment.findings if f.rule == "RC01"} == {"end", "p1"}


def test_a_length_below_zero_is_not_a_length() -> None:
    runs = [PLANT["runs"][0], PLANT["runs"][1] | {"length": "-5"}]
    assessment = judged(site_of(PLANT | {"runs": runs}, {"name": "x"}, check=False))
    assert design(assessment, "C1", "p1") is None
    assert design(assessment, "F1", "end") == pytest.approx(54 - 10 * F1_OHM, rel=1e-9)
