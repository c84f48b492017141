"""VD04: the measured drop is above the allowed one."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.errors import MissingData
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show, show_against


@rule(
    id="VD04",
    title="Measured drop above the allowed drop",
    about="circuit",
    severity=Severity.SOON,
    remedy="See what draws the current that was read; then compare with what the record computes, and enlarge or repair the path.",
    caution="Isolate and prove dead before touching a termination; local code and a licensed person decide. "
    "Holds for the current that was read: at another load the drop is another.",
    source=Citation("NFPA 70", "2023", "informational note to 210.19: a recommendation", "verified"),
    limits=("drop", "decision", *DOUBTS_OF_READINGS),
)
def measured_above_allowed(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    More is lost between the points that were read than the whole circuit may lose.

    **Finds**: 24.05 V at way, 22.63 V at the load, 3 % of 24 V allowed: 1.42 V, 5.9 %.

    **Leaves alone**: 0.70 V of 24 V, 2.9 %. A drop read from the way is without the device, so that the whole is larger still.
    """
    if case.drop is None:
        return
    nominal = case.nominal_v
    if nominal is None:
        raise MissingData("the nominal voltage is not known")
    drop, allowed = case.drop, case.allowed_drop_percent / 100
    verdict = against_limit(drop.lost.value, allowed * nominal, drop.measured.u or 0.0, case.limits)
    share, limit = show_against(round(drop.lost.value / nominal, 12), allowed, "1")
    where = f"{drop.start} to {drop.end}"
    read = (
        f"{show(drop.lost.value, 'V', drop.measured.u)} ({share}) read from {where} at "
        f"{show(drop.current.value, 'A', drop.current.u)} in round {drop.round}, allowed {limit}"
    )
    if verdict is Verdict.FAILS:
        own = case.circuit.allowed_drop_percent is not None
        yield measured_above_allowed.finding(
            case,
            where,
            read,
            numbers={
                "measured": drop.measured,
                "share": Figure(drop.lost.value / nominal, "1", (drop.measured.u or 0.0) / nominal),
                "allowed": Figure(allowed, "1"),
                "current": drop.current,
                "nominal": Figure(nominal, "V"),
            },
            source="the circuit's own allowed drop" if own else case.limits.citation("drop", "allowed_percent"),
            without=("drop",) if own else ("drop.allowed_total_percent",),
        )
    elif verdict is Verdict.OPEN:
        yield measured_above_allowed.gap(case, where, f"not settled: {read}")
