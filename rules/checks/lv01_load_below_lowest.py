"""LV01: a load gets less than its lowest voltage."""

from collections.abc import Iterator
from dataclasses import replace

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import probability_above
from rules.case import CircuitCase, LoadPoint
from rules.decision import Verdict, against_limit
from rules.impossible import dead_points
from rules.load_window import Bound, lowest_of, source_of, unused
from rules.margins import margins_of
from rules.places import joined
from rules.record import Figure
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, named, rule
from rules.terminals import below_its_lowest, lacking_v
from rules.units import show, show_against

SOURCE_FIRST = "See to its source first; then read the load again, and find what the path loses if it is still too low."
MOST_NAMED = 3
"""Further loads that a finding by the profile names."""


@rule(
    id="LV01",
    title="Load below its lowest voltage",
    about="circuit",
    severity=Severity.SOON,
    remedy="Confirm the load's lowest voltage on its plate; then find what the path loses, and enlarge or repair it.",
    caution="A load that drops out when the battery is low fails when it is needed: treat door release, alarm, trip and life "
    "safety first, with the duty holder's permission. Computed with healthy joints: what readings show may be worse.",
    source=Citation("the load maker's lowest voltage", status="common practice, no source"),
    limits=("decision", "load_window", "readings", "temperature", *DOUBTS_OF_COMPUTED, *DOUBTS_OF_READINGS),
    under=("VD01", "VD03", "SR01"),
)
def load_below_lowest(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A load was read below its lowest voltage, or by the record falls below it at the lowest source voltage.

    **Finds**: 48 V battery down to 43.2 V, 0.20 Ω of path, a 600 W constant-power load with a lowest of 40.5 V: 40.2 V.
    Severity is immediate where a life-safety or trip-or-close load was read below its lowest. A load that records none is
    held against the lowest of its trade's profile, where that states one: for watch, or soon where such a load was read
    below it, one finding for a circuit's loads. By the record it is a consequence where its path loses more than is allowed (VD01, VD03);
    as read, where it would have enough if its source had what it should (SR01). A life-safety or trip-or-close load is always
    a finding of its own.

    **Leaves alone**: the same load of 500 W: 40.7 V. A voltage within its doubt of the limit is not judged, nor a load
    that cannot be supplied at all (NW01).
    """
    bounds = [(point, lowest_of(point.load, case.nominal_v, case.limits)) for point in case.loads]
    unknown = [point.load.tag for point, bound in bounds if bound is None]
    if unknown:
        more = f" and of {len(unknown) - 1} more" if len(unknown) > 1 else ""
        yield load_below_lowest.gap(case, "", f"the lowest voltage of “{unknown[0]}”{more} is not known")
    of_trade: dict[tuple[object, ...], list[tuple[str, Finding]]] = {}
    for point, bound in bounds:
        for said in _judge(case, point, bound) if bound is not None else ():
            if isinstance(said, Finding) and bound is not None and not bound.is_own:
                kind = said.severity, said.under, "source" in said.numbers
                of_trade.setdefault(kind, []).append((point.load.tag, said))
            else:
                yield said
    for alike in of_trade.values():
        yield _together(alike)


def _together(alike: list[tuple[str, Finding]]) -> Finding:
    """One finding for loads of a circuit that are below what the profile states of their trade: at the lowest of them."""
    first = min((finding for _, finding in alike), key=lambda finding: finding.numbers["voltage"].value)
    others = [(tag, finding.numbers["voltage"]) for tag, finding in alike if finding is not first]
    if not others:
        return first
    told = [f"{tag} with {show(volts.value, 'V', volts.u)}" for tag, volts in others[:MOST_NAMED]]
    more = f" and {len(others) - MOST_NAMED} more" if len(others) > MOST_NAMED else ""
    also = f"; below it too: {', '.join(told)}{more}"
    return replace(first, why=first.why + also, as_consequence=(first.as_consequence or first.why) + also)


def _judge(case: CircuitCase, point: LoadPoint, bound: Bound) -> Iterator[Finding | NotJudged]:
    name, lowest = point.load.tag, bound.volts
    source, without_groups = source_of(case.limits, bound), unused(bound)
    without = {
        (this.name, dead)
        for this in case.rounds
        for dead, _ in dead_points(this, case.tree, case.nominal_v or 0.0, case.limits)
    }
    read = [
        (name_, volts)
        for name_, volts in point.read
        if volts.value > 0 and (name_, point.load.point) not in without  # RD04 and RD01 say so
    ]
    if read:

        def below(item: tuple[str, Figure]) -> tuple[float, float]:
            return probability_above(-item[1].value, -lowest, item[1].u or 0.0), -item[1].value

        # the reading that says most, not the lowest: a poor meter's may be lower and say nothing
        round_, volts = max(read, key=below)
        if against_limit(volts.value, lowest, volts.u or 0.0, case.limits, above_is_bad=False) is Verdict.FAILS:
            shown, limit = show_against(volts.value, lowest, "V")
            vital = _is_vital(point)
            why = f"{name} was read at {shown} in round {round_}, below {bound.whose} lowest {limit}"
            of_source, by_source = _source_words(case), tuple(_by_its_source(case, point, volts, lowest))
            yield load_below_lowest.finding(
                case,
                _where(case, point),
                f"{why}{of_source}",
                numbers={"voltage": volts, "lowest": Figure(lowest, "V")},
                severity=_severity(bound, read=True, vital=vital),
                source=source,
                without=without_groups,
                consequences=tuple(_dip(case, point)),
                remedy=SOURCE_FIRST if of_source and by_source else None,
                under=by_source,
                as_consequence=why,
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
            _where(case, point),
            f"{name} gets {'at most ' if point.lowest_gap else ''}{shown} with the source at "
            f"{show(point.source_lowest_v, 'V')} and hot conductors, as recorded; {bound.whose} lowest is {limit}",
            numbers={"voltage": volts, "lowest": Figure(lowest, "V"), "source": Figure(point.source_lowest_v, "V")},
            severity=_severity(bound, read=False, vital=False),
            source=source,
            without=without_groups,
            consequences=tuple(_dip(case, point)),
            under=tuple(_by_its_path(case, point)),
        )
    elif point.lowest_gap:
        yield load_below_lowest.gap(case, point.load.point, point.lowest_gap)
    elif verdict is Verdict.OPEN:
        why = f"not settled: {name} gets {show(volts.value, 'V', volts.u)} against {bound.whose} lowest {show(lowest, 'V')}"
        yield load_below_lowest.gap(case, point.load.point, why)


def _source_words(case: CircuitCase) -> str:
    """That the source itself was read below its lowest, which then is the cause."""
    nodes = case.context.network.nodes_of.get(case.circuit.id)
    low = below_its_lowest(case.context, _source(case)) if nodes is not None else None
    if low is None:
        return ""
    return f"; its source has {show(low.voltage.value, 'V', low.voltage.u)} at the {low.place}, below its own lowest (SR01)"


def _by_its_source(case: CircuitCase, point: LoadPoint, volts: Figure, lowest: float) -> Iterator[str]:
    """A source by whose fault it is: the load would have enough if it had what it should, whatever the path loses."""
    network, nodes = case.context.network, case.context.network.nodes_of.get(case.circuit.id)
    if nodes is None or _is_vital(point):
        return
    node = _source(case)
    lacked_v = lacking_v(case.context, node, case.circuit.id)
    if volts.value + lacked_v >= lowest:
        yield named("SR01", network.sources_at(node)[0], "terminals")


def _by_its_path(case: CircuitCase, point: LoadPoint) -> Iterator[str]:
    """A path that loses more than is allowed to this load, by the record too: behind its board, or from the source on."""
    if _is_vital(point):
        return
    allowed_v = case.allowed_drop_percent / 100 * (case.nominal_v or 0.0)
    if against_limit(point.drop_v, allowed_v, point.drop_u, case.limits) is Verdict.FAILS:
        yield named("VD01", case)
    yield named("VD03", case, point.load.point)


def _is_vital(point: LoadPoint) -> bool:
    """What people's safety hangs on stays a finding of its own."""
    return point.load.function_or_default != "ordinary"


def _severity(bound: Bound, *, read: bool, vital: bool) -> Severity:
    """What a profile says of equipment in general is milder than what this load's maker says."""
    if not bound.is_own:
        return Severity.SOON if vital else Severity.WATCH
    return Severity.IMMEDIATE if read and vital else Severity.SOON


def _dip(case: CircuitCase, point: LoadPoint) -> Iterator[str]:
    """What is left at the load's peak current, by the record."""
    peak = next((margin.peak for margin in margins_of(case) if margin.load is point.load), None)
    if peak is not None:
        lowest = peak.design_v if peak.lowest_v is None else peak.lowest_v
        dips = f"it dips to {show(lowest, 'V', digits=3)}" if lowest > 0 else "the path cannot carry it"
        yield f"at its peak of {show(peak.current_a, 'A')} {dips}, as recorded"


def _where(case: CircuitCase, point: LoadPoint) -> str:
    """The load's point; with the load's tag where others are there too, so that each finding has an id of its own."""
    alone = sum(other.load.point == point.load.point for other in case.loads) == 1
    return joined(point.load.point, "" if alone else point.load.tag)


def _source(case: CircuitCase) -> int:
    network = case.context.network
    return list(network.way_up(network.nodes_of[case.circuit.id]["bus"]))[-1]


def _source_gap(case: CircuitCase) -> bool:
    """Whether the lowest voltage of the source itself is not known: then nothing is an upper bound."""
    return bool(case.context.network.gap_lowest[_source(case)])
