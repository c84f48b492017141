"""
Radial networks against a general sparse solver and against cases worked by hand.

Sources: scipy.sparse.linalg (nodal equations, an independent method); the closed form of one constant-power load behind a
resistance, V = (Vs + √(Vs² − 4PR)) / 2; two cases worked by hand for 48 V and 24 V supplies at the end of discharge.
"""

from __future__ import annotations

import numpy as np
import pytest
import scipy.sparse as sp
import scipy.sparse.linalg as spl
from hypothesis import given, settings
from hypothesis import strategies as st

from rules.calc.radial import Floats, Radial, solve
from rules.errors import InvalidQuantity


def pair(*, power_w: float = 0.0, current_a: float = 0.0, conductance_s: float = 0.0) -> Radial:
    return Radial(
        np.array([-1, 0]), np.array([0.0, current_a]), np.array([0.0, power_w]), np.array([0.0, conductance_s])
    )


def volts_at_end(network: Radial, source_v: float, ohm: float) -> float:
    return float(solve(network, np.array([0.0, ohm]), np.array([source_v, 0.0])).voltage_v[1])


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
def test_constant_power_worked_by_hand(source_v: float, ohm: float, power_w: float, load_v: float) -> None:
    assert volts_at_end(pair(power_w=power_w), source_v, ohm) == pytest.approx(load_v, abs=0.05)
    closed = (source_v + (source_v**2 - 4 * power_w * ohm) ** 0.5) / 2
    assert volts_at_end(pair(power_w=power_w), source_v, ohm) == pytest.approx(closed, rel=1e-9)


def test_a_load_that_cannot_be_supplied_collapses() -> None:
    """24 V, 1.5 Ω, 60 W collapses below 18.97 V, and takes no other tree with it."""
    two = Radial(np.array([-1, 0, -1, 2]), np.zeros(4), np.array([0.0, 60.0, 0.0, 60.0]), np.zeros(4))
    ohm, held = np.array([0.0, 1.5, 0.0, 1.5]), np.array([18.9, 0.0, 24.0, 0.0])
    solved = solve(two, ohm, held)
    assert solved.collapsed.tolist() == [True, True, False, False]
    assert np.isnan(solved.voltage_v[1])
    assert solved.voltage_v[3] == pytest.approx(19.35, abs=0.005)


@st.composite
def forests(draw: st.DrawFn) -> tuple[Radial, Floats, Floats]:
    size = draw(st.integers(2, 40))
    rng = np.random.default_rng(draw(st.integers(0, 2**32 - 1)))
    parent = np.array(
        [-1] + [int(rng.integers(-1, k)) if rng.random() < 0.1 else int(rng.integers(0, k)) for k in range(1, size)]
    )
    current, conductance = rng.uniform(0, 2, size), rng.uniform(0, 0.02, size)
    power = rng.uniform(0, 5, size)
    ohm = np.exp(rng.uniform(np.log(1e-4), np.log(5e-2), size))
    return Radial(parent, current, power, conductance), ohm, np.where(parent < 0, rng.uniform(44, 56, size), 0.0)


def nodal(network: Radial, ohm: Floats, held: Floats, current: Floats) -> Floats:
    """Node voltages from the conductance matrix, loads as given currents and conductances."""
    size = len(ohm)
    matrix = sp.lil_matrix((size, size))
    right = -current.copy()
    for node, above in enumerate(network.parent.tolist()):
        if above < 0:
            matrix[node, node], right[node] = 1.0, held[node]
            continue
        g = 1 / ohm[node]
        matrix[node, node] += g + network.conductance_s[node]
        matrix[node, above] -= g
        if network.parent[above] >= 0:
            matrix[above, above] += g
            matrix[above, node] -= g
    return np.asarray(spl.spsolve(matrix.tocsr(), right), dtype=float)


@settings(max_examples=60, deadline=None)
@given(forests())
def test_trees_agree_with_a_sparse_solver(forest: tuple[Radial, Floats, Floats]) -> None:
    network, ohm, held = forest
    solved = solve(network, ohm, held)
    assert not solved.collapsed.any()
    # the constant-power loads at the voltage found: the linear network must give that same voltage back
    loads = network.current_a + network.power_w / solved.voltage_v
    np.testing.assert_allclose(solved.voltage_v, nodal(network, ohm, held, loads), rtol=1e-9)


@settings(max_examples=40, deadline=None)
@given(forests())
def test_what_sources_give_is_what_loads_and_branches_take(forest: tuple[Radial, Floats, Floats]) -> None:
    network, ohm, held = forest
    solved = solve(network, ohm, held)
    roots = network.parent < 0
    given_w = float(np.sum(solved.voltage_v[roots] * solved.current_a[roots]))
    v = solved.voltage_v
    loads_w = float(np.sum(v * network.current_a + network.power_w + network.conductance_s * v**2))
    lost_w = float(np.sum((ohm * solved.current_a**2)[~roots]))
    assert given_w == pytest.approx(loads_w + lost_w, rel=1e-9)


@settings(max_examples=40, deadline=None)
@given(forests(), st.floats(0.1, 0.9))
def test_a_larger_conductor_never_lowers_a_load_of_constant_current_or_power(
    forest: tuple[Radial, Floats, Floats], factor: float
) -> None:
    network, ohm, held = forest
    fixed = Radial(network.parent, network.current_a, network.power_w, np.zeros(len(ohm)))
    larger = ohm.copy()
    larger[len(ohm) // 2] *= factor
    before, after = solve(fixed, ohm, held).voltage_v, solve(fixed, larger, held).voltage_v
    assert np.all(after >= before - 1e-9)


def test_drop_is_proportional_to_current() -> None:
    once = 24 - volts_at_end(pair(current_a=2.0), 24.0, 0.5)
    twice = 24 - volts_at_end(pair(current_a=4.0), 24.0, 0.5)
    assert (once, twice) == pytest.approx((1.0, 2.0))


def test_a_resistance_divides() -> None:
    assert volts_at_end(pair(conductance_s=1 / 9.0), 10.0, 1.0) == pytest.approx(9.0, rel=1e-9)


@pytest.mark.parametrize("ohm", [-1.0, np.nan, np.inf])
def test_a_resistance_that_cannot_be_is_refused(ohm: float) -> None:
    with pytest.raises(InvalidQuantity, match="resistance"):
        volts_at_end(pair(current_a=1.0), 24.0, ohm)


def test_a_parent_must_come_first() -> None:
    with pytest.raises(InvalidQuantity, match="parent"):
        Radial(np.array([1, -1]), np.zeros(2), np.zeros(2), np.zeros(2))
