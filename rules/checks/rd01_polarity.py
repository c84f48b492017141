"""RD01: a voltage between the legs reads below zero."""

import math
from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.impossible import reversed_points, reversed_poles
from rules.ratings import sources_of
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show


@rule(
    id="RD01",
    title="Polarity reversed",
    about="circuit",
    severity=Severity.WATCH,
    remedy="Read the point again with the meter's leads in mind; if it stays negative, isolate and correct the connection.",
    caution="Live work: one probe clipped, one hand. Electronic loads can be destroyed by reversed polarity, and a "
    "diode in a load may then be the only thing that holds. A typing slip in the sign looks the same.",
    source=Citation("closure tests on readings", status="common practice, no source"),
    limits=("decision", *DOUBTS_OF_READINGS),
)
def polarity_reversed(case: CircuitCase) -> Iterator[Finding]:
    """
    The voltage between the legs at a point reads below zero beyond doubt.

    Or one pole to earth of an earthed system lies on the wrong side of it, by a quarter of nominal: soon, or immediate where
    a life-safety or trip-or-close load hangs on it. Where two or more points of a round all read negative, the meter's leads
    were swapped (watch, soon for such a load).

    **Finds**: way +24.02 V, p1 -23.61 V: the polarity changes along the circuit. The positive pole of p1 with -24.1 V to
    earth where the negative is earthed.

    **Leaves alone**: 0.00 V within the meter's counts; one pole against earth where the source is not recorded as earthed.
    """
    earthings = {source.earthing for source in sources_of(case.circuit, case.context.index)}
    earthing = min(earthings) if len(earthings) == 1 else ""
    for this in case.rounds:
        found = reversed_points(this, case.limits)
        # a pole above earth, beside points that all read negative, shows that the leads were not swapped
        poles = any(row.leg == "positive" and row.value > 0 for row in this.readings if row.quantity == "voltage")
        some = len(found) < len(this.volts) or len(found) == 1 or poles
        for point, volts in found:
            others = ", other points of the round read above zero" if len(found) < len(this.volts) else ""
            if not others and len(found) > 1:
                others = ", as does every point of the round"
            yield polarity_reversed.finding(
                case,
                f"{point}, round {this.name}",
                f"{point} reads {show(volts.value, 'V', volts.u)}{others}",
                numbers={"voltage": volts},
                severity=_severity(some, case.is_vital(point)),
            )
        for point, leg, volts in reversed_poles(this, earthing, case.nominal_v or math.inf, case.limits):
            yield polarity_reversed.finding(
                case,
                f"{point} {leg}, round {this.name}",
                f"the {leg} pole of {point} reads {show(volts.value, 'V', volts.u)} to earth, where the source is {earthing}",
                numbers={"voltage": volts},
                severity=_severity(True, case.is_vital(point)),
            )


def _severity(some: bool, vital: bool) -> Severity:
    """Swapped leads of the meter are for watch; a load that lives depend on may have lost its supply."""
    if not some:
        return Severity.SOON if vital else Severity.WATCH
    return Severity.IMMEDIATE if vital else Severity.SOON
