"""SR01: a source is below what it should have at its terminals, so that what arrives is its doing and not the line's."""

from collections.abc import Iterator, Sequence

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import Weighted, probability_above, total
from rules.limits import Limits
from rules.record import Figure, Source
from rules.rule import DOUBTS_OF_READINGS, BoardCase, rule
from rules.terminals import REGULATED, AtTerminals, at_terminals, low_behind_device, surely_below
from rules.units import show

STAY = (
    "drops of its circuits are judged by their own currents and stay; what arrives at their ends is the source's doing"
)
"""The consequence that each of its findings has."""


@rule(
    id="SR01",
    title="Source sags or folds back",
    about="source",
    severity=Severity.WATCH,
    remedy="Read its terminals with little and with much load, and its current; compare with its plate, its setting and its input. Then "
    "take load off, or have it set or exchanged.",
    caution="A supply that folds back or restarts switches everything behind it, locks and alarms among it: ask before it is loaded or "
    "switched. A battery behind a rectifier that has failed discharges unseen: its voltage is the only sign.",
    source=Citation("source or line: no-load and loaded voltage at the source's terminals", status="common practice, no source"),
    limits=("supply", "decision", "readings", *DOUBTS_OF_READINGS),
)  # fmt: skip
def supply_sags(case: BoardCase) -> Iterator[Finding | NotJudged]:
    """
    A source has less at its terminals than it should. On its busbar, or at the ``bus`` of a circuit, it was read beyond
    doubt below the lowest that is recorded of it: soon. Or a rectifier, power supply or converter is more than 2 % below
    its working voltage, or falls by more than 2 % of it between two rounds of one circuit while the current rises: watch.
    Where the terminals were not read, the ``way`` of a circuit with twice what its device loses bounds them from above.
    Drops of its circuits are judged by their own currents and stay; loads behind it that were read below their lowest, and
    would not be if it had what it should, are told here (LV01).

    **Finds**: a power supply of 24 V with 22.10 V at its terminals at 9.8 A, of 10 A rating: it folds back. 24.1 V at 2 A
    and 22.9 V at 8 A at the bus of one circuit.

    **Leaves alone**: 23.9 V of 24.3 V, which is 1.6 %; a battery between its working voltage and its lowest, which
    discharges. Sources in parallel are judged as the busbar that they hold, and told once, at the first of them.
    """
    source, context = case.row, case.context
    if not isinstance(source, Source):
        return
    network = context.network
    shared = network.in_parallel(source)
    nodes = [
        node
        for node in network.led_by(source)
        # of a source in parallel the busbar is judged; by itself only what hangs on it alone
        if len(network.sources_at(node)) > 1 or not shared or network.hanging.circuits_at.get(node)
    ]
    for node in nodes:
        tags = _tags(network.sources_at(node))
        yield from _of_busbar(case, node, "terminals" if len(nodes) == 1 else f"terminals of {tags}")


def _tags(sources: Sequence[Source]) -> str:
    return " + ".join(source.tag for source in sources)


def _of_busbar(case: BoardCase, node: int, where: str) -> Iterator[Finding | NotJudged]:
    """What one source holds, or several in parallel."""
    context = case.context
    sources, limits = context.network.sources_at(node), context.limits
    tags = _tags(sources)
    its, theirs = ("its ", "") if len(sources) == 1 else ("the ", f" of {tags} in parallel")
    read = at_terminals(context, node)
    if (worst := low_behind_device(context, node)) is not None:
        limit = float(context.network.held_lowest_v[node])
        words = f"what its device may lose added, below {its}lowest {show(limit, 'V')}{theirs}: it sags, or the device loses it"
        yield _found(case, node, where, worst, words, Figure(limit, "V"), Severity.SOON)
        return
    if not read:
        below = context.network.hanging.circuits_below.get(node, ())
        if any(context.measured[id_].readings for id_ in below if id_ in context.measured):
            yield supply_sags.gap(case, where, f"the terminals of {tags} were not read")
        return
    lowest = float(context.network.held_lowest_v[node]) if not context.network.gap_lowest[node] else None
    if lowest is not None and (worst := surely_below(read, lowest, limits)) is not None:
        words = f"below {its}lowest {show(lowest, 'V')}{theirs}"
        yield _found(case, node, where, worst, words, Figure(lowest, "V"), Severity.SOON)
        return
    regulated = [one for one in sources if one.kind in REGULATED]
    if not regulated:
        return
    if all(one.working_voltage_v is None for one in sources):
        yield supply_sags.gap(case, where, f"the working voltage of {tags} is not recorded")
        return
    working, share = float(context.network.held_v[node]), limits["supply.regulation_share"]
    if (worst := surely_below(read, (1 - share) * working, limits)) is not None:
        words = (
            f"{show(1 - worst.voltage.value / working, '1', digits=2)} below {its}working {show(working, 'V')}{theirs}"
        )
        yield _found(case, node, where, worst, words, Figure(working, "V"), Severity.WATCH)
    elif (pair := _falls(read, share * working, limits)) is not None:
        yield _fallen(case, node, where, *pair)


