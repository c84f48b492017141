"""Look-ups over a site: what belongs to what, and the walking order."""

from __future__ import annotations

import pytest

from rules.index import Index
from rules.record import Board, Circuit, Feed, Instrument, Load, Reading, Run, Site, Source


@pytest.fixture
def index() -> Index:
    """Two sources, two boards given out of order, a converter, and a circuit that nothing feeds."""

    def circuit(tag: str, table: str, feed: str, order: float | None = None) -> Circuit:
        return Circuit(id=f"c-{tag}", tag=tag, fed_from=Feed(table, feed), walk_order=order)

    def run(circuit: str, number: int, start: str, end: str, board: str = "") -> Run:
        return Run(
            id=f"r-{circuit}-{number}",
            circuit_id=f"c-{circuit}",
            number=number,
            from_point=start,
            to_point=end,
            to_board_id=board,
        )

    def reading(id_: str, **fields: object) -> Reading:
        return Reading(id=id_, quantity="voltage", at="bus", **fields)  # type: ignore[arg-type]

    return Index(
        Site(
            name="hut",
            sources=(
                Source(id="s-1", tag="BATT"),
                Source(id="s-2", tag="CONV", kind="converter", fed_from=Feed("circuits", "c-A2", "p1")),
            ),
            boards=(
                Board(id="b-1", tag="B1", fed_by=(Feed("circuits", "c-A1"),), walk_order=2.0),
                Board(id="b-2", tag="MDB", fed_by=(Feed("sources", "s-1"),), walk_order=1.0),
                Board(id="b-3", tag="B3", fed_by=(Feed("circuits", "c-A1"),)),
            ),
            circuits=(
                circuit("stray", "", "?gone"),
                circuit("B3-1", "boards", "b-3"),
                circuit("A2", "boards", "b-2"),
                circuit("A1", "boards", "b-2", 5.0),
                circuit("A0", "boards", "b-2", 3.0),
                circuit("D1", "sources", "s-2"),
                circuit("B1-1", "boards", "b-1"),
            ),
            runs=(
                run("A1", 3, "p1", "", "b-1"),
                run("A1", 1, "way", "p1"),
                run("A1", 2, "p1", "p2"),
                run("A2", 1, "way", "p1"),
                run("A2", 2, "way", "p1"),
                run("A0", 1, "way", "", "?gone"),
            ),
            loads=(
                Load(id="l-1", circuit_id="c-A2", tag="L1", point="p1"),
                Load(id="l-2", circuit_id="c-A1", tag="L1", point="p1"),
                Load(id="l-3", circuit_id="c-A2", tag="L2", point="way"),
            ),
            instruments=(
                Instrument(id="i-1", tag="DMM", quantity="voltage", full_scale=60.0),
                Instrument(id="i-2", tag="CLAMP", quantity="current"),
                Instrument(id="i-3", tag="DMM", quantity="voltage", full_scale=6.0),
            ),
            readings=(
                reading("m-1", circuit_id="c-A1"),
                reading("m-2", board=Feed("boards", "b-1")),
                reading("m-3", circuit_id="c-A1", replaces_id="m-1"),
                reading("m-4", board=Feed("sources", "s-1")),
            ),
        )
    )


def test_walking_order_is_by_feed_then_order_then_row(index: Index) -> None:
    assert [row.tag for row in index.walked_sources] == ["BATT", "CONV"]
    assert [row.tag for row in index.walked_boards] == ["MDB", "B1", "B3"]
    assert [row.tag for row in index.walked_circuits] == ["D1", "A0", "A1", "A2", "B1-1", "B3-1", "stray"]
    assert [row.tag for row in index.circuits_of("b-2")] == ["A0", "A1", "A2"]


def test_runs_come_by_number_and_points_as_they_are_walked(index: Index) -> None:
    assert [run.number for run in index.runs_of("c-A1")] == [1, 2, 3]
    assert index.points_of("c-A1") == ("way", "p1", "p2", "board:B1")
    assert index.points_of("c-A2") == ("way", "p1")
    assert index.points_of("c-A0") == ("way", "board:gone")


def test_last_point_is_where_the_highest_run_ends(index: Index) -> None:
    assert index.last_point("c-A2") == "p1"
    assert index.last_point("c-A1") == "board:B1"
    assert index.last_point("c-D1") == "way"


def test_rows_are_found_under_what_they_belong_to(index: Index) -> None:
    assert [load.id for load in index.loads_of("c-A2")] == ["l-1", "l-3"]
    assert [reading.id for reading in index.readings_of("c-A1")] == ["m-1", "m-3"]
    assert [reading.id for reading in index.readings_of("b-1")] == ["m-2"]
    assert [reading.id for reading in index.readings_of("s-1")] == ["m-4"]
    assert [row.full_scale for row in index.ranges_of("DMM")] == [60.0, 6.0]
    assert [row.tag for row in index.fed_by_circuit("c-A1")] == ["B1", "B3"]
    assert [row.tag for row in index.fed_by_circuit("c-A2")] == ["CONV"]


def test_replaced_readings_are_known(index: Index) -> None:
    assert index.replaced == {"m-1"}
    assert index.readings["m-1"].circuit_id == "c-A1"


def test_references_name_their_rows(index: Index) -> None:
    assert index.named(Feed("circuits", "c-A1", "p1")) is index.circuits["c-A1"]
    assert index.named(Feed("boards", "b-1")) is index.boards["b-1"]
    assert index.named(Feed("sources", "b-1")) is None
    assert index.named(Feed("", "?gone")) is None


def test_what_is_not_there_is_empty(index: Index) -> None:
    for look_up in (index.runs_of, index.loads_of, index.readings_of, index.circuits_of, index.fed_by_circuit):
        assert look_up("gone") == ()
    assert index.ranges_of("gone") == ()
    assert (index.points_of("gone"), index.last_point("gone")) == (("way",), "way")
