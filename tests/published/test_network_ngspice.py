"""
Networks against ngspice, a general circuit simulator.

Each netlist in ``data/ngspice/`` stands for one network below; beside them, ``results.toml`` holds what ngspice 39
gave for it. The netlist is written anew from the network, so that the stored result belongs to it; where ngspice is
installed it is run again too.
"""

from __future__ import annotations

import re
import shutil
import subprocess
import tomllib
from dataclasses import dataclass, field
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from rules.calc.network import Network, Solved
from rules.calc.newton import Loads

DATA = Path(__file__).parent / "data" / "ngspice"
NGSPICE = shutil.which("ngspice")


@dataclass(frozen=True)
class Circuit:
    """Pairs with their branches; resistances of the outgoing leg and of the return, 0 for no such leg."""

    name: str
    parent: list[int]
    out: list[float]
    back: list[float]
    held: dict[int, float]
    amps: dict[int, float] = field(default_factory=dict)
    watts: dict[int, float] = field(default_factory=dict)
    ohms: dict[int, float] = field(default_factory=dict)
    ties: list[tuple[int, int, float, float]] = field(default_factory=list)
    shared: list[tuple[list[int], float]] = field(default_factory=list)

    def netlist(self) -> str:
        """Terminal ``p`` of each pair is the outgoing leg, ``n`` the return; ``n`` of the first pair is earth."""
        lines = [f"* {self.name}"]
        sharing = {node for nodes, _ in self.shared for node in nodes}
        neg = {node: "0" if node == 0 else f"n{node}" for node in range(len(self.parent))}
        for nodes, _ in self.shared:
            for node in nodes[1:]:
                neg[node] = neg[nodes[0]]
        for node, up in enumerate(self.parent):
            if up < 0:
                lines.append(f"V{node} p{node} {neg[node]} {self.held[node]!r}")
                continue
            if self.back[node] == 0 and node not in sharing:
                neg[node] = neg[up]
            lines.append(f"Ro{node} p{up} p{node} {self.out[node]!r}")
            if self.back[node] > 0:
                lines.append(f"Rb{node} {neg[node]} {neg[up]} {self.back[node]!r}")
        for k, (nodes, ohm) in enumerate(self.shared):
            lines.append(f"Rs{k} {neg[nodes[0]]} {neg[self.parent[nodes[0]]]} {ohm!r}")
        for k, (start, end, out, back) in enumerate(self.ties):
            lines += [f"Rto{k} p{start} p{end} {out!r}", f"Rtb{k} {neg[end]} {neg[start]} {back!r}"]
        for node, amps in self.amps.items():
            lines.append(f"I{node} p{node} {neg[node]} {amps!r}")
        for node, watts in self.watts.items():
            lines.append(f"B{node} p{node} {neg[node]} I = {watts!r} / V(p{node},{neg[node]})")
        for node, ohms in self.ohms.items():
            lines.append(f"Rl{node} p{node} {neg[node]} {ohms!r}")
        # sources begin at a start value near the one wanted: constant power has a second, lower solution
        starts = " ".join(f"v(p{node})={max(self.held.values())!r}" for node in range(len(self.parent)))
        lines += [f".nodeset {starts}", ".options reltol=1e-12 abstol=1e-14 vntol=1e-13 gmin=1e-18", ".control", "op"]
        lines += ["set numdgt=15"]
        lines += [f"let pair{n} = v(p{n}){'' if neg[n] == '0' else f' - v({neg[n]})'}" for n in range(len(self.parent))]
        lines += [f"print pair{n}" for n in range(len(self.parent))]
        return "\n".join([*lines, "quit", ".endc", ".end", ""])

    def solve(self) -> Solved:
        size = len(self.parent)
        sharing = {node for nodes, _ in self.shared for node in nodes}
        network = Network(
            np.array(self.parent),
            np.array([self.back[node] == 0 and node not in sharing for node in range(size)]),
            np.array([tie[:2] for tie in self.ties], dtype=np.int64).reshape(-1, 2),
            [np.array(nodes) for nodes, _ in self.shared],
        )
        legs = network.legs(
            np.array(self.out),
            np.array(self.back),
            np.array([tie[2] for tie in self.ties]),
            np.array([tie[3] for tie in self.ties]),
            np.array([ohm for _, ohm in self.shared]),
        )
        loads = Loads(np.zeros(size), np.zeros(size), np.zeros(size))
        for node, amps in self.amps.items():
            loads.current_a[node] = amps
        for node, watts in self.watts.items():
            loads.power_w[node] = watts
        for node, ohms in self.ohms.items():
            loads.conductance_s[node] = 1 / ohms
        return network.solve(legs, loads, np.array([self.held.get(node, 0.0) for node in range(size)]))


