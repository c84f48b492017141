"""
Networks worked by hand, and the closed form of one load of constant power behind a resistance.

Sources: V = (Vs + √(Vs² − 4PR)) / 2, largest power Vs² / 4R; supplies of 48 V and 24 V at the end of discharge, and six
circuits with one return conductor, worked by hand from handbook resistances of copper at 20 °C (11.5 mΩ/m for 1.5 mm²,
6.9 mΩ/m for 2.5 mm²).
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from numpy.typing import NDArray

from rules.calc.network import Network, Solved
from rules.calc.newton import Loads
from rules.errors import InvalidQuantity

Floats = NDArray[np.float64]


def loads(
    size: int,
    amps: dict[int, float] | None = None,
    watts: dict[int, float] | None = None,
    siemens: dict[int, float] | None = None,
) -> Loads:
    columns = [np.zeros(size), np.zeros(size), np.zeros(size)]
    for column, given in zip(columns, (amps, watts, siemens), strict=True):
        for node, value in (given or {}).items():
            column[node] = value
    return Loads(*columns)


def solve(parent: list[int], loop_ohm: list[float], source_v: float, drawn: Loads) -> Solved:
    """A tree on one source, half of each resistance in either leg."""
    network, half = Network(np.array(parent)), np.array(loop_ohm) / 2
    return network.solve(network.legs(half, half), drawn, np.where(np.array(parent) < 0, source_v, 0.0))


def volts_at_end(source_v: float, ohm: float, drawn: Loads) -> float:
    return float(solve([-1, 0], [0.0, ohm], source_v, drawn).voltage_v[1])


@pytest.mark.parametrize(
    ("source_v", "ohm", "power_w", "load_v"),
    [
        # 48 V plant, 0.20 Ω, 600 W: 54.5 V gives 52.2 V, 43.2 V gives 40.2 V (the same 11.5 A would give 40.9 V)
        (54.5, 0.20, 600.0, 52.2),
        (43.2, 0.20, 600.0, 40.2),
        # 24 V supply, 1.5 Ω, 60 W
        (24.0, 1.5, 60.0, 19.35),
        (20.4, 1.5, 60.0, 13.95),
        (19.0, 1.5, 60.0, 10.0),
    ],
)
def test_constant_power_at_the_end_of_discharge(source_v: float, ohm: float, power_w: float, load_v: float) -> None:
    found = volts_at_end(source_v, ohm, loads(2, watts={1: power_w}))
    assert found == pytest.approx(load_v, abs=0.05)
    assert found == pytest.approx((source_v + (source_v**2 - 4 * power_w * ohm) ** 0.5) / 2, rel=1e-12)


def test_constant_current_and_resistance_are_milder() -> None:
    """The 11.5 A that 600 W draw at 54.5 V leave 40.9 V of 43.2 V; a resistance draws less as the voltage falls."""
    assert volts_at_end(43.2, 0.20, loads(2, amps={1: 11.5})) == pytest.approx(40.9, abs=0.005)
    assert volts_at_end(10.0, 1.0, loads(2, siemens={1: 1 / 9})) == pytest.approx(9.0, rel=1e-12)


def test_six_circuits_with_one_return() -> None:
    """2 A each over 40 m: 1.84 V by each circuit's own loop, 4.23 V in truth, 1.47 V with one of them on at night."""
    out, back = 40 * 11.5e-3, 40 * 6.9e-3
    network = Network(np.array([-1] + [0] * 6), shared=[np.arange(1, 7)])
    legs = network.legs(np.array([0.0] + [out] * 6), np.zeros(7), shared=np.array([back]))
    held = np.array([24.0] + [0.0] * 6)
    day = network.solve(legs, loads(7, amps=dict.fromkeys(range(1, 7), 2.0)), held)
    assert 24 - day.voltage_v[1:] == pytest.approx([4.232] * 6, rel=1e-12)
    assert day.shared_a == pytest.approx([12.0])
    assert day.back_a[1:] == pytest.approx([12.0] * 6)
    night = network.solve(legs, loads(7, amps={3: 2.0}), held)
    assert 24 - night.voltage_v[3] == pytest.approx(1.472, rel=1e-12)
    assert 2 * 2.0 * out == pytest.approx(1.84)


