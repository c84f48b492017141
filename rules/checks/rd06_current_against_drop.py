"""RD06: the current's sign does not go with the drop's."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.impossible import against_the_drop
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show


@rule(
    id="RD06",
    title="Current against the drop",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Look at the arrow on the clamp and its place, and zero it; then read current and both voltages again.",
    caution="A clamp goes around one live conductor: keep fingers behind its guard. Current that truly flows towards the source means "
    "a second supply: the circuit stays live when its device is open.",
    source=Citation("closure tests on readings", status="common practice, no source"),
    limits=("decision", *DOUBTS_OF_READINGS),
)
def current_against_drop(case: CircuitCase) -> Iterator[Finding]:
    """
    The clamp says that current flows towards the source, while the voltage falls towards the load.

    **Finds**: −1.78 A with 24.02 V at way and 22.10 V at p1: the clamp was the other way round, or a sign is wrong.

    **Leaves alone**: −12 A with a voltage that rises away from the rectifier, as while a battery charges.
    """
    for this in case.rounds:
        found = against_the_drop(this, case.tree, case.limits)
        if found is not None:
            run = case.tree.ends.get(found.point)
            yield current_against_drop.finding(
                case,
                f"{run.name if run else found.point}, round {this.name}",
                f"{show(found.current.value, 'A', found.current.u)} was read while the voltage falls by "
                f"{show(found.fall.value, 'V', found.fall.u)} from {found.start} to {found.end}",
                numbers={"current": found.current, "fall": found.fall},
            )
