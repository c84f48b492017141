"""RD02: a point nearer the load reads higher than one nearer the source."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.impossible import rises
from rules.rule import DOUBTS_OF_READINGS, named, rule
from rules.units import show


@rule(
    id="RD02",
    title="Load end above source end",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Read both points again within seconds, source, load, source; check that points and signs were not mixed up.",
    caution="Live readings: mind the meter's category and keep the leads in the voltage jacks. A second supply that feeds back "
    "into the circuit reads the same way: do not take the circuit for dead when its device is open.",
    source=Citation("closure tests on readings", status="common practice, no source"),
    limits=("decision", *DOUBTS_OF_READINGS),
    under=("RD07",),
)
def load_end_above_source_end(case: CircuitCase) -> Iterator[Finding]:
    """
    Voltage rises in the direction of the load, beyond what the meter allows.

    **Finds**: way 23.41 V, p1 24.12 V with one 0.5 % + 2 counts meter: 0.71 ± 0.02 V the wrong way.

    **Leaves alone**: 24.12 V and 24.13 V on a display of 0.01 V, which is within two counts. A rise from or to a reading that
    RD07 finds mistyped is a consequence of that.
    """
    for this in case.rounds:
        for rise in rises(this, case.tree, case.limits)[:1]:
            yield load_end_above_source_end.finding(
                case,
                f"{rise.start} to {rise.end}, round {this.name}",
                f"{rise.end} reads {show(rise.rise.value, 'V', rise.rise.u)} above {rise.start}",
                numbers={"rise": rise.rise},
                under=tuple(
                    named("RD07", case, f"voltage at {at}, round {this.name}") for at in (rise.start, rise.end)
                ),
            )
