"""VD01: the computed drop from the feeding board to a load is above the allowed one."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.errors import MissingData
from rules.record import Figure
from rules.rule import DOUBTS_OF_COMPUTED, rule
from rules.sufficient import sufficient_of, sufficient_words
from rules.units import show, show_against

MEASURE_FIRST = "Measure the drop of each run at a known current;"


@rule(
    id="VD01",
    title="Computed drop above the allowed drop",
    about="circuit",
    severity=Severity.SOON,
    remedy=f"{MEASURE_FIRST} then choose a larger size, a shorter way or a nearer board.",
    caution="Isolate and prove dead before touching a termination; local code and a licensed person decide. "
    "Computed for steady current and healthy joints; says nothing about inrush.",
    source=Citation("NFPA 70", "2023", "informational note to 210.19: a recommendation", "verified"),
    limits=("drop", "decision", *DOUBTS_OF_COMPUTED),
)
def drop_above_allowed(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A load receives less voltage than the circuit is allowed to lose, by the record alone.

    **Finds**: 24 V, 29 m of 4 mm² copper at 20 °C, 8 A, 5 % allowed: 2.14 V, 8.9 %.

    **Leaves alone**: the same on 10 mm²: 0.85 V, 3.5 %. A drop so near the limit that its doubt reaches over it is
    not judged.
    """
    if not case.loads:
        return
    nominal = case.nominal_v
    if nominal is None:
        raise MissingData("the nominal voltage is not known")
    known = [point for point in case.loads if point.drop_v == point.drop_v and not point.collapsed]
    if not known:
        raise MissingData(case.loads[0].gap or case.loads[0].total_gap or "the voltages are not known")
    worst = max(known, key=lambda point: point.drop_v)
    allowed_v = case.allowed_drop_percent / 100 * nominal
    verdict = against_limit(worst.drop_v, allowed_v, worst.drop_u, case.limits)
    share, limit = show_against(worst.drop_v / nominal, case.allowed_drop_percent / 100, "1")
    drop = show(worst.drop_v, "V", worst.drop_u)
    if verdict is Verdict.FAILS:
        enough, drops = sufficient_words(*sufficient_of(case, worst), nominal)
        own = case.circuit.allowed_drop_percent is not None
        total_percent = case.limits["drop.allowed_total_percent"]
        total_v = total_percent / 100 * nominal
        past_total = against_limit(worst.total_drop_v, total_v, worst.total_drop_u, case.limits) is Verdict.FAILS
        yield drop_above_allowed.finding(
            case,
            worst.load.point,
            f"{'at least ' if worst.gap else ''}{drop} ({share}) from the board to {worst.load.tag}, allowed {limit}",
            numbers={
                "drop": Figure(worst.drop_v, "V", worst.drop_u),
                "share": Figure(worst.drop_v / nominal, "1", worst.drop_u / nominal),
                "allowed": Figure(case.allowed_drop_percent / 100, "1"),
                "nominal": Figure(nominal, "V"),
            }
            | drops,
            remedy=f"{MEASURE_FIRST} then {enough} would do by the drop alone, or choose a shorter way or a nearer board."
            if enough
            else None,
            source="the circuit's own allowed drop" if own else case.limits.citation("drop", "allowed_percent"),
            without=(
                *(("drop.allowed_percent",) if own else ()),
                *(() if past_total and not worst.total_gap else ("drop.allowed_total_percent",)),
            ),
            consequences=(
                f"from the source it loses {show(worst.total_drop_v, 'V', worst.total_drop_u)}, more than the "
                f"{total_percent:g} % allowed in all",
            )
            if past_total and not worst.total_gap
            else (),
        )
    elif worst.gap:
        yield drop_above_allowed.gap(case, worst.load.point, worst.gap)
    elif verdict is Verdict.OPEN:
        why = f"not settled: {drop} ({share}) to {worst.load.tag} against {limit} allowed"
        yield drop_above_allowed.gap(case, worst.load.point, why)
