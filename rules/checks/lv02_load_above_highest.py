"""LV02: a load gets more than its highest voltage."""

from collections.abc import Iterator
from dataclasses import dataclass

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase, LoadPoint
from rules.decision import Verdict, against_limit
from rules.doubts import drop_u
from rules.load_window import Bound, highest_of, source_of, unused
from rules.places import joined
from rules.record import Figure
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, rule
from rules.units import show, show_against


@rule(
    id="LV02",
    title="Load above its highest voltage",
    about="circuit",
    severity=Severity.SOON,
    remedy="Compare the load's highest voltage on its plate with the source's float and equalising voltage; then lower the source, or fit "
    "a regulator or a load of the right rating.",
    caution="Electronics, lamps and coils run hot or fail from it, door magnets and trip coils among them, often weeks later. Setting a "
    "charger changes what the battery needs: its maker's figures decide. Do not switch a load off to protect it where people rely on it.",
    source=Citation("the load maker's highest voltage", status="common practice, no source"),
    limits=("decision", "load_window", "cold", *DOUBTS_OF_COMPUTED, *DOUBTS_OF_READINGS),
)
def load_above_highest(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A load was read above its highest voltage, or by the record rises above it while the source is at its highest: soon
    where that is so with every load on and cold conductors, which is the least drop; for watch where only loads that are
    off leave it more than its highest. A load that records none is held against the highest of its trade's profile, where
    that states one: for watch.

    **Finds**: a 24 V charger up to 29.6 V, 0.278 Ω of path, a load of 2 A with a highest of 28.8 V: 29.04 V.

    **Leaves alone**: the same with 30 V as its highest. A voltage within its doubt of the limit is not judged.
    """
    bounds = [(point, highest_of(case, point.load)) for point in case.loads]
    unknown = [point.load.tag for point, bound in bounds if bound is None]
    if unknown and len(unknown) < len(case.loads):  # where no load of the circuit states one, it is no omission
        yield load_above_highest.gap(case, "", f"the highest voltage of “{unknown[0]}” is not known")
    for point, bound in bounds:
        if bound is not None:
            yield from _judge(case, point, bound)


def _judge(case: CircuitCase, point: LoadPoint, bound: Bound) -> Iterator[Finding | NotJudged]:
    name, where, highest = point.load.tag, _where(case, point), bound.volts
    from_source, without, severity = source_of(case, bound), unused(bound), None if bound.is_own else Severity.WATCH
    read = [(round_, volts) for round_, volts in point.read if volts.value > 0]  # RD01 says the others
    if read:
        # the reading that says most, not the highest: a poor meter's may be higher and say nothing
        round_, volts = max(read, key=lambda item: probability_above(item[1].value, highest, item[1].u or 0.0))
        if against_limit(volts.value, highest, volts.u or 0.0, case.limits) is Verdict.FAILS:
            shown, limit = show_against(volts.value, highest, "V")
            yield load_above_highest.finding(
                case,
                where,
                f"{name} was read at {shown} in round {round_}, above {bound.whose} highest {limit}",
                numbers={"voltage": volts, "highest": Figure(highest, "V")},
                severity=severity,
                source=from_source,
                without=without,
            )
            return
    at = _at_highest(case, point)
    if isinstance(at, str):
        yield load_above_highest.gap(case, point.load.point, at)
        return
    loaded = against_limit(at.loaded.value, highest, at.loaded.u or 0.0, case.limits)
    numbers = {"voltage": at.loaded, "highest": Figure(highest, "V"), "source": Figure(at.source_v, "V")}
    source = show(at.source_v, "V")
    if loaded is Verdict.FAILS and not at.gap:
        shown, limit = show_against(at.loaded.value, highest, "V")
        why = f"{name} gets {shown} with the source at {source}, every load on and cold conductors; {bound.whose} highest is {limit}"
        yield load_above_highest.finding(
            case, where, why, numbers=numbers, severity=severity, source=from_source, without=without
        )
    elif at.source_v > highest:
        with_loads = "" if at.gap else f"; with every load on {show(at.loaded.value, 'V', at.loaded.u)}"
        shown, limit = show_against(at.source_v, highest, "V")
        yield load_above_highest.finding(
            case,
            where,
            f"{name} gets up to {shown} with the source at its highest and the loads off{with_loads}; {bound.whose} highest is {limit}",
            numbers=numbers if not at.gap else {name_: numbers[name_] for name_ in ("highest", "source")},
            severity=Severity.WATCH,
            source=from_source,
            without=without,
        )


@dataclass(frozen=True, slots=True)
class _AtHighest:
    source_v: float
    loaded: Figure
    """With every load on, conductors cold; at most this where ``gap`` says why."""
    gap: str


def _at_highest(case: CircuitCase, point: LoadPoint) -> _AtHighest | str:
    """The voltages of a load with its source at the highest, or why they are not known."""
    network = case.context.network
    node = network.nodes_of.get(case.circuit.id, {}).get(point.load.point)
    if node is None:
        return point.gap
    way = list(network.way_up(node))
    if network.gap_highest[way[-1]]:
        return network.gap_highest[way[-1]]
    volts, source_v = float(network.highest.voltage_v[node]), float(network.held_highest_v[way[-1]])
    if volts != volts:
        return network.gap_of(node, highest=True) or "what arrives at the highest source voltage is not known"
    u = drop_u(case.context, way[:-1], "highest")
    return _AtHighest(source_v, Figure(volts, "V", u), network.gap_of(node, highest=True))


def _where(case: CircuitCase, point: LoadPoint) -> str:
    """The load's point; with the load's tag where others are there too, so that each finding has an id of its own."""
    alone = sum(other.load.point == point.load.point for other in case.loads) == 1
    return joined(point.load.point, "" if alone else point.load.tag)
