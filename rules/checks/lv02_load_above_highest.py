"""LV02: a load gets more than its highest voltage."""

from collections import defaultdict
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase, LoadPoint
from rules.context import Context
from rules.decision import Verdict, against_limit
from rules.doubts import drop_u
from rules.load_window import Bound, highest_of, source_of, unused
from rules.nominal import nominal_v
from rules.places import joined
from rules.record import Figure, Source
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, BoardCase, named, rule
from rules.units import show, show_against

MOST_NAMED = 3
"""Loads that a finding names beside the first."""


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
    also_about=("source",),
    under=("LV02",),
)
def load_above_highest(case: CircuitCase | BoardCase) -> Iterator[Finding | NotJudged]:
    """
    A load was read above its highest voltage, or by the record rises above it while the source is at its highest: soon
    where that is so with every load on and cold conductors, which is the least drop; for watch where only loads that are
    off leave it more than its highest. A load that records none is held against the highest of its trade's profile, where
    that states one: for watch.

    **Finds**: a 24 V charger up to 29.6 V, 0.278 Ω of path, a load of 2 A with a highest of 28.8 V: 29.04 V.

    **Leaves alone**: the same with 30 V as its highest. A voltage within its doubt of the limit is not judged.
    """
    if isinstance(case, BoardCase):
        yield from _of_source(case)
        return
    bounds = [(point, highest_of(point.load, case.nominal_v, case.limits)) for point in case.loads]
    unknown = [point.load.tag for point, bound in bounds if bound is None]
    if unknown and len(unknown) < len(case.loads):  # where no load of the circuit states one, it is no omission
        yield load_above_highest.gap(case, "", f"the highest voltage of “{unknown[0]}” is not known")
    found: dict[Bound, list[tuple[str, Finding]]] = defaultdict(list)
    for point, bound in bounds:
        for said in _judge(case, point, bound) if bound is not None else ():
            if isinstance(said, Finding) and bound is not None:
                found[bound].append((point.load.tag, said))
            else:
                yield said
    for alike in found.values():
        yield _together(alike)


def _together(alike: Sequence[tuple[str, Finding]]) -> Finding:
    """One finding for loads of a circuit that have one highest: at the first of those that are most urgent, one that was read."""
    first = min((one for _, one in alike), key=lambda one: (one.severity.rank, "source" in one.numbers))
    others = [tag for tag, one in alike if one is not first]
    if not others:
        return first
    also = f"; likewise {_names(others)}"
    return replace(first, why=first.why + also, as_consequence=first.as_consequence and first.as_consequence + also)


def _names(tags: Sequence[str]) -> str:
    more = f" and {len(tags) - MOST_NAMED} more" if len(tags) > MOST_NAMED else ""
    return f"{', '.join(tags[:MOST_NAMED])}{more}"


def _of_source(case: BoardCase) -> Iterator[Finding]:
    """Loads of several circuits that have one highest, which their source passes."""
    source, context = case.row, case.context
    node = context.network.node_of.get(("sources", source.id))
    if node is None or not isinstance(source, Source) or context.network.sources_at(node)[:1] != (source,):
        return
    if context.network.gap_highest[node]:
        return  # which each circuit says of its loads
    source_v, index = float(context.network.held_highest_v[node]), context.index
    found: dict[Bound, list[_Load]] = defaultdict(list)
    for circuit_id in context.network.hanging.circuits_below.get(node, ()):
        circuit = index.circuits[circuit_id]
        nominal = nominal_v(circuit, index)
        for load in index.loads_of(circuit_id):
            bound = highest_of(load, nominal, context.limits)
            if bound is None or source_v <= bound.volts:
                continue
            at = _at_highest(context, circuit_id, load.point)
            if isinstance(at, _AtHighest):
                found[bound].append(_Load(load.tag, circuit.tag, at))
    for bound, loads in found.items():
        if len({load.circuit for load in loads}) > 1:
            yield _of_several(case, bound, loads, source_v)


@dataclass(frozen=True, slots=True)
class _AtHighest:
    source_v: float
    loaded: Figure
    """With every load on, conductors cold; at most this where ``gap`` says why."""
    gap: str


@dataclass(frozen=True, slots=True)
class _Load:
    tag: str
    circuit: str
    at: _AtHighest


