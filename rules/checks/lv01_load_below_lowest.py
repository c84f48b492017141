"""LV01: a load gets less than its lowest voltage."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase, LoadPoint
from rules.decision import Verdict, against_limit
from rules.record import Figure
from rules.rule import rule
from rules.units import show, show_against


@rule(
    id="LV01",
    title="Load below its lowest voltage",
    about="circuit",
    severity=Severity.SOON,
    remedy="Confirm the load's lowest voltage on its plate; then find what the path loses, and enlarge or repair it.",
    caution="A load that drops out when the battery is low fails when it is needed: treat door release, alarm, trip and life "
    "safety first, with the duty holder's permission. Computed with healthy joints: what readings show may be worse.",
    source=Citation("the load maker's lowest voltage", status="common practice, no source"),
)
def load_below_lowest(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A load was read below its lowest voltage, or by the record falls below it at the lowest source voltage.

    **Finds**: 48 V battery down to 43.2 V, 0.20 Ω of path, a 600 W constant-power load with a lowest of 40.5 V: 40.2 V.
    A load that cannot be supplied at all: the voltage collapses. Severity is immediate where a life-safety or
    trip-or-close load was read below its lowest.

    **Leaves alone**: the same load of 500 W: 40.7 V. A voltage within its doubt of the limit is not judged.
    """
    unknown = [point.load.tag for point in case.loads if point.load.lowest_voltage_v is None]
    if unknown:
        more = f" and of {len(unknown) - 1} more" if len(unknown) > 1 else ""
        yield load_below_lowest.gap(case, "", f"the lowest voltage of “{unknown[0]}”{more} is not known")
    for point in case.loads:
        if point.load.lowest_voltage_v is not None:
            yield from _judge(case, point, point.load.lowest_voltage_v)


def _judge(case: CircuitCase, point: LoadPoint, lowest: float) -> Iterator[Finding | NotJudged]:
    name = point.load.tag
    # without voltage, or with its leads swapped, a point says nothing about what its load can live with
    some = case.limits["readings.no_voltage_share"] * (case.nominal_v or 0.0)
    read = [(name_, volts) for name_, volts in point.read if volts.value > some]
    if read:
        round_, volts = min(read, key=lambda item: item[1].value)
        if against_limit(volts.value, lowest, volts.u or 0.0, case.limits, above_is_bad=False) is Verdict.FAILS:
            shown, limit = show_against(volts.value, lowest, "V")
            vital = point.load.function_or_default != "ordinary"
            yield load_below_lowest.finding(
                case,
                point.load.point,
                f"{name} was read at {shown} in round {round_}, below its lowest {limit}",
                numbers={"voltage": volts, "lowest": Figure(lowest, "V")},
                severity=Severity.IMMEDIATE if vital else Severity.SOON,
            )
            return
    if point.collapsed or (point.collapsed_lowest and not case.context.network.gap_lowest[_source(case)]):
        when = "at design" if point.collapsed else f"with the source at {show(point.source_lowest_v, 'V')}"
        yield load_below_lowest.finding(
            case,
            point.load.point,
            f"{name} cannot be supplied {when}: the voltage collapses, no current gives its power",
            numbers={"lowest": Figure(lowest, "V")},
        )
        return
    volts = Figure(point.lowest_v, "V", point.lowest_u)
    verdict = (
        Verdict.OPEN
        if point.lowest_v != point.lowest_v
        else against_limit(point.lowest_v, lowest, point.lowest_u, case.limits, above_is_bad=False)
    )
    if verdict is Verdict.FAILS and not _source_gap(case):
        shown, limit = show_against(point.lowest_v, lowest, "V")
        yield load_below_lowest.finding(
            case,
            point.load.point,
            f"{name} gets {'at most ' if point.lowest_gap else ''}{shown} with the source at "
            f"{show(point.source_lowest_v, 'V')} and hot conductors, as recorded; its lowest is {limit}",
            numbers={"voltage": volts, "lowest": Figure(lowest, "V"), "source": Figure(point.source_lowest_v, "V")},
        )
    elif point.lowest_gap:
        yield load_below_lowest.gap(case, point.load.point, point.lowest_gap)
    elif verdict is Verdict.OPEN:
        why = f"not settled: {name} gets {show(volts.value, 'V', volts.u)} against its lowest {show(lowest, 'V')}"
        yield load_below_lowest.gap(case, point.load.point, why)


def _source(case: CircuitCase) -> int:
    network = case.context.network
    return list(network.way_up(network.nodes_of[case.circuit.id]["bus"]))[-1]


def _source_gap(case: CircuitCase) -> bool:
    """Whether the lowest voltage of the source itself is not known: then nothing is an upper bound."""
    return bool(case.context.network.gap_lowest[_source(case)])
