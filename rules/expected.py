"""
What the record makes each point's voltage in a round: the first voltage read, less the computed drop.

It is what a surveyor compares a reading with while she takes it; the verdict is the assessment's.
"""

from __future__ import annotations

from dataclasses import replace

from rules.calc.doubt import total
from rules.case import CircuitCase
from rules.compared import compare
from rules.errors import MissingData
from rules.record import Figure
from rules.rounds import Round


def expected_voltages(case: CircuitCase, round_name: str) -> dict[str, Figure]:
    """
    Computed voltage of each point in a round.

    Parameters
    ----------
    case : CircuitCase
        The circuit with its rounds.
    round_name : str
        One of its rounds; of any other nothing is known.

    Returns
    -------
    dict of str to Figure
        By point: the first point read has its reading, without a doubt; each point behind it that reading less
        the computed drop, with the drop's standard uncertainty. A point whose drop cannot be computed, for want
        of a current or of a length, is left out. [V]
    """
    this = next((one for one in case.rounds if one.name == round_name), None)
    if this is None:
        return {}
    # a run that closes a mesh arrives at no point of its own
    order = ["bus", "way", *(point for point, run in case.tree.ends.items() if point != run.name)]
    if case.tree.device_ohm is None:
        order.remove("bus")  # what a device that is not recorded loses is not known
    start = next((point for point in order if point in this.volts), None)
    if start is None:
        return {}
    first, _ = total(this.volts[start])
    expected = {start: Figure(first, "V")}
    for end in order[order.index(start) + 1 :]:
        computed = _computed(start, end, this, case)
        if computed is not None:
            expected[end] = Figure(first - computed.value, "V", computed.u)
    return expected


def _computed(start: str, end: str, this: Round, case: CircuitCase) -> Figure | None:
    # The computed drop does not ask what was read at the end, so that a point not read yet may stand at any voltage.
    as_if_read = replace(this, volts={**this.volts, end: this.volts[start]}, direct={})
    try:
        return compare(start, end, as_if_read, case.tree, case.limits).computed
    except MissingData:
        return None
