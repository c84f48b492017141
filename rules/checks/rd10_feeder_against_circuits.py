"""RD10: what feeds a board does not carry what its circuits draw."""

from collections.abc import Iterator, Mapping

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import Weighted
from rules.closure import Terms, added_up
from rules.context import Context
from rules.errors import MissingData
from rules.meters import worth
from rules.moments import seconds_between
from rules.record import Board, Circuit, Reading
from rules.rounds import Round, current_at, judged
from rules.rule import DOUBTS_OF_READINGS, BoardCase, rule
from rules.taken import some
from rules.units import show_against


@rule(
    id="RD10",
    title="Board's feed against the sum of its circuits",
    about="board",
    severity=Severity.WATCH,
    remedy="Read feed and circuits again as one round, the clamp zeroed; then look for what is on the board and not in the record.",
    caution="A circuit that is not recorded stays live when the recorded ones are off. Prove dead at the place of work, not by the list.",
    source=Citation("Kirchhoff's first law; JCGM 100, 5.2 for the doubt of the sum", status="textbook, no edition"),
    limits=("decision", "closure", "load_share", *DOUBTS_OF_READINGS),
)
def feeder_against_circuits(case: BoardCase) -> Iterator[Finding | NotJudged]:
    """
    The current into a board differs from the sum of its circuits' currents. Those of rounds of one name and visit are
    compared, into the board read on its busbar, else in the circuits that feed it; the difference lies beyond doubt and the
    share that a load may move meanwhile. With circuits that were
    not read, or more than the board on its feed, the sum may be less, not more.

    **Finds**: 12.0 A into a board whose two circuits draw 5.0 A and 4.0 A.

    **Leaves alone**: 12.0 A into a board of three circuits of which two were read, 5.0 A and 4.0 A;
    currents read further apart than a round may last, where they say when, which are not judged.
    """
    context = case.context
    board = case.row
    if not isinstance(board, Board):
        return
    circuits = context.index.circuits_of(board.id)
    for (visit, name), leaving in _rounds(circuits, context).items():
        feed = _into(board, visit, name, context)
        if feed is None:
            continue
        arriving, alone = feed
        whole = alone and len(leaving) == len(circuits)
        missing = [circuit.tag for circuit in circuits if circuit.tag not in leaving]
        unclosed = added_up(
            board.tag,
            f"into {board.tag} by {some(arriving)}",
            arriving,
            f"out of it by {some(leaving)}{f', {some(missing)} not read' if missing else ''}",
            leaving,
            whole,
            context.limits,
        )
        if unclosed is None:
            continue
        seconds = seconds_between(_currents(board, circuits, visit, name, context))
        most = context.limits["closure.round_minutes"]
        if seconds is not None and seconds > most * 60:
            apart, limit = show_against(seconds / 60, most, "min")
            why = f"its currents were read over {apart}, more than {limit}: not one load state"
            yield feeder_against_circuits.gap(case, f"{board.tag}, round {name}", why)
        else:
            yield feeder_against_circuits.finding(
                case,
                f"round {name}",
                unclosed.words,
                numbers={"arriving": unclosed.first_sum, "leaving": unclosed.second_sum, "gap": unclosed.gap},
                source=f"{feeder_against_circuits.source}; {context.limits.citation('closure')}",
            )


def _currents(
    board: Board, circuits: tuple[Circuit, ...], visit: str, name: str, context: Context
) -> Iterator[Reading]:
    """The currents that were read in a round on a board, on what feeds it and on its circuits."""
    index = context.index
    feeds = [index.circuits[feed.id] for feed in board.fed_by if feed.table == "circuits" and feed.id in index.circuits]
    for place in (board, *feeds, *circuits):
        for row in judged(index.readings_of(place.id), index):
            if row.quantity == "current" and not row.is_unloaded and (row.visit_or_default, row.round) == (visit, name):
                yield row


def _rounds(circuits: tuple[Circuit, ...], context: Context) -> dict[tuple[str, str], dict[str, Terms]]:
    """By visit and round, what each circuit draws that was read in it."""
    found: dict[tuple[str, str], dict[str, Terms]] = {}
    for circuit in circuits:
        side = context.measured.get(circuit.id)
        for this in side.rounds if side is not None else ():
            terms = _drawn(circuit, this, context)
            if side is not None and terms is not None:
                found.setdefault((side.visit, this.name), {})[circuit.tag] = terms
    return found


def _drawn(circuit: Circuit, this: Round, context: Context) -> Terms | None:
    """What a circuit takes from its board: read at ``way``, else in all runs that begin there; ``None`` where it was not."""
    tree = context.measured[circuit.id].tree
    if tree.shared:  # a clamp on the return sees what other circuits draw too
        return None
    if "way" in this.amps:
        return this.amps["way"]
    first = [end for end, run in tree.ends.items() if run.from_point == "way"]
    if not first or any(end not in this.amps for end in first):
        return None
    return tuple(term for end in first for term in this.amps[end])


def _into(board: Board, visit: str, name: str, context: Context) -> tuple[Mapping[str, Terms], bool] | None:
    """What goes into a board in a round, and whether to nothing else; ``None`` where it was not read."""
    index = context.index
    on_bus = [
        row
        for row in judged(index.readings_of(board.id), index)
        if row.quantity == "current" and not row.is_unloaded and (row.visit_or_default, row.round) == (visit, name)
    ]
    if on_bus:
        return {
            "its busbar": tuple(Weighted(1 / len(on_bus), worth(row, index, context.limits).shown) for row in on_bus)
        }, True
    feeds: dict[str, Terms] = {}
    alone = True
    for feed in board.fed_by:
        side = context.measured.get(feed.id) if feed.table == "circuits" else None
        this = next((each for each in side.rounds if each.name == name), None) if side is not None else None
        if side is None or this is None or side.visit != visit or side.tree.meshed or side.tree.shared:
            return None
        point = feed.point or index.last_point(feed.id)
        try:
            current = current_at(point, this, side.tree, context.limits)
        except MissingData:
            return None
        if current.shares:  # not read there: the loads' share would be compared with itself
            return None
        feeds[index.circuits[feed.id].tag] = current.terms
        others = [load for load in index.loads_of(feed.id) if load.point == point]
        alone = (
            alone
            and not others
            and len([row for row in index.fed_by_circuit(feed.id) if _is_at(row, feed.id, point, context)]) == 1
        )
    return (feeds, alone) if feeds else None


def _is_at(row: object, circuit_id: str, point: str, context: Context) -> bool:
    """Whether a board or converter hangs on a point of a circuit."""
    feeds = getattr(row, "fed_by", None) or (getattr(row, "fed_from", None),)
    return any(
        feed is not None and feed.id == circuit_id and (feed.point or context.index.last_point(circuit_id)) == point
        for feed in feeds
    )
