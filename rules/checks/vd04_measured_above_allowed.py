"""VD04: the measured drop is above the allowed one."""

from collections.abc import Iterator

from rules.assessment import Citation, Drop, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.errors import MissingData
from rules.record import Figure
from rules.rule import DOUBTS_OF_READINGS, named, rule
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
    under=("VD01", "VD02"),
)
def measured_above_allowed(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    More is lost between the points that were read than the whole circuit may lose.

    **Finds**: 24.05 V at way, 22.63 V at the load, 3 % of 24 V allowed: 1.42 V, 5.9 %.

    **Leaves alone**: 0.70 V of 24 V, 2.9 %. A drop read from the way is without the device, so that the whole is larger still.
    Where the path loses too much by the record already it is a consequence of VD01; where it is the excess alone that goes
    past the limit, of VD02.
    """
    if case.drop is None:
        return
    if not case.loads and case.context.index.fed_by_circuit(case.circuit.id):
        return  # what is allowed runs to loads; those behind a feeder have a circuit of their own
    nominal = case.nominal_v
    if nominal is None:
        raise MissingData("the nominal voltage is not known")
    drop, allowed = case.drop, case.allowed_drop_percent / 100
    verdict = against_limit(drop.lost.value, allowed * nominal, drop.measured.u or 0.0, case.limits)
    share, limit = show_against(round(drop.lost.value / nominal, 12), allowed, "1")
    where = f"{drop.start} to {drop.end}"
    lost = f"{show(drop.lost.value, 'V', drop.measured.u)} ({share})"
    along = f"from {where} at {show(drop.current.value, 'A', drop.current.u)} in round {drop.round}, allowed {limit}"
    read = f"{lost} read {along}"
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
            under=tuple(_under(case, drop, allowed * nominal)),
            as_consequence=f"read: {lost} {along}",
        )
    elif verdict is Verdict.OPEN:
        yield measured_above_allowed.gap(case, where, f"not settled: {read}")


def _under(case: CircuitCase, drop: Drop, allowed_v: float) -> Iterator[str]:
    """What explains it: the excess where the record alone would be within what is allowed, else the record."""
    excess = drop.too_much
    exceeds = probability_above(excess.value, 0.0, excess.u or 0.0) >= case.limits["decision.beyond_doubt"]
    if exceeds and abs(drop.computed.value) <= allowed_v:
        yield named("VD02", case)
    for point in dict.fromkeys(point.load.point for point in case.loads):
        if point == drop.end or case.leads_over(point, drop.end) or case.leads_over(drop.end, point):
            yield named("VD01", case, point)