def _falls(
    read: Sequence[AtTerminals], least_v: float, limits: Limits
) -> tuple[AtTerminals, AtTerminals, Figure] | None:
    """Two rounds at one place of which the one with more current has less voltage, by more than is allowed."""
    best: tuple[AtTerminals, AtTerminals, Figure] | None = None
    sure = limits["decision.beyond_doubt"]
    for light in read:
        for heavy in read:
            if light.place != heavy.place or not light.amps or not heavy.amps:
                continue
            volts, volts_u = total([*light.volts, *_less(heavy.volts)])
            amps, amps_u = total([*heavy.amps, *_less(light.amps)])
            if probability_above(volts, least_v, volts_u) < sure or probability_above(amps, 0.0, amps_u) < sure:
                continue
            if best is None or volts > best[2].value:
                best = light, heavy, Figure(volts, "V", volts_u)
    return best


def _less(terms: Sequence[Weighted]) -> list[Weighted]:
    return [Weighted(-term.weight, term.shown) for term in terms]


def _found(
    case: BoardCase, node: int, where: str, worst: AtTerminals, against: str, limit: Figure, severity: Severity
) -> Finding:
    current = worst.current
    at = f" at {show(current.value, 'A', current.u)}" if current is not None and worst.whole else ""
    return supply_sags.finding(
        case,
        where,
        f"{show(worst.voltage.value, 'V', worst.voltage.u)} at the {worst.place} in round {worst.round}{at}, {against}"
        f"{_overloaded(case, node, worst)}",
        numbers={"voltage": worst.voltage, "limit": limit} | ({"current": current} if current is not None else {}),
        severity=severity,
        source=f"{supply_sags.source}; {case.context.limits.citation('supply')}",
        consequences=(STAY,),
    )


def _fallen(case: BoardCase, node: int, where: str, light: AtTerminals, heavy: AtTerminals, fall: Figure) -> Finding:
    low, high = light.current, heavy.current
    assert low is not None
    assert high is not None
    source_ohm = fall.value / (high.value - low.value)
    return supply_sags.finding(
        case,
        where,
        f"the {light.place} falls by {show(fall.value, 'V', fall.u)}, from {show(light.voltage.value, 'V')} in round {light.round} to "
        f"{show(heavy.voltage.value, 'V')} in round {heavy.round}, while the current rises from {show(low.value, 'A', low.u)} to "
        f"{show(high.value, 'A', high.u)}: as {show(source_ohm, 'ohm', digits=2)} in the source would, if nothing else changed",
        numbers={"fall": fall, "current": high, "lighter current": low},
        source=f"{supply_sags.source}; {case.context.limits.citation('supply')}",
        consequences=(STAY,),
    )


def _overloaded(case: BoardCase, node: int, worst: AtTerminals) -> str:
    """That it is loaded to its rating or beyond, where its whole current was read."""
    current = worst.current
    ratings = [source.rated_current_a for source in case.context.network.sources_at(node)]
    known = [amps for amps in ratings if amps is not None]
    if current is None or not worst.whole or not known or len(known) < len(ratings):
        return ""
    near = current.value >= (1 - case.context.limits["supply.rating_margin"]) * sum(known)
    return f": it is loaded to its rating of {show(sum(known), 'A')}, and folds back" if near else ""
