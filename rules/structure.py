"""Resistance of a structure that serves as a return, which stands in no record and is found from readings."""

from __future__ import annotations

import math
from dataclasses import replace

from rules.calc.doubt import Weighted, total
from rules.case import CircuitCase
from rules.errors import MissingData
from rules.record import Figure, Run
from rules.rounds import current_at
from rules.runs import TERMINATIONS_A_LEG, figures


def structure_ohm(case: CircuitCase, run: Run) -> Figure | str:
    """What comes back through the structure, in the round of the highest current, or why that is not known."""
    own = figures([replace(run, return_conductor="", return_size="")], case.context.site, case.limits)[run.id]
    if own.gap:
        return own.gap
    leg = own.legs[0]
    out_ohm = leg.conductor_ohm + TERMINATIONS_A_LEG * leg.joint_ohm
    branch = next((branch for branch, other in case.tree.ends.items() if other.id == run.id), "")
    best: tuple[float, Figure] | None = None
    reason = f"no voltages at both ends of {run.name} and its current were read"
    for this in case.rounds:
        if run.from_point not in this.volts or branch not in this.volts:
            continue
        try:
            amps, amps_u = total(current_at(branch, this, case.tree, case.limits).terms)
        except MissingData as error:
            reason = str(error)
            continue
        less = [Weighted(-term.weight, term.shown) for term in this.volts[branch]]
        volts, volts_u = total([*this.volts[run.from_point], *less])
        if amps and (best is None or abs(amps) > best[0]):
            loop = volts / amps
            relative = math.hypot(own.length_u, case.limits["resistance_doubt.relative"])
            warm = leg.slope_ohm_per_k * own.temperature_u_k
            u = (
                (volts_u / amps) ** 2 + (loop * amps_u / amps) ** 2 + (relative * leg.conductor_ohm) ** 2 + warm**2
            ) ** 0.5
            best = abs(amps), Figure(loop - out_ohm, "ohm", u)
    return best[1] if best is not None else reason
