"""Which terminations of a site lie where something was read, and where a bad connection was found among them."""

from __future__ import annotations

from dataclasses import dataclass

from rules.context import Context, Measured
from rules.diagnosis.hypotheses import BAD_CONNECTION
from rules.errors import MissingData
from rules.heat import hot_as_read
from rules.record import Run
from rules.rounds import Round, Tree
from rules.verdict import claimed

OF_A_RUN = 4
"""Terminations of a run with a return of its own, two a leg."""
OF_ONE_LEG = 2
"""Of a run whose return is shared or the building's metal."""


@dataclass(frozen=True, slots=True)
class Coverage:
    """How much of a site was read."""

    circuits: int
    circuits_read: int
    """On which something was read, as every list counts them."""
    circuits_between: int
    """Of these, with at least one run that lies between readings under load."""
    joints: int
    """Terminations of all runs."""
    joints_read: int
    """Of the runs that lie between readings under load, where these say anything to the diagnosis."""
    bad: int
    """Places among these in which a bad connection is claimed, or that were read hot."""


def coverage_of(context: Context) -> Coverage:
    """Count the terminations of all runs, those between readings, and the bad ones that were found."""
    joints = joints_read = bad = circuits_read = between = 0
    for circuit in context.site.circuits:
        side = context.measured.get(circuit.id)
        read = _runs_read(side) if side is not None and circuit.id in context.diagnoses else set()
        for run in context.index.runs_of(circuit.id):
            joints += joints_of(run)
            joints_read += joints_of(run) if run.id in read else 0
        circuits_read += side is not None and bool(side.visit)
        between += bool(read)
        diagnosis = context.diagnoses.get(circuit.id)
        claimed_at: set[str] = set()
        claim = claimed(diagnosis.causes, context.limits) if diagnosis is not None else None
        if claim is not None and claim.cause == BAD_CONNECTION and read:
            bad += len(claim.place.joints) or 1
            claimed_at = {joint.where for joint in claim.place.joints}
        if side is not None:
            bad += len([hot for hot in hot_as_read(context, circuit.id, read) if hot not in claimed_at])
    return Coverage(len(context.site.circuits), circuits_read, between, joints, joints_read, min(bad, joints_read))


def joints_of(run: Run) -> int:
    """How many terminations a run has, those of a return that it shares left out."""
    return OF_A_RUN if run.return_or_default == "own" else OF_ONE_LEG


def _runs_read(side: Measured) -> set[str]:
    """Ids of the runs that lie between two points read in one round under load."""
    return {
        id_ for this in side.rounds if this.amps for id_ in _between(this, side.tree) if _says(id_, this, side.tree)
    }


def _says(run_id: str, this: Round, tree: Tree) -> bool:
    """Whether a run has a figure to judge a reading by, and the currents of all that share its return were read."""
    if tree.figures[run_id].gap:
        return False
    if run_id in tree.shared:
        try:
            tree.shared[run_id].others(this.name)
        except MissingData:
            return False
    return True


def _between(this: Round, tree: Tree) -> set[str]:
    read = set(this.volts) | {point for pair in this.direct for point in pair}
    behind: set[str] = set()
    """Points from which a read point lies no nearer to the source."""
    for point in read:
        while point in tree.ends and point not in behind:
            behind.add(point)
            point = tree.ends[point].from_point
    before = {"bus", "way"} if read & {"bus", "way"} else set()
    """Points from which one lies no nearer to the load."""
    found: set[str] = set()
    for end, run in tree.ends.items():  # each after those that it hangs on
        if run.from_point in before or run.from_point in read:
            before.add(end)
            if end in behind:
                found.add(run.id)
        if end == run.name and end in this.amps and {run.from_point, run.to_point} <= read:
            found.add(run.id)  # it closes a mesh, with both its ends and its own current read
    return found