def test_a_ring_fed_at_one_end() -> None:
    """10 m + 20 m + 30 m of 20 mΩ/m round a ring, 6 A at 10 m and 3 A at 30 m: the currents meet at the first load."""
    network = Network(np.array([-1, 0, 1]), ties=np.array([[2, 0]]))
    legs = network.legs(np.array([0, 0.2, 0.4]), np.array([0, 0.2, 0.4]), np.array([0.6]), np.array([0.6]))
    solved = network.solve(legs, loads(3, amps={1: 6.0, 2: 3.0}), np.array([24.0, 0.0, 0.0]))
    first = (6 * 50 + 3 * 30) / 60  # moments of the loads about the far end of the ring
    assert solved.current_a[1:] == pytest.approx([first, first - 6])
    assert solved.tie_a == pytest.approx([-(9 - first)])
    assert 24 - solved.voltage_v[1] == pytest.approx(0.4 * first)


def test_two_feeders_share_the_current_leg_by_leg() -> None:
    """A device of 0.1 Ω in the outgoing leg of one feeder moves current in that leg alone."""
    network = Network(np.array([-1, 0, 1, 0]), np.array([False, True, False, False]), np.array([[3, 2]]))
    ohm = np.array([0.0, 0.1, 0.3, 0.3])
    legs = network.legs(ohm, np.array([0.0, 0.0, 0.3, 0.3]), np.array([0.0]), np.array([0.0]))
    solved = network.solve(legs, loads(4, amps={2: 7.0}), np.array([24.0, 0, 0, 0]))
    assert solved.current_a[[2, 3]] == pytest.approx([3.0, 4.0])
    assert solved.back_a[[2, 3]] == pytest.approx([3.5, 3.5])
    assert 24 - solved.voltage_v[2] == pytest.approx(4 * 0.3 + 3.5 * 0.3)
    assert solved.current_a[0] == pytest.approx(7.0)


