"""
Whole networks against another method: nodal equations of both rails in a general sparse solver.

Source: scipy.sparse.linalg.spsolve. The equations here share no code with ``rules.calc``: every point has a terminal of
each leg; sources, loads and legs lie between terminals; each connected part has one terminal at zero. Loads of constant
power enter as the current that they draw at the voltage found: the linear network must give that voltage back.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
import pytest
import scipy.sparse as sp
import scipy.sparse.linalg as spl
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy.sparse.csgraph import connected_components

from rules.calc.network import Network, Solved
from rules.calc.newton import Loads

Floats = NDArray[np.float64]


@dataclass
class Grid:
    """A network in plain lists."""

    parent: list[int]
    out: Floats
    back: Floats
    in_one_leg: NDArray[np.bool_]
    held: Floats
    ties: list[tuple[int, int, float, float]] = field(default_factory=list)
    """From, to, resistance of the out and of the back leg."""
    shared: list[tuple[list[int], float]] = field(default_factory=list)
    """Nodes that the runs lead to, resistance of the return."""


def two_rails(grid: Grid, current: Floats, conductance: Floats) -> tuple[Floats, Floats, list[float]]:
    """Voltage between the legs of each node, current in each out leg, and in each shared return."""
    size = len(grid.parent)
    same = list(range(2 * size))

    def find(t: int) -> int:
        while same[t] != t:
            t = same[t]
        return t

    def join(a: int, b: int) -> None:
        same[find(a)] = find(b)

    sharing = {node for members, _ in grid.shared for node in members}
    for node, up in enumerate(grid.parent):
        if up >= 0 and grid.in_one_leg[node]:
            join(size + node, size + up)
        if up >= 0 and grid.out[node] == 0:
            join(node, up)
    for members, _ in grid.shared:
        for node in members[1:]:
            join(size + node, size + members[0])
            join(size + grid.parent[node], size + grid.parent[members[0]])
    wires: list[tuple[int, int, float]] = []
    for node, up in enumerate(grid.parent):
        if up < 0:
            continue
        if grid.out[node] > 0:
            wires.append((up, node, grid.out[node]))
        if not grid.in_one_leg[node] and node not in sharing:
            wires.append((size + node, size + up, grid.back[node]))
    for start, end, out, back in grid.ties:
        wires.append((start, end, out))
        wires.append((size + end, size + start, back))
    returns = []
    for members, ohm in grid.shared:
        returns.append(len(wires))
        wires.append((size + members[0], size + grid.parent[members[0]], ohm))
    roots = [node for node, up in enumerate(grid.parent) if up < 0]
    names = {t: n for n, t in enumerate(sorted({find(t) for t in range(2 * size)}))}
    place = np.array([names[find(t)] for t in range(2 * size)])
    count = len(names)
    links = [(place[a], place[b]) for a, b, _ in wires] + [(place[r], place[size + r]) for r in roots]
    first, second = (np.array(ends, dtype=np.int64) for ends in zip(*links, strict=True))
    graph = sp.coo_matrix((np.ones(len(links)), (first, second)), shape=(count, count))
    parts, label = connected_components(graph, directed=False)
    grounds = [int(np.flatnonzero(label == part)[0]) for part in range(parts)]
    rows, cols, cells = [], [], []
    right = np.zeros(count + len(roots))

    def add(row: int, col: int, cell: float) -> None:
        rows.append(row)
        cols.append(col)
        cells.append(cell)

    def conduct(a: int, b: int, g: float) -> None:
        for row, col, sign in ((a, a, 1), (b, b, 1), (a, b, -1), (b, a, -1)):
            if row not in grounds:
                add(row, col, sign * g)

    for a, b, ohm in wires:
        conduct(place[a], place[b], 1 / ohm)
    for node in range(size):
        a, b = place[node], place[size + node]
        conduct(a, b, conductance[node])
        if a not in grounds:
            right[a] -= current[node]
        if b not in grounds:
            right[b] += current[node]
    for k, root in enumerate(roots):
        a, b = place[root], place[size + root]
        if a not in grounds:
            add(a, count + k, -1.0)
        if b not in grounds:
            add(b, count + k, 1.0)
        add(count + k, a, 1.0)
        add(count + k, b, -1.0)
        right[count + k] = grid.held[root]
    for ground in grounds:
        add(ground, ground, 1.0)
    matrix = sp.csc_matrix((cells, (rows, cols)), shape=(len(right), len(right)))
    answer = np.asarray(spl.spsolve(matrix, right), dtype=float)
    potential = answer[place]
    volts = potential[:size] - potential[size:]
    amps = np.array(
        [
            (potential[up] - potential[node]) / grid.out[node] if up >= 0 and grid.out[node] > 0 else np.nan
            for node, up in enumerate(grid.parent)
        ]
    )
    shared = [(potential[wires[k][0]] - potential[wires[k][1]]) / wires[k][2] for k in returns]
    return volts, amps, shared


def ours(grid: Grid, loads: Loads) -> Solved:
    network = Network(
        np.array(grid.parent),
        grid.in_one_leg,
        np.array([tie[:2] for tie in grid.ties], dtype=np.int64).reshape(-1, 2),
        [np.array(members) for members, _ in grid.shared],
    )
    legs = network.legs(
        grid.out,
        grid.back,
        np.array([tie[2] for tie in grid.ties]),
        np.array([tie[3] for tie in grid.ties]),
        np.array([ohm for _, ohm in grid.shared]),
    )
    return network.solve(legs, loads, grid.held)


def agree(grid: Grid, loads: Loads) -> None:
    solved = ours(grid, loads)
    assert not solved.collapsed.any()
    volts, amps, shared = two_rails(grid, loads.current_a + loads.power_w / solved.voltage_v, loads.conductance_s)
    np.testing.assert_allclose(solved.voltage_v, volts, rtol=1e-9)
    known = np.isfinite(amps) & (np.array(grid.parent) >= 0)
    np.testing.assert_allclose(solved.current_a[known], amps[known], rtol=1e-7, atol=1e-8)
    np.testing.assert_allclose(solved.shared_a, shared, rtol=1e-7, atol=1e-8)


def mixed(rng: np.random.Generator, size: int, kinds: int = 7) -> Loads:
    """Constant current, power and resistance on every node, each only where its bit of ``kinds`` is set."""
    on = [float(bool(kinds & bit)) for bit in (1, 2, 4)]
    return Loads(rng.uniform(0, 0.3, size) * on[0], rng.uniform(0, 3, size) * on[1], rng.uniform(0, 0.02, size) * on[2])


def drawn_ohm(rng: np.random.Generator, size: int) -> Floats:
    return np.exp(rng.uniform(np.log(1e-3), np.log(0.3), size))


def forest(rng: np.random.Generator, size: int, sources: float = 0.1) -> Grid:
    parent = [-1]
    for node in range(1, size):
        parent.append(-1 if rng.random() < sources else int(rng.integers(0, node)))
    is_root = np.array(parent) < 0
    in_one_leg = (rng.random(size) < 0.2) & ~is_root
    out = drawn_ohm(rng, size)
    out[in_one_leg & (rng.random(size) < 0.3)] = 0.0  # a device of no figure
    held = np.where(is_root, rng.uniform(20, 28, size), 0.0)
    return Grid(parent, out, drawn_ohm(rng, size), in_one_leg, held)


def add_ties(rng: np.random.Generator, grid: Grid, most: int) -> None:
    for _ in range(int(rng.integers(1, most + 1))):
        start, end = (int(node) for node in rng.choice(len(grid.parent), 2, replace=False))
        if grid.parent[start] >= 0:
            grid.ties.append((start, end, *drawn_ohm(rng, 2)))


def add_shared(rng: np.random.Generator, grid: Grid, beside: bool) -> None:
    """Returns shared by runs from one node, or (``beside`` false) by any runs, whose ends are then joined."""
    free = [node for node, up in enumerate(grid.parent) if up >= 0 and not grid.in_one_leg[node]]
    rng.shuffle(free)
    for _ in range(int(rng.integers(1, 4))):
        if not free:
            return
        pool = [node for node in free if grid.parent[node] == grid.parent[free[0]]] if beside else free
        members = pool[: int(rng.integers(1, 5))]
        free = [node for node in free if node not in members]
        grid.shared.append((members, float(rng.uniform(0.01, 0.3))))


SEEDS = st.integers(0, 2**32 - 1)
KINDS = st.integers(1, 7)


@settings(max_examples=60, deadline=None)
@given(SEEDS, KINDS)
def test_trees(seed: int, kinds: int) -> None:
    rng = np.random.default_rng(seed)
    grid = forest(rng, int(rng.integers(2, 60)))
    agree(grid, mixed(rng, len(grid.parent), kinds))


@settings(max_examples=60, deadline=None)
@given(SEEDS, KINDS)
def test_rings_and_sources_joined_by_runs(seed: int, kinds: int) -> None:
    """Devices and thinner conductors lie in one leg, so that the legs of a mesh share the current differently."""
    rng = np.random.default_rng(seed)
    grid = forest(rng, int(rng.integers(3, 40)))
    add_ties(rng, grid, 5)
    agree(grid, mixed(rng, len(grid.parent), kinds))


@settings(max_examples=60, deadline=None)
@given(SEEDS, KINDS, st.booleans())
def test_shared_returns(seed: int, kinds: int, beside: bool) -> None:
    rng = np.random.default_rng(seed)
    grid = forest(rng, int(rng.integers(3, 30)))
    add_shared(rng, grid, beside)
    agree(grid, mixed(rng, len(grid.parent), kinds))


@settings(max_examples=60, deadline=None)
@given(SEEDS, KINDS, st.booleans())
def test_everything_at_once(seed: int, kinds: int, beside: bool) -> None:
    rng = np.random.default_rng(seed)
    grid = forest(rng, int(rng.integers(3, 30)))
    add_ties(rng, grid, 3)
    add_shared(rng, grid, beside)
    agree(grid, mixed(rng, len(grid.parent), kinds))


def by_repetition(grid: Grid, loads: Loads) -> Floats | None:
    """
    Voltages by drawing again and again what loads draw at the last voltages, from no load on; ``None`` if they fall to 0.

    Slow but certain: where a supply exists, the voltages fall to it and stay.
    """
    active = (loads.current_a > 0) | (loads.power_w > 0)
    volts, _, _ = two_rails(grid, loads.current_a * 0, loads.conductance_s)
    for _ in range(3000):
        fresh, _, _ = two_rails(grid, loads.current_a + loads.power_w / volts, loads.conductance_s)
        if np.any(fresh[active] <= 0):
            return None
        if np.max(np.abs(fresh - volts)) < 1e-10:
            return fresh
        volts = fresh
    raise AssertionError("drawn too near the limit to be told")


def overloaded(seed: int) -> tuple[Grid, Loads]:
    """A network whose loads are 10 to 1000 times the usual."""
    rng = np.random.default_rng(seed)
    grid = forest(rng, int(rng.integers(3, 14)), sources=0.15 if seed % 3 == 0 else 0.0)
    if seed % 2:
        add_ties(rng, grid, 3)
    if seed % 5:
        add_shared(rng, grid, bool(seed & 4))
    usual = mixed(rng, len(grid.parent), (2, 6, 7, 3)[seed % 4])
    factor = float(np.exp(rng.uniform(np.log(10), np.log(1000))))
    return grid, Loads(usual.current_a * min(factor, 3), usual.power_w * factor, usual.conductance_s)


SUPPLIED_OR_NOT = range(24)


@pytest.mark.parametrize("seed", SUPPLIED_OR_NOT)
def test_a_supply_is_found_exactly_where_there_is_one(seed: int) -> None:
    grid, loads = overloaded(seed)
    solved, volts = ours(grid, loads), by_repetition(grid, loads)
    assert solved.collapsed.any() == (volts is None)
    if volts is not None:
        np.testing.assert_allclose(solved.voltage_v, volts, rtol=1e-7)
    # the others' voltages are those of a network without what was given up
    rest = by_repetition(grid, loads.scaled(~solved.collapsed, ~solved.collapsed))
    assert rest is not None
    np.testing.assert_allclose(solved.voltage_v[~solved.collapsed], rest[~solved.collapsed], rtol=1e-7)


def test_of_those_many_collapse_and_many_do_not() -> None:
    lost = [bool(ours(*overloaded(seed)).collapsed.any()) for seed in SUPPLIED_OR_NOT]
    assert 6 <= sum(lost) <= 18


@pytest.mark.parametrize("shape", ["chain", "comb", "star"])
def test_deep_and_wide_trees(shape: str) -> None:
    """A chain is walked node by node, the others level by level."""
    rng, size = np.random.default_rng(5), 3000
    parent = {
        "chain": np.arange(-1, size - 1),
        "comb": np.maximum(np.arange(size) - 100, np.where(np.arange(size) == 0, -1, 0)),
        "star": np.where(np.arange(size) == 0, -1, 0),
    }[shape].tolist()
    ohm = drawn_ohm(rng, size) * 1e-4
    grid = Grid(parent, ohm, ohm[::-1].copy(), np.zeros(size, bool), np.where(np.arange(size) == 0, 48.0, 0.0))
    agree(grid, mixed(rng, size))


@pytest.mark.parametrize("length", [30, 1500])
def test_a_ring_of_many_points(length: int) -> None:
    rng = np.random.default_rng(length)
    parent = np.arange(-1, length - 1).tolist()
    ohm = drawn_ohm(rng, length) / length
    grid = Grid(parent, ohm, ohm[::-1].copy(), np.zeros(length, bool), np.where(np.arange(length) == 0, 48.0, 0.0))
    grid.ties.append((length - 1, 0, 0.01, 0.02))
    agree(grid, Loads(rng.uniform(0, 3 / length, length), rng.uniform(0, 100 / length, length), np.zeros(length)))


@pytest.mark.long
def test_a_net_of_streets() -> None:
    """A grid of 20 × 20 points, 361 meshes: nothing that a building has, and still exact."""
    rng, side = np.random.default_rng(1), 20
    parent = [-1] + [node - 1 if node % side else node - side for node in range(1, side * side)]
    size = len(parent)
    grid = Grid(parent, drawn_ohm(rng, size), drawn_ohm(rng, size), np.zeros(size, bool), np.zeros(size))
    grid.held[0] = 48.0
    for node in range(size):
        if node >= side and parent[node] != node - side:
            grid.ties.append((node - side, node, *drawn_ohm(rng, 2)))
    agree(grid, Loads(np.zeros(size), rng.uniform(0, 0.2, size), rng.uniform(0, 1e-4, size)))
