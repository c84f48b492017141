"""RC01: something without which the drop cannot be computed is not recorded."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, Severity
from rules.case import CircuitCase
from rules.network import GAP_NOTHING_FEEDS, GAP_SOURCE
from rules.rule import rule
from rules.runs import GAP_STRUCTURE
from rules.structure import structure_ohm

GAP_NO_RUN = "no run is recorded"
GAP_NO_LOAD = "no load is recorded"


def gaps_of(case: CircuitCase) -> list[tuple[str, str]]:
    """Place and text of everything that is missing from a circuit's record."""
    index, network = case.context.index, case.context.network
    gaps: list[tuple[str, str]] = []
    nodes = network.nodes_of.get(case.circuit.id)
    if nodes is None:
        gaps.append(("source", GAP_NOTHING_FEEDS.format(case.tag)))
    else:
        source = list(network.way_up(nodes["bus"]))[-1]
        if network.gap[source].startswith(GAP_SOURCE.partition("{}")[0]):
            gaps.append(("source", network.gap[source]))
    if not case.runs:
        gaps.append(("runs", GAP_NO_RUN))
    for run in case.runs:
        if run.one_way_length_m is None:
            gaps.append((run.name, f"the length of {run.name} is not known"))
        if not run.size:
            gaps.append((run.name, f"the size of {run.name} is not known"))
        if run.return_or_default == "structure" and isinstance(structure_ohm(case, run), str):
            gaps.append((run.name, GAP_STRUCTURE.format(run.name)))
    if not case.loads and not index.fed_by_circuit(case.circuit.id):
        gaps.append(("loads", GAP_NO_LOAD))
    for point in case.loads:
        if f"{point.load.tag} on {case.tag}" in network.unknown_loads:
            gaps.append((point.load.point, f"what {point.load.tag} draws is not known"))
    return gaps


@rule(
    id="RC01",
    title="Record incomplete",
    about="circuit",
    severity=Severity.NOTE,
    remedy="Find out what is missing on site: print on the sheath, a taped length, the load's plate; then record it.",
    caution="Opening an enclosure to read a cable exposes live parts: cover or isolate, and prove dead before touching. "
    "A circuit that cannot be computed has not passed anything.",
    source=Citation("ohmwalk, format of the site folder", clause="what a drop is computed from", status="our own rule"),
)
def record_incomplete(case: CircuitCase) -> Iterator[Finding]:
    """
    Length, size, load or source voltage is missing, so that the drop cannot be computed.

    **Finds**: a run whose length cell is empty: "the length of run 1 is not known".

    **Leaves alone**: an empty material (copper is taken), temperature (the site's ambient) or device (it has no
    figure of its own). A return through the structure whose resistance no
    reading gives leaves a circuit incomplete too, which NW04 says.
    """
    by_place: dict[str, list[str]] = {}
    structure = {GAP_STRUCTURE.format(run.name) for run in case.runs}  # NW04 says so
    for where, why in gaps_of(case):
        if why in structure:
            continue
        by_place.setdefault(where, []).append(why)
    for where, whys in by_place.items():
        yield record_incomplete.finding(case, where, "; ".join(whys), numbers={})
