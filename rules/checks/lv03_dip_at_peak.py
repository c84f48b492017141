"""LV03: a load falls below its lowest voltage while it draws its peak current."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase, LoadPoint
from rules.decision import Verdict, against_limit
from rules.margins import Margin, dip_u, margins_of
from rules.places import joined
from rules.record import Figure
from rules.rule import DOUBTS_OF_COMPUTED, rule
from rules.units import show, show_against


@rule(
    id="LV03",
    title="Load below its lowest voltage at its peak current",
    about="circuit",
    severity=Severity.SOON,
    remedy="Catch the dip with a meter whose minimum hold is quicker than the peak is long; then enlarge the path, feed the load from a "
    "nearer board, or have it start by itself.",
    caution="A lock, drive or coil that does not start stays where it is, and its controller may restart for ever: test with the door or "
    "gear held safe. On a life-safety or trip-or-close load only with the duty holder's permission. No dip on a slow meter proves nothing.",
    source=Citation("Vmin = Vs - Ipk (Rloop + Rsource)", status="computed"),
    limits=("decision", "temperature", *DOUBTS_OF_COMPUTED),
)
def dip_at_peak(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A load falls below its lowest voltage while it draws its peak, every other load steady. It is for soon where that is so
    from the working voltage, or for a life-safety or trip-or-close load from the source's lowest; else for watch, since it
    shows only when the source is at its lowest. The source's own resistance counts where it is recorded; else the dip is at least this.

    **Finds**: a lock of 1 A that starts with 5 A, on 24 V through 1.9 Ω: 14.5 V, below its 20.4 V, though it has 22.1 V
    when it holds.

    **Leaves alone**: the same with a start of 1.5 A: 21.2 V. A load that is below its lowest without its peak, which LV01
    says; what capacitors and inductance hold up for some milliseconds.
    """
    margins = {margin.load.id: margin for margin in margins_of(case)}
    for point in case.loads:
        load, margin = point.load, margins[point.load.id]
        if load.peak_current_a is None:
            continue
        if load.lowest_voltage_v is None:
            yield dip_at_peak.gap(case, load.point, f"the lowest voltage of “{load.tag}” is not known")
        elif margin.peak is None:
            why = point.gap or point.total_gap or f"what “{load.tag}” has without its peak is not known"
            yield dip_at_peak.gap(case, load.point, why)
        else:
            yield from _judge(case, point, margin, load.lowest_voltage_v)


def _judge(case: CircuitCase, point: LoadPoint, margin: Margin, lowest: float) -> Iterator[Finding | NotJudged]:
    peak, load = margin.peak, point.load
    assert peak is not None
    states = [
        (peak.design_v, margin.design_v, point.total_drop_v, point.total_drop_u, "at the source's working voltage")
    ]
    if peak.lowest_v is not None:
        drop_v = point.source_lowest_v - point.lowest_v
        words = f"with the source at {show(point.source_lowest_v, 'V')} and hot conductors"
        states.append((peak.lowest_v, margin.worst_v, drop_v, point.lowest_u, words))
    open_ = ""
    for number, (volts, steady, drop_v, drop_u, when) in enumerate(states):
        u = dip_u(steady or 0.0, volts, drop_v, drop_u)
        if steady is None or steady < lowest:
            return  # LV01 says so, of this state and of all lower ones
        verdict = against_limit(volts, lowest, u, case.limits, above_is_bad=False)
        if verdict is Verdict.FAILS:
            shown, limit = show_against(volts, lowest, "V")
            vital = load.function_or_default != "ordinary"
            yield dip_at_peak.finding(
                case,
                _where(case, point),
                f"{load.tag} dips to {shown} at its peak of {show(peak.current_a, 'A')} {when}, from {show(steady, 'V')}; its "
                f"lowest is {limit}",
                numbers={
                    "at its peak": Figure(volts, "V", u),
                    "steady": Figure(steady, "V", drop_u),
                    "lowest": Figure(lowest, "V"),
                    "peak": Figure(peak.current_a, "A"),
                }
                | ({} if peak.source_ohm is None else {"source resistance": Figure(peak.source_ohm, "ohm")}),
                severity=Severity.SOON if number == 0 or vital else Severity.WATCH,
                consequences=tuple(_consequences(case, point, peak.source_ohm)),
            )
            return
        if verdict is Verdict.OPEN and not open_:
            open_ = (
                f"not settled: {load.tag} dips to {show(volts, 'V', u)} {when} against its lowest {show(lowest, 'V')}"
            )
    if open_:
        yield dip_at_peak.gap(case, load.point, open_)


def _consequences(case: CircuitCase, point: LoadPoint, source_ohm: float | None) -> Iterator[str]:
    others = [load.load.tag for load in case.loads if load is not point]
    if others:
        yield f"what hangs on the same path dips with it: {', '.join(others)}"
    if source_ohm is None:
        yield "the source's own resistance is not recorded: the dip is at least this"
    if point.load.peak_time_s is not None:
        yield f"the dip lasts {show(point.load.peak_time_s, 's')}, if the load's figures hold"


def _where(case: CircuitCase, point: LoadPoint) -> str:
    """The load's point; with the load's tag where others are there too, so that each finding has an id of its own."""
    alone = sum(other.load.point == point.load.point for other in case.loads) == 1
    return joined(point.load.point, "" if alone else point.load.tag)
