"""SV01: a circuit was not tested."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.rule import rule


@rule(
    id="SV01",
    title="Circuit not tested",
    about="circuit",
    severity=Severity.NOTE,
    remedy="Agree with the duty holder when and how it can be read, or record why it cannot.",
    caution="Nothing is known of it beyond the record. What others of its kind read says nothing of this one.",
    source=Citation("IEC 60364-6", "2016", "6.5: periodic verification, extent and limitations stated", "from-memory"),
)
def circuit_not_tested(case: CircuitCase) -> Iterator[Finding]:
    """
    Nothing was read on a circuit of a site that was surveyed; with the reason, or that none is recorded. So too where
    a reason stands beside readings, which contradict it.

    **Finds**: "life-safety circuit: the duty holder gave no permission for a load test".

    **Leaves alone**: a site on which nothing at all was read yet.
    """
    reason = case.circuit.not_tested
    if case.rounds:
        if reason:
            yield circuit_not_tested.finding(
                case, "circuit", f"was read on visit {case.visit}, and is recorded as not tested: {reason}", numbers={}
            )
    elif reason:
        yield circuit_not_tested.finding(case, "circuit", f"not tested: {reason}", numbers={})
    elif case.context.site.readings:
        under_load = " under load" if case.visit else ""
        yield circuit_not_tested.finding(
            case, "circuit", f"nothing was read{under_load}, and no reason is recorded", numbers={}
        )
