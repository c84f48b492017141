"""What holds of every network: superposition, power balance, no matter the order, scaling, larger conductors."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from rules.calc.loops import Legs
from rules.calc.network import Network, Solved
from rules.calc.newton import Loads

Floats = NDArray[np.float64]
SEEDS = st.integers(0, 2**32 - 1)


@dataclass(frozen=True)
class Case:
    """A network with ties and shared returns from one node, and what is put on it."""

    network: Network
    legs: Legs
    loads: Loads
    held: Floats

    def solve(self) -> Solved:
        return self.network.solve(self.legs, self.loads, self.held)


def ohm(rng: np.random.Generator, size: int) -> Floats:
    return np.exp(rng.uniform(np.log(1e-3), np.log(0.2), size))


def drawn(seed: int, *, meshed: bool = True, shared: bool = True) -> Case:
    rng = np.random.default_rng(seed)
    size = int(rng.integers(4, 30))
    parent = np.array([-1, *(-1 if rng.random() < 0.1 else int(rng.integers(0, k)) for k in range(1, size))])
    inner = np.flatnonzero(parent >= 0)
    ties = np.zeros((0, 2), dtype=np.int64)
    groups: list[NDArray[np.int64]] = []
    if len(inner) > 1 and meshed:
        ties = np.array([[rng.choice(inner), rng.integers(0, size)] for _ in range(3)])
        ties = ties[ties[:, 0] != ties[:, 1]]
    if len(inner) and shared:
        groups = [np.flatnonzero(parent == parent[rng.choice(inner)])[:4]]
    network = Network(parent, None, ties, groups)
    legs = network.legs(ohm(rng, size), ohm(rng, size), ohm(rng, len(ties)), ohm(rng, len(ties)), ohm(rng, len(groups)))
    loads = Loads(rng.uniform(0, 0.3, size), rng.uniform(0, 3, size), rng.uniform(0, 0.02, size))
    return Case(network, legs, loads, np.where(parent < 0, rng.uniform(22, 26, size), 0.0))


def only(loads: Loads, *, current: bool = False, power: bool = False, resistance: bool = False) -> Loads:
    return Loads(loads.current_a * current, loads.power_w * power, loads.conductance_s * resistance)


@settings(max_examples=40, deadline=None)
@given(SEEDS)
def test_what_sources_give_is_what_loads_and_conductors_take(seed: int) -> None:
    case = drawn(seed)
    solved, legs, loads, v = case.solve(), case.legs, case.loads, case.solve().voltage_v
    roots = case.network.forest.is_root
    given_w = np.sum(v[roots] * solved.current_a[roots])
    loads_w = np.sum(v * loads.current_a + loads.power_w + loads.conductance_s * v**2)
    lost_w = np.sum((legs.out * solved.current_a**2 + legs.back * solved.back_a**2)[~roots])
    lost_w += np.sum(legs.tie_out * solved.tie_a**2 + legs.tie_back * solved.tie_back_a**2)
    lost_w += np.sum(legs.shared * solved.shared_a**2)
    np.testing.assert_allclose(given_w, loads_w + lost_w, rtol=1e-9)


@settings(max_examples=40, deadline=None)
@given(SEEDS)
def test_drops_of_linear_loads_add(seed: int) -> None:
    """With resistances in place, what two sets of constant currents take from every voltage adds."""
    case = drawn(seed)
    rng = np.random.default_rng(seed)
    first, second = rng.uniform(0, 0.3, (2, len(case.held)))
    base, one, other, both = (
        replace(case, loads=Loads(amps, case.loads.power_w * 0, case.loads.conductance_s)).solve().voltage_v
        for amps in (first * 0, first, second, first + second)
    )
    np.testing.assert_allclose(base - both, (base - one) + (base - other), atol=1e-11)


@settings(max_examples=40, deadline=None)
@given(SEEDS)
def test_the_order_of_nodes_and_ties_does_not_matter(seed: int) -> None:
    case = drawn(seed)
    network, legs, loads = case.network, case.legs, case.loads
    parent, ties = network.forest.parent, network.ties
    rng = np.random.default_rng(seed)
    old = rng.permutation(len(parent))  # old number of each new node
    new = np.empty_like(old)
    new[old] = np.arange(len(old))
    turn = rng.permutation(len(ties))
    turned = Network(
        np.where(parent[old] < 0, -1, new[parent[old]]),
        None,
        new[ties[turn]],
        [new[group][::-1] for group in network.shared],
    )
    again = turned.solve(
        turned.legs(legs.out[old], legs.back[old], legs.tie_out[turn], legs.tie_back[turn], legs.shared),
        loads.at(old),
        case.held[old],
    )
    before = case.solve()
    np.testing.assert_allclose(again.voltage_v, before.voltage_v[old], rtol=1e-10)
    np.testing.assert_allclose(again.current_a, before.current_a[old], rtol=1e-8, atol=1e-9)
    np.testing.assert_allclose(again.tie_a, before.tie_a[turn], rtol=1e-8, atol=1e-9)


@settings(max_examples=40, deadline=None)
@given(SEEDS, st.floats(0.2, 5))
def test_scaling(seed: int, factor: float) -> None:
    """k volts, k amperes and k² watts give k volts; k ohms with a k-th of amperes, watts and siemens give the same volts."""
    case = drawn(seed)
    loads, legs, volts = case.loads, case.legs, case.solve().voltage_v
    louder = Loads(loads.current_a * factor, loads.power_w * factor**2, loads.conductance_s)
    scaled = case.network.solve(legs, louder, case.held * factor).voltage_v
    np.testing.assert_allclose(scaled, volts * factor, rtol=1e-9)
    longer = Legs(*(x * factor for x in (legs.out, legs.back, legs.tie_out, legs.tie_back, legs.shared)))
    weaker = Loads(loads.current_a / factor, loads.power_w / factor, loads.conductance_s / factor)
    np.testing.assert_allclose(case.network.solve(longer, weaker, case.held).voltage_v, volts, rtol=1e-9)


@settings(max_examples=40, deadline=None)
@given(SEEDS, st.floats(0.1, 0.9))
def test_a_larger_conductor_never_lowers_a_load_of_constant_current_or_power(seed: int, factor: float) -> None:
    """On a tree, also where returns are shared."""
    case = drawn(seed, meshed=False)
    fixed = replace(case, loads=only(case.loads, current=True, power=True))
    out = case.legs.out.copy()
    out[seed % len(out)] *= factor
    larger = replace(fixed, legs=replace(case.legs, out=out))
    assert np.all(larger.solve().voltage_v >= fixed.solve().voltage_v - 1e-9)


def test_a_larger_conductor_may_lower_a_neighbour_on_a_shared_return() -> None:
    """Two heaters of 2 Ω on a common return of 0.2 Ω: the first, on a larger conductor, draws more and lifts the return."""
    network = Network(np.array([-1, 0, 0]), shared=[np.array([1, 2])])
    loads = Loads(np.zeros(3), np.zeros(3), np.array([0.0, 0.5, 0.5]))
    held = np.array([24.0, 0.0, 0.0])

    def volts(first_ohm: float) -> Floats:
        legs = network.legs(np.array([0.0, first_ohm, 0.5]), np.zeros(3), shared=np.array([0.2]))
        return network.solve(legs, loads, held).voltage_v

    before, after = volts(0.5), volts(0.1)
    assert after[1] > before[1]
    assert after[2] < before[2] - 0.1


@settings(max_examples=30, deadline=None)
@given(SEEDS, st.floats(0.1, 0.9))
def test_less_load_never_lowers_a_voltage(seed: int, factor: float) -> None:
    """What makes Newton's steps fall to the solution. Runs between two sources may break it: loads then shift currents."""
    case = drawn(seed, meshed=False)
    part = np.ones(len(case.held))
    part[seed % len(part)] = factor
    lighter = replace(case, loads=case.loads.scaled(part, part))
    assert np.all(lighter.solve().voltage_v >= case.solve().voltage_v - 1e-9)


def test_a_millionth_on_either_side_of_the_limit_is_told_apart() -> None:
    """V = Vs (1 + √δ) / 2 with a load a share δ below the largest."""
    network = Network(np.array([-1, 0]))
    legs = network.legs(np.array([0.0, 0.75]), np.array([0.0, 0.75]))
    limit = 24.0**2 / (4 * 1.5)
    held = np.array([24.0, 0.0])
    near = network.solve(legs, Loads(np.zeros(2), np.array([0.0, limit * (1 - 1e-6)]), np.zeros(2)), held)
    assert not near.collapsed.any()
    np.testing.assert_allclose(near.voltage_v[1], 12 * (1 + 1e-3), rtol=1e-9)
    assert network.solve(legs, Loads(np.zeros(2), np.array([0.0, limit * (1 + 1e-6)]), np.zeros(2)), held).collapsed[1]
