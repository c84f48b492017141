"""RD01: a voltage between the legs reads below zero."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.impossible import reversed_points
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

    **Finds**: way +24.02 V, p1 -23.61 V: the polarity changes along the circuit: soon, or immediate where a life-safety or
    trip-or-close load hangs on it. Where every point of the round reads negative, the meter's leads were swapped (watch).

    **Leaves alone**: 0.00 V within the meter's counts; one pole against earth, which may have either sign.
    """
    for this in case.rounds:
        found = reversed_points(this, case.limits)
        some = len(found) < len(this.volts)
        for point, volts in found:
            yield polarity_reversed.finding(
                case,
                f"{point}, round {this.name}",
                f"{point} reads {show(volts.value, 'V', volts.u)}"
                + (", other points of the round read above zero" if some else ", as does every point of the round"),
                numbers={"voltage": volts},
                severity=_severity(some, case.is_vital(point)),
            )


def _severity(some: bool, vital: bool) -> Severity:
    """Swapped leads of the meter are for watch; a load that lives depend on may have lost its supply."""
    if not some:
        return Severity.WATCH
    return Severity.IMMEDIATE if vital else Severity.SOON
