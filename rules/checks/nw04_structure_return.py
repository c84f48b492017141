"""NW04: the building's or rack's metal is the way back."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.structure import structure_ohm
from rules.units import show

COVERAGE = 2
"""Standard uncertainties that a bound lies above a value: 97.7 of 100."""


@rule(
    id="NW04",
    title="Structure used as the return",
    about="circuit",
    severity=Severity.NOTE,
    remedy="Read voltages at both ends and the current of the run, so that its way back has a figure; or pull a return conductor.",
    caution="Current in metalwork takes every way at once: through pipes, screens and earth conductors, where it corrodes and disturbs. "
    "Do not part bonded metal while it flows: it can spark. Whether it may be a return is for local code and a licensed person.",
    source=Citation("ohmwalk, format of the site folder", clause="return: structure has no figure of its own", status="our own rule"),
    also=(Citation("MIL-HDBK-419A", "1987", "bonds of 1 mohm, brackets up to 5 mohm", "from-memory"),),
    limits=("decision", "load_share", "resistance_doubt", "length_doubt", "temperature_doubt", "termination", *DOUBTS_OF_READINGS),
)  # fmt: skip
def structure_return(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A run returns through the structure. Its resistance stands in no record; from voltages at both ends and the current it
    follows: what the loop has beyond the outgoing conductor. What is not known is said with it.

    **Finds**: ``structure`` as the return of run 1: a note; with 24.00 V and 23.60 V at its ends and 8 A, 50 mΩ in the
    loop, of which the outgoing conductor has 46 mΩ: 4 mΩ come back through the structure.

    Where its doubt reaches to 0 the structure's resistance counts as not known, with the most that it may be.

    **Leaves alone**: a run with a return of its own, and one that shares a return conductor (NW03).
    """
    for run in case.runs:
        if run.return_or_default != "structure":
            continue
        found = structure_ohm(case, run)
        if isinstance(found, str):
            yield structure_return.gap(case, run.name, f"the resistance of the structure: {found}")
        known = "its resistance is not known"
        numbers = {}
        sure = isinstance(found, Figure) and (
            probability_above(found.value, 0.0, found.u or 0.0) >= case.limits["decision.beyond_doubt"]
        )
        if isinstance(found, Figure) and sure:
            known = f"it has {show(found.value, 'ohm', found.u)} by what was read"
            numbers = {"resistance of the structure": found}
        elif isinstance(found, Figure):
            most = max(found.value, 0.0) + COVERAGE * (found.u or 0.0)
            known = f"its resistance is not known, by what was read at most {show(most, 'ohm', digits=2)}"
            numbers = {"at most": Figure(most, "ohm")}
        yield structure_return.finding(
            case,
            run.name,
            f"{run.name} returns through the structure: {known}; which ways the current takes, whether they stay as they are, and what "
            "other circuits put into them is not known",
            numbers=numbers,
            remedy="Pull a return conductor; until then read both ends and the current on each visit, since its ways may change."
            if sure
            else None,
        )
