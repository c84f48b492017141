"""What it means for capacity if the conductors are thinner or of another metal than recorded."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import replace

from rules.assessment import Place
from rules.case import CircuitCase
from rules.diagnosis.hypotheses import OTHER_METAL, SMALLER
from rules.errors import RulesError
from rules.loading import bounds_of, current_of
from rules.record import Run
from rules.tables.conductors import next_smaller
from rules.units import show, show_size

STEPS = {"one size smaller": 1, "two sizes smaller": 2}


def of_conductors(case: CircuitCase, rows: Iterable[Place]) -> Iterator[str]:
    """
    For each of the causes given: the run that would be loaded most beyond its capacity, by its device or its current.

    A run of which the capacity is not known, then or at all, says nothing; of what is not recorded the most favourable
    counts, so that what is said would be so however it is installed.
    """
    for row in rows:
        worst: tuple[float, str] | None = None
        for run in case.runs:
            other = _if(run, row)
            said = _loaded(case, run, other) if other is not None else None
            if said is not None and (worst is None or said[0] > worst[0]):
                worst = said
        if worst is not None:
            yield worst[1]


def _if(run: Run, row: Place) -> Run | None:
    """The run as a cause has it; ``None`` where the cause leaves the conductor, or has none for it."""
    if not run.size:
        return None
    if row.cause == OTHER_METAL and row.what:
        return replace(run, material=row.what, return_material="")
    if row.cause == SMALLER and row.what in STEPS:
        size = next_smaller(run.size, STEPS[row.what])
        return replace(run, size=size, return_size="") if size is not None else None
    return None


def _loaded(case: CircuitCase, run: Run, other: Run) -> tuple[float, str] | None:
    """How far beyond its capacity such a run would be loaded, and the words; ``None`` where it would not."""
    try:
        most_a = bounds_of(other, case).most_a
    except RulesError:
        return None
    of = f"{show_size(other.size)} {other.material_or_default}"
    rated, amps = case.circuit.rated_current_a, current_of(run, case)
    if amps is not None and amps > most_a:
        words = f"with every load on {show(amps, 'A', digits=3)} flow in it"
        return amps / most_a, f"if {run.name} is of {of} it may carry {show(most_a, 'A', digits=3)}: {words}"
    if rated is not None and case.circuit.device != "none" and rated > most_a:
        words = f"the device of {show(rated, 'A')} does not protect it"
        return rated / most_a, f"if {run.name} is of {of} it may carry {show(most_a, 'A', digits=3)}: {words}"
    return None
