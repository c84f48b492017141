"""Ids of findings: two places never make one, whatever their names."""

from __future__ import annotations

from typing import Any

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess

SOURCE = {"source": "P", "kind": "battery", "nominal": "24", "working": "25", "lowest": "21.5"}


def ids_of(tables: dict[str, list[dict[str, Any]]]) -> list[str]:
    site = site_of(tables, {"name": "case", "nominal": "24 V"})
    return [finding.id for finding in assess(site, limits.of(site)).findings]


def test_a_point_called_like_a_point_and_its_load_has_an_id_of_its_own() -> None:
    load = {"circuit": "C", "current": "1", "lowest": "23.9"}
    found = ids_of(
        {
            "sources": [SOURCE],
            "circuits": [{"circuit": "C", "fed_from": "P", "device": "none"}],
            "runs": [
                {"circuit": "C", "run": "1", "from": "way", "to": "a", "length": "8", "size": "2.5 mm2"},
                {"circuit": "C", "run": "2", "from": "a", "to": "a, y", "length": "3", "size": "2.5 mm2"},
            ],
            "loads": [
                load | {"point": "a", "load": "x"},
                load | {"point": "a", "load": "y"},
                load | {"point": "a, y", "load": "z"},
            ],
        }
    )
    assert [id_ for id_ in found if id_.startswith("LV01")] == ["LV01/C/a, x", "LV01/C/a, y", 'LV01/C/"a, y"']
    assert len(set(found)) == len(found)


def test_a_circuit_called_like_a_board_has_an_id_of_its_own() -> None:
    times = [
        {"round": "1", "value": value, "taken_at": f"2026-03-01T{at}"} for value, at in (("5", "08:00"), ("5", "10:00"))
    ]
    found = ids_of(
        {
            "sources": [SOURCE],
            "boards": [{"board": "B", "fed_by": "P"}],
            "circuits": [{"circuit": "board B", "fed_from": "B", "device": "none"}],
            "runs": [{"circuit": "board B", "run": "1", "from": "way", "to": "a", "length": "4", "size": "2.5 mm2"}],
            "readings": [
                row | {"quantity": "current", "at": at} | place
                for row in times
                for at, place in (("bus", {"board": "B"}), ("way", {"circuit": "board B"}))
            ],
        }
    )
    assert [id_ for id_ in found if id_.startswith("RD14")] == ["RD14/board B/round 1", "RD14/%62oard B/round 1"]
    assert len(set(found)) == len(found)
