"""VD03: the computed drop from the source's terminals to a load is above the allowed total."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase, LoadPoint
from rules.decision import Verdict, against_limit
from rules.errors import MissingData
from rules.record import Figure
from rules.rule import DOUBTS_OF_COMPUTED, rule
from rules.sufficient import sufficient_of, sufficient_words
from rules.units import show, show_against

FEEDER_FIRST = "See which feeder loses most; enlarge it,"


@rule(
    id="VD03",
    title="Computed drop from the source above the allowed total",
    about="circuit",
    severity=Severity.SOON,
    remedy=f"{FEEDER_FIRST} or move load to a nearer board.",
    caution="Isolate and prove dead before touching a termination; a battery cannot be switched off. Local code and a licensed "
    "person decide. Computed for all loads at their design value at once.",
    source=Citation("NFPA 70", "2023", "informational notes to 210.19 and 215.2: a recommendation", "verified"),
    limits=("drop", "decision", *DOUBTS_OF_COMPUTED),
)
def total_above_allowed(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    Feeders and circuit together lose more than is allowed from the source's terminals to a load.

    **Finds**: a feeder that loses 1.6 V and a circuit that loses 1.3 V of 48 V: 6.0 % against 5 %.

    **Leaves alone**: a circuit that VD01 reports already for what it loses behind its board, which names this as a consequence.
    """
    if not case.loads:
        return
    nominal = case.nominal_v
    if nominal is None:
        raise MissingData("the nominal voltage is not known")
    known = [point for point in case.loads if point.total_drop_v == point.total_drop_v and not point.collapsed]
    if not known:
        raise MissingData(case.loads[0].total_gap or case.loads[0].total_gap or "the voltages are not known")
    worst = max(known, key=lambda point: point.total_drop_v)
    if _said_already(worst, case):
        return
    allowed = case.limits["drop.allowed_total_percent"] / 100
    verdict = against_limit(worst.total_drop_v, allowed * nominal, worst.total_drop_u, case.limits)
    share, limit = show_against(worst.total_drop_v / nominal, allowed, "1")
    drop = show(worst.total_drop_v, "V", worst.total_drop_u)
    if verdict is Verdict.FAILS:
        # what is left for the circuit when its feeders lose what they do
        left_v = allowed * nominal - (worst.total_drop_v - worst.drop_v)
        found = (None, None) if worst.total_gap or left_v <= 0 else sufficient_of(case, worst, left_v)
        enough, drops = sufficient_words(*found, nominal)
        yield total_above_allowed.finding(
            case,
            worst.load.point,
            f"{'at least ' if worst.total_gap else ''}{drop} ({share}) from the source to {worst.load.tag}, "
            f"of which {show(worst.drop_v, 'V', worst.drop_u)} behind the board; allowed {limit}",
            numbers={
                "drop": Figure(worst.total_drop_v, "V", worst.total_drop_u),
                "share": Figure(worst.total_drop_v / nominal, "1", worst.total_drop_u / nominal),
                "behind the board": Figure(worst.drop_v, "V", worst.drop_u),
                "allowed": Figure(allowed, "1"),
                "nominal": Figure(nominal, "V"),
            }
            | drops,
            remedy=f"{FEEDER_FIRST} or move load to a nearer board; in this circuit alone {enough} would do by the drop alone."
            if enough
            else None,
            source=case.limits.citation("drop", "allowed_total_percent"),
            without=("drop.allowed_percent",),
        )
    elif worst.total_gap:
        yield total_above_allowed.gap(case, worst.load.point, worst.total_gap)
    elif verdict is Verdict.OPEN:
        why = f"not settled: {drop} ({share}) from the source to {worst.load.tag} against {limit} allowed"
        yield total_above_allowed.gap(case, worst.load.point, why)


def _said_already(worst: LoadPoint, case: CircuitCase) -> bool:
    """Whether the drop behind the board is above the circuit's own limit, so that VD01 says it."""
    own = case.allowed_drop_percent / 100 * (case.nominal_v or 0.0)
    return not worst.gap and against_limit(worst.drop_v, own, worst.drop_u, case.limits) is Verdict.FAILS
