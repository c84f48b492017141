"""The runs of a circuit in service at design: current, capacity, and the temperature that they settle at."""

from __future__ import annotations

from rules.assessment import RunService
from rules.capacity import capacity_of
from rules.case import CircuitCase
from rules.errors import RulesError
from rules.record import Figure, Run

GAP_CURRENT = "the current at design is not known"


def service_of(case: CircuitCase) -> tuple[RunService, ...]:
    """
    Each run at its design current.

    It serves the eye: ``design`` and the diagnosis keep the recorded temperature, and no rule judges by it. The
    temperature is as doubtful as one that is assumed.
    """
    return tuple(_of_run(case, run) for run in case.runs)


def _of_run(case: CircuitCase, run: Run) -> RunService:
    amperes = case.tree.design_current_a.get(case.context.index.end_of(run))
    current = None if amperes is None else Figure(amperes, "A")
    try:
        capacity = capacity_of(run, case.context.site, case.limits, case.circuit.rated_current_a)
    except RulesError as error:  # also a record that contradicts itself is shown
        return RunService(run.name, current, None, None, "", (), str(error))
    temperature, gap = None, GAP_CURRENT
    if amperes is not None:
        settled_c = capacity.temperature_c(amperes)
        hot = settled_c > capacity.limit_c
        gap = f"above the {capacity.limit_c:g} °C that the insulation stands" if hot else ""
        temperature = None if hot else Figure(settled_c, "degC", case.limits["temperature_doubt.assumed"])
    return RunService(
        run=run.name,
        current=current,
        ampacity=Figure(capacity.ampacity_a, "A"),
        temperature=temperature,
        basis=f"{capacity.column}; {capacity.source}, edition {capacity.edition}, {capacity.status}",
        assumed=capacity.assumed,
        gap=gap,
    )