def _of_several(case: BoardCase, bound: Bound, loads: Sequence[_Load], source_v: float) -> Finding:
    limits = case.context.limits
    shown, limit = show_against(source_v, bound.volts, "V")
    names = _names([f"{load.tag} on {load.circuit}" for load in loads])
    circuits = len({load.circuit for load in loads})
    loaded = [
        load.at.loaded
        for load in loads
        if not load.at.gap
        and against_limit(load.at.loaded.value, bound.volts, load.at.loaded.u or 0.0, limits) is Verdict.FAILS
    ]
    most = max(loaded, key=lambda volts: volts.value, default=None)
    still = (
        f"; with every load on and cold conductors {len(loaded)} of them are still above it, at up to "
        f"{show_against(most.value, bound.volts, 'V')[0]}"
        if most is not None
        else ""
    )
    return load_above_highest.finding(
        case,
        _of_highest(bound),
        f"{len(loads)} loads of {circuits} circuits get up to {shown} with the source at its highest, above {bound.whose_of_several} "
        f"highest {limit}: {names}{still}",
        numbers={"highest": Figure(bound.volts, "V"), "source": Figure(source_v, "V")}
        | ({"voltage": most} if most is not None else {}),
        severity=Severity.SOON if bound.is_own and most is not None else Severity.WATCH,
        source=source_of(limits, bound),
        without=unused(bound),
    )


def _of_highest(bound: Bound) -> str:
    """Where a finding about a source is: the highest voltage that its loads share."""
    return f"loads up to {show(bound.volts, 'V')}{'' if bound.is_own else ' by the profile'}"


def _under(case: CircuitCase, bound: Bound) -> tuple[str, ...]:
    """The finding about its source and loads of other circuits that have the same highest."""
    network = case.context.network
    nodes = network.nodes_of.get(case.circuit.id)
    sources = network.sources_at(list(network.way_up(nodes["bus"]))[-1]) if nodes is not None else ()
    return tuple(named("LV02", source, _of_highest(bound)) for source in sources[:1])


def _judge(case: CircuitCase, point: LoadPoint, bound: Bound) -> Iterator[Finding | NotJudged]:
    name, where, highest = point.load.tag, _where(case, point), bound.volts
    from_source, without, severity = (
        source_of(case.limits, bound),
        unused(bound),
        None if bound.is_own else Severity.WATCH,
    )
    under = _under(case, bound)
    read = [(round_, volts) for round_, volts in point.read if volts.value > 0]  # RD01 says the others
    if read:
        # the reading that says most, not the highest: a poor meter's may be higher and say nothing
        round_, volts = max(read, key=lambda item: probability_above(item[1].value, highest, item[1].u or 0.0))
        if against_limit(volts.value, highest, volts.u or 0.0, case.limits) is Verdict.FAILS:
            shown, limit = show_against(volts.value, highest, "V")
            why = f"{name} was read at {shown} in round {round_}, above {bound.whose} highest {limit}"
            yield load_above_highest.finding(
                case,
                where,
                why,
                numbers={"voltage": volts, "highest": Figure(highest, "V")},
                severity=severity,
                source=from_source,
                without=without,
                under=under,
                as_consequence=why,
            )
            return
    at = _at_highest(case.context, case.circuit.id, point.load.point) or point.gap
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
            case, where, why, numbers=numbers, severity=severity, source=from_source, without=without, under=under
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
            under=under,
        )


def _at_highest(context: Context, circuit_id: str, point: str) -> _AtHighest | str:
    """The voltages at a point with its source at the highest, or why they are not known; empty where nothing leads there."""
    network = context.network
    node = network.nodes_of.get(circuit_id, {}).get(point)
    if node is None:
        return ""
    way = list(network.way_up(node))
    if network.gap_highest[way[-1]]:
        return network.gap_highest[way[-1]]
    volts, source_v = float(network.highest.voltage_v[node]), float(network.held_highest_v[way[-1]])
    if volts != volts:
        return network.gap_of(node, highest=True) or "what arrives at the highest source voltage is not known"
    u = drop_u(context, way[:-1], "highest")
    return _AtHighest(source_v, Figure(volts, "V", u), network.gap_of(node, highest=True))


def _where(case: CircuitCase, point: LoadPoint) -> str:
    """The load's point; with the load's tag where others are there too, so that each finding has an id of its own."""
    alone = sum(other.load.point == point.load.point for other in case.loads) == 1
    return joined(point.load.point, "" if alone else point.load.tag)
