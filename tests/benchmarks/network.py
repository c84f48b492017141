"""
What a network costs, as ratios of one run: to one sparse solution, to its own size, to bare numpy.

    python tests/benchmarks/network.py [--points N] [--circuits N] [--runs N]

- A random recursive tree of 100,000 points with a constant-power load at each, from the bare parents to voltages and
  currents: at most 1 × one ``scipy.sparse.linalg.spsolve`` of the same network with linear loads, the matrix being given.
- Time for each point at 100,000 points over that at 1,000: at most 1.3.
- The chain of 100,000 points beside it, which is walked node by node.
- 100,000 circuits of one run each, from columns of lengths, sizes and temperatures to resistances of both legs with their
  terminations, doubts and hot figures: at most 10 × the bare numpy expression of the same resistances. Beside it, the
  voltages at their ends, and the same from rows of the record.

Medians of interleaved runs.
"""

from __future__ import annotations

import argparse
import statistics
import time
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
import scipy.sparse.linalg as spl
from numpy.typing import NDArray

from rules import limits
from rules.calc.network import Network, Solved
from rules.calc.newton import Loads
from rules.calc.run import leg_of
from rules.record import Run, Site
from rules.runs import figures

Floats = NDArray[np.float64]
Integers = NDArray[np.int64]

AT_MOST_A_SPARSE_SOLUTION = 1.0
AT_MOST_GROWTH = 1.3
AT_MOST_BARE_NUMPY = 10.0
SMALL = 1000
"""Points of the small tree in the growth."""


@dataclass(frozen=True)
class Tree:
    """A network of one source at 48 V, what it takes to solve it either way."""

    parent: Integers
    leg_ohm: Floats
    power_w: Floats

    @classmethod
    def drawn(cls, points: int, kind: str) -> Tree:
        """Loads and resistances such that some per cent of the voltage are lost."""
        rng = np.random.default_rng(points)
        parent = np.arange(-1, points - 1)
        if kind == "tree":
            parent[1:] = (rng.random(points - 1) * np.arange(1, points)).astype(np.int64)
        scale = 1.0 if kind == "tree" else 3.0 / points
        return cls(parent, rng.uniform(1, 2, points) * scale / points * 100, rng.uniform(0.2, 0.6, points))

    def ours(self) -> Solved:
        """All that is asked of the solver: order, constant power, voltages and currents."""
        size = len(self.parent)
        network = Network(self.parent)
        held = np.where(self.parent < 0, 48.0, 0.0)
        none = np.zeros(size)
        return network.solve(network.legs(self.leg_ohm, self.leg_ohm), Loads(none, self.power_w, none), held)

    def sparse(self) -> Callable[[], Floats]:
        """The solution of the nodal equations with the currents that the loads draw at 48 V."""
        size = len(self.parent)
        node, up = np.arange(1, size), self.parent[1:]
        g = 1 / (2 * self.leg_ohm[1:])
        diagonal = np.bincount(node, g, size) + np.bincount(up, g, size)
        whole = sp.csc_matrix(
            (
                np.concatenate([diagonal, -g, -g]),
                (np.concatenate([np.arange(size), node, up]), np.concatenate([np.arange(size), up, node])),
            ),
            shape=(size, size),
        )
        matrix = whole[1:, 1:].tocsc()
        right = -self.power_w[1:] / 48.0 - whole[1:, 0].toarray()[:, 0] * 48.0
        return lambda: np.asarray(spl.spsolve(matrix, right), dtype=float)


