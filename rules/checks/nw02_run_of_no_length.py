"""NW02: a run is recorded with a length of zero."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.record import Figure
from rules.rule import rule


@rule(
    id="NW02",
    title="Run of no length",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Tape the run and record its length; leave the cell empty if it is not known.",
    caution="Computed drops on this circuit are too small by what the run loses. Following a cable may mean opening enclosures: "
    "cover or isolate live parts, and prove dead before touching.",
    source=Citation(
        "ohmwalk, format of the site folder", clause="an empty cell is not known, never zero", status="our own rule"
    ),
)
def run_of_no_length(case: CircuitCase) -> Iterator[Finding]:
    """
    A run's length is zero, so that its terminations alone count.

    **Finds**: ``0 m`` in the length cell of run 2.

    **Leaves alone**: an empty cell, which is not known (RC01), and a link of 0.1 m.
    """
    for run in case.runs:
        if run.one_way_length_m == 0:
            yield run_of_no_length.finding(
                case,
                run.name,
                f"{run.name} is recorded as 0 m long: only its terminations are counted",
                numbers={"length": Figure(0.0, "m")},
            )
