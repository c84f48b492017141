"""Doubt of what is computed from the record alone: the drop over some branches of the solved network."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING

from rules.network import StateName
from rules.runs import Carrying, RunFigures, record_variance

if TYPE_CHECKING:
    from rules.context import Context


def drop_u(context: Context, branches: Sequence[int], state: StateName) -> float:
    """
    Standard uncertainty of the computed drop over branches; not a number where they cannot be supplied. [V]

    Parameters
    ----------
    branches : sequence of int
        From the far node upwards, as ``Network.way_up`` gives them.
    state : str
        Of the network: ``design``, ``lowest`` or ``highest``.

    Notes
    -----
    The doubt of the resistances at currents that are exact, times what the loads make of it: of constant power they draw
    more where less arrives, so that near collapse the drop grows by far more than the resistance does. No drop is more than
    the source has.
    """
    if not branches:
        return 0.0
    network, limits = context.network, context.limits
    solved = network.solved(state)
    parts: dict[str, list[Carrying]] = defaultdict(list)
    variance = 0.0
    for branch in branches:
        amps = float(solved.current_a[branch])
        if math.isnan(amps):  # a tree that cannot be supplied
            return math.nan
        run_id = network.run_at[branch]
        if run_id:
            path = parts[network.circuit_at[branch]]
            path.append(Carrying(_in_state(context.figures[run_id], state), amps))
            if branch in network.return_at:
                back = _in_state(network.return_at[branch].figures, state)
                path.append(Carrying(back, float(solved.back_a[branch])))
        else:
            variance += (limits["device_doubt.relative"] * float(network.cold_ohm[branch]) * amps) ** 2
    at_exact_currents = math.sqrt(variance + sum(record_variance(path, limits) for path in parts.values()))
    growth = network.growth(state, branches[0], int(network.parent[branches[-1]]))
    source_v = abs(float(solved.voltage_v[list(network.way_up(branches[0]))[-1]]))
    return min(growth * at_exact_currents, source_v)


def _in_state(known: RunFigures, state: StateName) -> RunFigures:
    """A run with its conductors as warm as a state has them."""
    if state == "design":
        return known
    return replace(known, conductor_ohm=known.conductor_hot_ohm if state == "lowest" else known.conductor_cold_ohm)