@dataclass(frozen=True)
class Columns:
    """Circuits of one run each, in columns."""

    length_m: Floats
    temperature_c: Floats
    parallel: Floats
    r20: Floats
    alpha: Floats
    area: Floats
    current_a: Floats

    @classmethod
    def drawn(cls, circuits: int) -> Columns:
        rng = np.random.default_rng(circuits)
        r20, area = np.array([7.41e-3, 4.61e-3, 3.08e-3, 1.83e-3]), np.array([2.5, 4.0, 6.0, 10.0])
        size = rng.integers(0, 4, circuits)
        return cls(
            rng.uniform(3, 60, circuits),
            rng.uniform(15, 45, circuits),
            np.ones(circuits),
            r20[size],
            np.full(circuits, 0.00393),
            area[size],
            rng.uniform(0.5, 8, circuits),
        )

    def bare(self) -> Floats:
        """Both legs with four terminations, as one would write it down."""
        conductor: Floats = 2 * self.length_m * self.r20 * (1 + self.alpha * (self.temperature_c - 20)) / self.parallel
        joints: Floats = 4 * 0.15e-3 * np.sqrt(10 / self.area) * np.exp(np.log(2) ** 2 / 2)
        return conductor + joints

    def ours(self) -> Floats:
        """The same as ``rules.runs`` has it: checked, with slopes, variances and hot conductors; both legs are alike."""
        leg = leg_of(
            self.length_m, self.parallel, self.temperature_c, 70.0, 20.0, self.r20, self.alpha, self.area, 0.15e-3, 2.0
        )
        return 2 * leg.conductor_ohm + 4 * leg.joint_ohm

    def solved(self) -> Solved:
        """Their voltages, all of them on one source."""
        size = len(self.length_m) + 1
        network = Network(np.where(np.arange(size) == 0, -1, 0))
        half = np.concatenate([[0.0], self.ours() / 2])
        amps, none = np.concatenate([[0.0], self.current_a]), np.zeros(size)
        return network.solve(
            network.legs(half, half), Loads(amps, none, none), np.where(np.arange(size) == 0, 48.0, 0.0)
        )

    def rows(self) -> tuple[Run, ...]:
        """The same as rows of a record."""
        names = {2.5: "2.5 mm2", 4.0: "4 mm2", 6.0: "6 mm2", 10.0: "10 mm2"}
        columns = zip(self.length_m.tolist(), self.temperature_c.tolist(), self.area.tolist(), strict=True)
        return tuple(
            Run(
                id=f"r{k}", circuit_id=f"c{k}", number=1, from_point="way", to_point="p1", one_way_length_m=length,
                size=names[area], conductor_temperature_c=degrees, temperature_by="air",
            )
            for k, (length, degrees, area) in enumerate(columns)
        )  # fmt: skip


def medians(runs: int, *jobs: Callable[[], object]) -> list[float]:
    """Seconds for each job, the median of interleaved runs; one run before that does not count."""
    taken: list[list[float]] = [[] for _ in jobs]
    for number in range(runs + 1):
        for job, times in zip(jobs, taken, strict=True):
            begun = time.perf_counter()
            job()
            if number:
                times.append(time.perf_counter() - begun)
    return [statistics.median(times) for times in taken]


def measure(points: int, circuits: int, runs: int) -> dict[str, float]:
    """All ratios, and the seconds behind them."""
    tree, small, chain = Tree.drawn(points, "tree"), Tree.drawn(min(SMALL, points), "tree"), Tree.drawn(points, "chain")
    columns = Columns.drawn(circuits)
    rows, site = columns.rows(), Site(name="generated")
    in_force = limits.of(site)
    np.testing.assert_allclose(columns.ours(), columns.bare(), rtol=1e-12)
    for one in (tree, chain):
        assert not one.ours().collapsed.any()
    ours, sparse, in_small = medians(runs, tree.ours, tree.sparse(), small.ours)
    in_chain, sparse_chain = medians(runs, chain.ours, chain.sparse())
    legs, bare, volts = medians(runs, columns.ours, columns.bare, columns.solved)
    (from_rows,) = medians(1, lambda: figures(rows, site, in_force).legs)
    return {
        "tree": ours,
        "sparse": sparse,
        "tree / sparse": ours / sparse,
        "growth": ours / len(tree.parent) / (in_small / len(small.parent)),
        "chain": in_chain,
        "chain / sparse": in_chain / sparse_chain,
        "circuits": legs,
        "circuits / bare": legs / bare,
        "circuits with voltages / bare": volts / bare,
        "from rows": from_rows,
    }


def main() -> None:
    parser = argparse.ArgumentParser(description="What a network costs.")
    parser.add_argument("--points", type=int, default=100_000)
    parser.add_argument("--circuits", type=int, default=100_000)
    parser.add_argument("--runs", type=int, default=7)
    asked = parser.parse_args()
    found = measure(asked.points, asked.circuits, asked.runs)
    points, circuits = f"{asked.points:,} points", f"{asked.circuits:,} circuits of one run"
    print(f"random tree of {points}, constant power: {found['tree'] * 1e3:.1f} ms")
    print(f"  {found['tree / sparse']:.2f} × one sparse solution (at most {AT_MOST_A_SPARSE_SOLUTION:g})")
    print(f"  {found['growth']:.2f} × the time a point of {SMALL:,} points (at most {AT_MOST_GROWTH:g})")
    print(f"chain of {points}: {found['chain'] * 1e3:.1f} ms, {found['chain / sparse']:.1f} × one sparse solution")
    print(f"{circuits}: {found['circuits'] * 1e3:.2f} ms")
    print(f"  {found['circuits / bare']:.1f} × bare numpy (at most {AT_MOST_BARE_NUMPY:g})")
    print(f"  {found['circuits with voltages / bare']:.1f} × with the voltages at their ends")
    print(f"  from rows of the record: {found['from rows'] * 1e3:.0f} ms")


if __name__ == "__main__":
    main()
