"""RD04: there is no voltage at a point."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.errors import MissingData
from rules.impossible import dead_points, flowing
from rules.places import joined
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show


@rule(
    id="RD04",
    title="No voltage at a point",
    about="circuit",
    severity=Severity.SOON,
    remedy="Find out whether it was switched off, its device open, or the path broken: follow the voltage from the source, on auto volts.",
    caution="Never bridge a gap with a meter on millivolts or amperes: across an open joint or fuse stands the full system voltage. "
    "No voltage on a meter does not prove a circuit dead.",
    source=Citation("closure tests on readings", status="common practice, no source"),
    limits=("decision", "readings", *DOUBTS_OF_READINGS),
)
def no_voltage(case: CircuitCase) -> Iterator[Finding]:
    """
    The voltage between the legs at a point is a small part of nominal, and no current was read to pass the point; or
    every point of a round has none while current flows, as into a short circuit.

    Immediate where a life-safety or trip-or-close load hangs on it.

    **Finds**: way 24.03 V, p1 0.02 V: the circuit is open or switched off, and no drop can be taken from the round.

    **Leaves alone**: 19.6 V of 24 V, which is a drop; 0.24 V at a point that current passes, which is a slip.
    The profile holds the share of nominal below which it is none.
    """
    if not case.rounds:
        return
    nominal = case.nominal_v
    if nominal is None:
        raise MissingData("the nominal voltage is not known")
    for this in case.rounds:
        found = dead_points(this, case.tree, nominal, case.limits)
        flows = len(found) == len(this.volts) and flowing(this, case.limits)
        behind = ", ".join(point for point, _ in found[1:])
        for point, volts in found[:1] if flows else found:
            why = "open or switched off"
            if flows:
                why = f"as does what was read behind it ({behind}), while current flows: short-circuited, or its source folds back"
            yield no_voltage.finding(
                case,
                joined(point, f"round {this.name}"),
                f"{point} reads {show(volts.value, 'V', volts.u)} where {show(nominal, 'V')} belongs"
                f"{', ' if flows else ': '}{why}",
                numbers={"voltage": volts, "nominal": Figure(nominal, "V")},
                severity=Severity.IMMEDIATE if case.is_vital(point) else Severity.SOON,
            )