CIRCUITS = [
    Circuit(
        "tree of a 48 V plant: two feeders with fuses in one leg, loads of constant power, current and resistance",
        parent=[-1, 0, 1, 2, 2, 0, 5, 6, 6, 8],
        out=[0.0, 0.0009, 0.0094, 0.025, 0.031, 0.0011, 0.016, 0.052, 0.038, 0.074],
        back=[0.0, 0.0, 0.0094, 0.025, 0.031, 0.0, 0.016, 0.052, 0.038, 0.081],
        held={0: 53.5},
        watts={3: 620.0, 4: 880.0, 7: 460.0, 9: 240.0},
        amps={8: 3.5, 6: 0.8},
        ohms={9: 18.0, 4: 29.0},
    ),
    Circuit(
        "end of discharge: the same tree at 43.2 V with hot conductors, near its limit",
        parent=[-1, 0, 1, 2],
        out=[0.0, 0.002, 0.10, 0.05],
        back=[0.0, 0.0, 0.10, 0.05],
        held={0: 43.2},
        watts={2: 600.0, 3: 700.0},
    ),
    Circuit(
        "ring main from two ways of one board, devices of 4 and 9 milliohm in the outgoing leg",
        parent=[-1, 0, 1, 2, 3, 0, 5],
        out=[0.0, 0.004, 0.12, 0.09, 0.15, 0.009, 0.11],
        back=[0.0, 0.0, 0.12, 0.09, 0.19, 0.0, 0.11],
        held={0: 24.3},
        watts={2: 45.0, 4: 30.0},
        amps={3: 2.0},
        ohms={6: 12.0},
        ties=[(6, 4, 0.06, 0.06)],
    ),
    Circuit(
        "four circuits on one return, two of them going on with a second one that they share",
        parent=[-1, 0, 0, 0, 0, 1, 2],
        out=[0.0, 0.46, 0.46, 0.29, 0.29, 0.2, 0.24],
        back=[0.0] * 7,
        held={0: 24.0},
        amps={1: 1.0, 3: 2.0},
        watts={2: 14.0, 5: 20.0},
        ohms={4: 24.0, 6: 30.0},
        shared=[([1, 2, 3, 4], 0.276), ([5, 6], 0.13)],
    ),
    Circuit(
        "two boards on sources of their own, joined by a run: the second supply floats",
        parent=[-1, 0, 1, -1, 3],
        out=[0.0, 0.05, 0.2, 0.0, 0.08],
        back=[0.0, 0.05, 0.23, 0.0, 0.08],
        held={0: 24.4, 3: 24.1},
        watts={2: 60.0, 4: 50.0},
        amps={1: 3.0},
        ties=[(2, 3, 0.11, 0.14)],
    ),
]


def file_of(circuit: Circuit) -> Path:
    return DATA / ("_".join(re.findall(r"[a-z0-9]+", circuit.name.lower())[:4]) + ".cir")


def run(path: Path) -> list[float]:
    """What ngspice prints for a netlist. [V]"""
    assert NGSPICE is not None
    done = subprocess.run([NGSPICE, "-b", str(path)], capture_output=True, text=True, timeout=60, check=False)
    found = dict(re.findall(r"^pair(\d+) = (\S+)", done.stdout, flags=re.MULTILINE))
    assert found, done.stdout + done.stderr
    return [float(found[str(node)]) for node in range(len(found))]


@cache
def stored() -> dict[str, list[float]]:
    results: dict[str, list[float]] = tomllib.loads((DATA / "results.toml").read_text(encoding="utf-8"))["volts"]
    return results


each = pytest.mark.parametrize("circuit", CIRCUITS, ids=lambda circuit: file_of(circuit).stem)


@each
def test_the_netlist_is_that_of_the_network(circuit: Circuit) -> None:
    assert file_of(circuit).read_text(encoding="utf-8") == circuit.netlist()


@each
def test_voltages_agree(circuit: Circuit) -> None:
    """With the stored result, and with ngspice itself where it is installed."""
    volts = circuit.solve().voltage_v
    np.testing.assert_allclose(volts, stored()[file_of(circuit).stem], rtol=1e-9)
    if NGSPICE is not None:
        np.testing.assert_allclose(volts, run(file_of(circuit)), rtol=1e-9)