class TestCollapse:
    def test_a_load_that_cannot_be_supplied_takes_no_other_with_it(self) -> None:
        """24 V, 1.5 Ω, 60 W collapses below 18.97 V: at 18.9 V at most 18.9² / 6 = 59.5 W could be had."""
        network = Network(np.array([-1, 0, -1, 2]))
        legs = network.legs(np.array([0.0, 0.75, 0.0, 0.75]), np.array([0.0, 0.75, 0.0, 0.75]))
        solved = network.solve(legs, loads(4, watts={1: 60.0, 3: 60.0}), np.array([18.9, 0.0, 24.0, 0.0]))
        assert solved.collapsed.tolist() == [False, True, False, False]
        assert math.isnan(solved.voltage_v[1])
        assert solved.voltage_v[3] == pytest.approx(19.35, abs=0.005)
        (found,) = solved.collapses
        assert (found.node, found.asked_w) == (1, 60.0)
        assert found.could_be_had_w == pytest.approx(18.9**2 / (4 * 1.5), rel=1e-9)

    @pytest.mark.parametrize(("volts", "lost"), [(18.97, True), (18.98, False)])
    def test_the_limit_is_2_sqrt_rp(self, volts: float, lost: bool) -> None:
        limit = 2 * (1.5 * 60) ** 0.5
        assert limit == pytest.approx(18.97, abs=0.005)
        assert solve([-1, 0], [0.0, 1.5], volts, loads(2, watts={1: 60.0})).collapsed[1] == lost

    def test_just_above_the_limit_the_voltage_is_half_the_sources(self) -> None:
        limit = 2 * (1.5 * 60) ** 0.5
        assert volts_at_end(limit * (1 + 1e-12), 1.5, loads(2, watts={1: 60.0})) == pytest.approx(limit / 2, rel=1e-5)

    def test_a_spur_is_lost_and_its_neighbours_are_computed_without_it(self) -> None:
        """48 V, feeder 0.05 Ω, a spur of 1.5 Ω asking 400 W where 48² / (4 × 1.55) = 371.6 W could be had."""
        solved = solve([-1, 0, 1, 1, 1], [0, 0.05, 1.5, 0.1, 0.1], 48.0, loads(5, watts={2: 400.0, 3: 100.0, 4: 100.0}))
        assert np.flatnonzero(solved.collapsed).tolist() == [2]
        assert solved.collapses[0].could_be_had_w == pytest.approx(48**2 / (4 * 1.55), rel=1e-9)
        # the two that are left, side by side: one load of 200 W behind 0.05 + 0.1 / 2
        assert solved.voltage_v[3] == pytest.approx((48 + (48**2 - 4 * 200 * 0.1) ** 0.5) / 2, rel=1e-12)

    def test_a_feeder_is_lost_with_all_that_hangs_on_it(self) -> None:
        """Twenty loads of 70 W, each of which would do alone: 48² / (4 × (0.5 + 0.05 / 20)) = 1146.3 W of 1400 W."""
        parent, ohm = [-1, 0, *[1] * 20, 0], [0.0, 0.5, *[0.05] * 20, 0.1]
        solved = solve(parent, ohm, 48.0, loads(23, watts=dict.fromkeys(range(2, 23), 70.0)))
        assert np.flatnonzero(solved.collapsed).tolist() == list(range(1, 22))
        (found,) = solved.collapses
        assert found.node == 1
        assert found.asked_w == pytest.approx(1400)
        assert found.could_be_had_w == pytest.approx(48**2 / (4 * 0.5025), rel=1e-9)
        assert solved.voltage_v[22] == pytest.approx((48 + (48**2 - 4 * 70 * 0.1) ** 0.5) / 2, rel=1e-12)

    def test_a_neighbour_of_constant_resistance_takes_its_share_of_what_could_be_had(self) -> None:
        """The feeder's 0.05 Ω and a 10 Ω neighbour behind 0.1 Ω: a source of 47.763 V behind 0.0498 Ω."""
        solved = solve([-1, 0, 1, 1], [0, 0.05, 1.5, 0.1], 48.0, loads(4, watts={2: 400.0}, siemens={3: 0.1}))
        behind = 1 / (1 / 0.05 + 1 / 10.1)
        idle = 48 * 10.1 / 10.15
        assert solved.collapses[0].could_be_had_w == pytest.approx(idle**2 / (4 * (behind + 1.5)), rel=1e-9)

    def test_a_current_that_leaves_no_voltage_is_lost(self) -> None:
        solved = solve([-1, 0, 0], [0.0, 3.0, 1.0], 24.0, loads(3, amps={1: 10.0, 2: 5.0}))
        assert solved.collapsed.tolist() == [False, True, False]
        assert solved.collapses[0].could_be_had_a == pytest.approx(8.0, rel=1e-9)
        assert solved.voltage_v[2] == pytest.approx(19.0)

    def test_a_long_chain_is_lost_from_one_point_on(self) -> None:
        """What is left is supplied, and would not be with the next point."""
        size = 400
        chain = dict.fromkeys(range(1, size), 10.0)
        solved = solve(list(range(-1, size - 1)), [0.005] * size, 48.0, loads(size, watts=chain))
        (found,) = solved.collapses
        assert np.flatnonzero(solved.collapsed).tolist() == list(range(found.node, size))
        # only the part that is lost, behind all before it: not even that has a solution, but without its first point it has
        assert found.share < 1

    def test_what_hangs_on_a_ring_is_lost_alone(self) -> None:
        network = Network(np.array([-1, 0, 1, 2, 0]), ties=np.array([[2, 0]]))
        ohm = np.array([0.0, 0.1, 0.2, 0.5, 0.1])
        legs = network.legs(ohm, ohm, np.array([0.3]), np.array([0.3]))
        solved = network.solve(legs, loads(5, watts={1: 50.0, 3: 2000.0, 4: 50.0}), np.array([48.0, 0, 0, 0, 0]))
        assert solved.collapsed.tolist() == [False, False, False, True, False]
        assert solved.voltage_v[4] == pytest.approx((48 + (48**2 - 4 * 50 * 0.2) ** 0.5) / 2, rel=1e-12)

    def test_a_ring_that_fails_is_lost_whole(self) -> None:
        """Both ends of a ring of 0.4 Ω a side to one load: 48² / (4 × 0.4) = 1440 W could be had of 2 kW."""
        network = Network(np.array([-1, 0, 1, 0]), ties=np.array([[1, 0]]))
        ohm = np.array([0.0, 0.4, 0.1, 0.1])
        legs = network.legs(ohm, ohm, np.array([0.4]), np.array([0.4]))
        solved = network.solve(legs, loads(4, watts={1: 2000.0, 3: 50.0}), np.array([48.0, 0, 0, 0]))
        assert solved.collapsed.tolist() == [False, True, True, False]
        assert solved.collapses[0].could_be_had_w == pytest.approx(1440, rel=1e-9)

    def test_a_tree_beside_a_ring_on_one_feeder_may_fail_too(self) -> None:
        """The ring is computed on, the feeder's other branch is lost: at most 48² / (4 × 4.0), the feeder taken as strong."""
        network = Network(np.array([-1, 0, 1, 2, 1]), ties=np.array([[3, 1]]))
        ohm = np.array([0.0, 0.1, 0.1, 0.1, 2.0])
        legs = network.legs(ohm, ohm, np.array([0.1]), np.array([0.1]))
        solved = network.solve(legs, loads(5, watts={2: 50.0, 4: 500.0}), np.array([48.0, 0, 0, 0, 0]))
        assert solved.collapsed.tolist() == [False, False, False, False, True]
        assert solved.collapses[0].could_be_had_w == pytest.approx(48**2 / (4 * 4.0), rel=1e-9)


