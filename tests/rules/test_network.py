"""From the record to a solved network: feeders, boards, converters, parallel sources, and what is not known."""

from __future__ import annotations

import math
from typing import Any

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess, prepare
from rules.assessment import Assessment
from rules.network import nominal_v
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


def test_a_mesh_is_said_not_to_be_computed() -> None:
    ring = [
        *PLANT["runs"],
        {"circuit": "C1", "run": "2", "from": "p1", "to": "p2", "length": "10", "size": "4 mm2"},
        {"circuit": "C1", "run": "3", "from": "way", "to": "p2", "length": "10", "size": "4 mm2"},
    ]
    assessment = judged(plant(runs=ring))
    assert design(assessment, "C1", "p1") is None
    assert "run 3 closes a mesh, which this version does not compute" in {gap.why for gap in assessment.not_judged}


def test_a_board_fed_from_two_circuits_is_said_not_to_be_computed() -> None:
    tables: Any = {
        "boards": [PLANT["boards"][0], {"board": "DB1", "fed_by": "F1 + F2"}],
        "circuits": [*PLANT["circuits"], {"circuit": "F2", "fed_from": "MDB", "device": "none"}],
        "runs": [
            *PLANT["runs"],
            {"circuit": "F2", "run": "1", "from": "way", "to": "end", "length": "30", "size": "16 mm2"},
        ],
    }
    assessment = judged(site_of(PLANT | tables, {"name": "x"}, check=False))  # intake refuses it
    assert "DB1 is fed from several sides, which this version does not compute" in {
        g.why for g in assessment.not_judged
    }


@pytest.mark.parametrize(
    ("cell", "text"),
    [
        ({"return": "shared:N"}, "run 1 shares its return with other circuits, which this version does not compute"),
        ({"return": "structure"}, "run 1 returns through the structure, whose resistance is not known"),
    ],
)
def test_other_returns_are_said_not_to_be_computed(cell: dict[str, str], text: str) -> None:
    runs = [PLANT["runs"][0], PLANT["runs"][1] | cell]
    assert text in {gap.why for gap in judged(plant(runs=runs)).not_judged}


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
