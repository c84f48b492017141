"""NW01: a load cannot be supplied at all; the voltage collapses."""

from collections.abc import Iterator, Sequence

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase, LoadPoint
from rules.loads import kind_of
from rules.record import Figure
from rules.rule import rule
from rules.units import show


@rule(
    id="NW01",
    title="Load cannot be supplied",
    about="circuit",
    severity=Severity.SOON,
    remedy="Check length, size and power in the record first; then enlarge the conductors of the path or move load off it.",
    caution="Electronic loads behind such a path start, fail and start again, and draw the largest current just before they fail. "
    "Isolate and prove dead before touching a termination; local code and a licensed person decide. Computed with healthy "
    "joints; what could be had is an upper bound, not a rating.",
    source=Citation("largest power through a resistance, Vs² / 4R", status="computed"),
    limits=("temperature",),
)
def cannot_be_supplied(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    No current gives the loads what they ask for: the more they draw, the less arrives.

    **Finds**: 24 V, 1.5 Ω and a load of 60 W with the battery at 18.9 V: at most 18.9² / (4 × 1.5) = 59.5 W could be had.

    **Leaves alone**: the same at 19.0 V, where 10.0 V arrive (LV01 judges that). Loads on other paths are computed
    as if what cannot be supplied were off. A path, a load or a lowest voltage of the source that is not known is not judged.
    """
    for lowest in (False, True):
        lost = [point for point in case.loads if (point.collapsed_lowest if lowest else point.collapsed)]
        if lost and not (lowest and _source_gap(case)):
            yield from _tell(case, lost, lowest)
            return
    unknown = next((point for point in case.loads if _may_collapse(point) and (point.gap or point.lowest_gap)), None)
    if unknown is not None:
        yield cannot_be_supplied.gap(case, unknown.load.point, unknown.gap or unknown.lowest_gap)


def _may_collapse(point: LoadPoint) -> bool:
    """A constant resistance draws less where less arrives: it can always be supplied."""
    return kind_of(point.load) != "constant resistance"


def _tell(case: CircuitCase, lost: Sequence[LoadPoint], lowest: bool) -> Iterator[Finding]:
    network = case.context.network
    at = network.nodes_of[case.circuit.id][lost[0].load.point]
    found = network.collapse_of(at, lowest)
    if found is None:
        return
    more = f" and {len(lost) - 1} more" if len(lost) > 1 else ""
    when = f"with the source at {show(lost[0].source_lowest_v, 'V')} and hot conductors" if lowest else "at design"
    asked: dict[str, Figure] = {}
    words = []
    for value, most, unit in (
        (found.asked_w, found.could_be_had_w, "W"),
        (found.asked_a, found.could_be_had_a, "A"),
    ):
        if value > 0:
            asked |= {f"asked {unit}": Figure(value, unit), f"at most {unit}": Figure(most, unit)}
            words.append(f"at most {show(most, unit)} of the {show(value, unit)}")
    place = network.place_of(found.node)
    yield cannot_be_supplied.finding(
        case,
        lost[0].load.point,
        f"{lost[0].load.tag}{more} cannot be supplied {when}: through {place} {' and '.join(words)} that hang on it could be had",
        numbers=asked,
    )


def _source_gap(case: CircuitCase) -> bool:
    """Whether the lowest voltage of the source itself is not known: then nothing can be said of that state."""
    network = case.context.network
    return bool(network.gap_lowest[list(network.way_up(network.nodes_of[case.circuit.id]["bus"]))[-1]])