def test_a_source_of_unknown_voltage_leaves_its_own_network_open() -> None:
    network = Network(np.array([-1, 0, -1, 2]))
    legs = network.legs(np.array([0.0, 1.0, 0.0, 1.0]), np.zeros(4))
    solved = network.solve(legs, loads(4, watts={1: 10.0}, amps={3: 1.0}), np.array([np.nan, 0.0, 24.0, 0.0]))
    assert np.isnan(solved.voltage_v).tolist() == [True, True, False, False]
    assert solved.voltage_v[3] == pytest.approx(23.0)
    assert not solved.collapsed.any()


def test_a_source_of_unknown_voltage_opens_all_that_a_run_joins_to_it() -> None:
    network = Network(np.array([-1, 0, -1, 2, 2]), ties=np.array([[1, 3]]))
    legs = network.legs(np.ones(5), np.ones(5), np.ones(1), np.ones(1))
    solved = network.solve(legs, loads(5, amps={1: 1.0, 4: 1.0}), np.array([np.nan, 0.0, 24.0, 0.0, 0.0]))
    assert np.isnan(solved.voltage_v).tolist() == [True, True, False, True, False]
    assert solved.voltage_v[4] == pytest.approx(22.0)


def test_a_semiconductor_takes_its_volts_whatever_the_current() -> None:
    network = Network(np.array([-1, 0, 1]), ties=np.array([[2, 0]]))
    legs = network.legs(np.array([0.0, 0.1, 0.2]), np.array([0.0, 0.1, 0.2]), np.array([0.3]), np.array([0.3]))
    tree = Network(np.array([-1, 0]))
    one = tree.solve(
        tree.legs(np.array([0.0, 1.0]), np.zeros(2)), loads(2, amps={1: 2.0}), np.array([24.0, 0]), np.array([0, -0.6])
    )
    assert one.voltage_v[1] == pytest.approx(24 - 0.6 - 2.0)
    ring = network.solve(legs, loads(3), np.array([24.0, 0, 0]), np.array([0.0, -0.6, 0.0]))
    # no load: 0.6 V drives a current back round the ring, through the outgoing legs alone
    assert ring.tie_a == pytest.approx([-1.0])
    assert ring.back_a[1:] == pytest.approx([0.0, 0.0])


@pytest.mark.parametrize("ohm", [-1.0, np.nan, np.inf])
def test_a_resistance_that_cannot_be_is_refused(ohm: float) -> None:
    with pytest.raises(InvalidQuantity, match="resistance"):
        volts_at_end(24.0, ohm, loads(2, amps={1: 1.0}))


@pytest.mark.parametrize("given", [{"amps": {1: -1.0}}, {"watts": {1: np.nan}}, {"siemens": {1: np.inf}}])
def test_a_load_that_cannot_be_is_refused(given: dict[str, dict[int, float]]) -> None:
    with pytest.raises(InvalidQuantity, match="that a load draws"):
        volts_at_end(24.0, 1.0, loads(2, **given))


def test_a_mesh_without_any_resistance_is_refused() -> None:
    network = Network(np.array([-1, 0]), ties=np.array([[1, 0]]))
    with pytest.raises(InvalidQuantity, match="mesh"):
        network.solve(network.legs(np.zeros(2), np.zeros(2)), loads(2), np.array([24.0, 0.0]))


@pytest.mark.parametrize("parent", [[1, 0], [2], [-2], [-1, 2, 1]])
def test_parents_that_lead_nowhere_are_refused(parent: list[int]) -> None:
    with pytest.raises(InvalidQuantity, match="parent"):
        Network(np.array(parent))


def test_ties_and_returns_name_nodes() -> None:
    with pytest.raises(InvalidQuantity, match="must name nodes"):
        Network(np.array([-1, 0]), ties=np.array([[1, 2]]))
    with pytest.raises(InvalidQuantity, match="not held"):
        Network(np.array([-1, 0]), shared=[np.array([0])])
