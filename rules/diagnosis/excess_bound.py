"""How much current may flow through what is suspected: by the ratings, by the prior, and by what was read beyond the record."""

from __future__ import annotations

import numpy as np

from rules.diagnosis.bounds import Bound, heat_bound, largest_bound
from rules.diagnosis.candidates import Posed
from rules.diagnosis.hypotheses import BAD_CONNECTION
from rules.diagnosis.judge import Judged
from rules.diagnosis.shape import Floats
from rules.limits import Limits

COVERED_U = 1.96
"""Standard uncertainties above a value that bound the central 95 %."""
TRACE = 1e-9
"""Less probable than this is no suspect, though nothing else is."""


def most_level(posed: Posed, judged: Judged, number: int, high_ohm: Floats, limits: Limits) -> Bound:
    """The smallest over the ratings and the heat in what is suspected."""
    amps, names = posed.amps, posed.imagined.names
    of_record = largest_bound(posed.case, {names[branch]: ampere for branch, ampere in amps.items()})
    places = judged.block.shape.places
    share = judged.posterior[number, judged.of_cause(BAD_CONNECTION)]
    least = min(limits["next_reading.suspected_at"], float(share.max(initial=0.0)))
    suspects = [
        (float(high_ohm[n]), amps.get(places[n].branch, 0.0)) for n in np.flatnonzero(share >= max(least, TRACE))
    ]
    suspects += _read_excess(posed, judged, number, limits)
    return min(of_record, heat_bound(suspects, limits["heat.load_test_w"]), key=lambda bound: bound.level)


def _read_excess(posed: Posed, judged: Judged, number: int, limits: Limits) -> list[tuple[float, float]]:
    """
    What was read beyond the record as one resistance, with the current of the imagined round through it, once for each
    branch that it may lie in. The prior holds no connection for worse than its range; what was read may be. [ohm, A]
    """
    block, amps = judged.block, posed.amps
    shape = block.shape
    excess = block.shown[number] - judged.recorded.whole_mean[number, 0]
    own_u = np.sqrt(np.diagonal(block.own[number]))
    slots = {slot: float(ampere) for slot, ampere in zip(shape.signature.slots, block.amps[number], strict=True)}
    found = []
    for n, row in enumerate(shape.signature.rows):
        for branch, sense in row.path:
            through = sense * (
                1.0 if shape.row_state[n] == shape.signature.states else slots.get((row.state, branch), 0.0)
            )
            if through and excess[n] * through > limits["next_reading.apart"] * own_u[n] * abs(through):
                found.append(
                    ((abs(float(excess[n])) + COVERED_U * float(own_u[n])) / abs(through), amps.get(branch, 0.0))
                )
    return found
