"""NW03: a return that several circuits share carries more than the circuit at hand lets one think."""

import math
from collections.abc import Iterator
from dataclasses import dataclass

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.calc.doubt import Weighted, probability_above, total
from rules.case import CircuitCase
from rules.errors import MissingData, RulesError
from rules.loading import Bounds, as_run, bounds_of
from rules.protection import sources_give_a
from rules.record import Figure, Run
from rules.rounds import Round, current_at
from rules.routes import together
from rules.rule import DOUBTS_OF_COMPUTED, DOUBTS_OF_READINGS, rule
from rules.runs import SHARED, Carrying, SharedReturn, record_variance
from rules.units import show, show_against

PART = 0.5
"""Share of its design current below which a return was not loaded as it will be. Our own default."""


@rule(
    id="NW03",
    title="Shared return carries more than its own circuit",
    about="circuit",
    severity=Severity.SOON,
    remedy="Read the return's current with every circuit that shares it on; then give it the size that their sum asks for, or part it.",
    caution="A return that is opened while other circuits are on has their voltage across the gap, though this circuit's device is open: "
    "isolate every circuit that shares it. No device is in it, and none protects it unless their ratings together do.",
    source=Citation("V = R Σ I of all circuits on the return", status="computed"),
    also=(Citation("IEC 60364-4-43", "2008", "431.2: protection of the return conductor", "from-memory"),),
    limits=("capacity", "decision", "temperature", "cold", *DOUBTS_OF_COMPUTED, *DOUBTS_OF_READINGS),
)
def shared_return(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    A return that circuits share carries more than one of them lets one think. Told once, at the circuit that stands first: soon where it is
    more at design than the return may carry as installed; for watch where the ratings of their devices together are, so
    that nothing protects it. Told of each circuit, as a note: a drop along the return that its own current does not
    explain and the neighbours' do, which is no bad joint; and a reading taken while the neighbours drew less than half of
    their design, which passes wrongly.

    **Finds**: six circuits of 4 A on one return of 1.5 mm², PVC, method C: 24 A, where it may carry 19.5 A. A return of
    2.5 mm² and 40 m that loses 3.3 V while the circuit's own 2 A explain 0.6 V.

    **Leaves alone**: a return that may carry all that its sources can give for good;
    three dampers of 0.8 A behind devices of 4 A on a return of 2.5 mm², all read while on.
    """
    for run in case.runs:
        of = case.context.figures.returns.get(run.return_conductor.removeprefix(SHARED))
        if of is None or not run.return_conductor.startswith(SHARED):
            continue
        if of.runs[0].id == run.id:
            yield from _of_return(case, of)
        for this in case.rounds:
            yield from _of_round(case, run, of, this)


def _of_return(case: CircuitCase, of: SharedReturn) -> Iterator[Finding | NotJudged]:
    """By the record: what it carries at design, and what the devices would let through."""
    where = f"return {of.name}"
    carried = _largest_a(case, of)
    try:
        bounds = bounds_of(as_run(of), case)
    except RulesError as error:
        yield shared_return.gap(case, where, str(error))
        return
    if carried is None:
        yield shared_return.gap(case, where, "what flows in it at design is not known")
        return
    numbers = {"current": Figure(carried, "A")} | bounds.numbers
    circuits = [case.context.index.circuits[run.circuit_id] for run in of.runs]
    tags = ", ".join(dict.fromkeys(circuit.tag for circuit in circuits))
    rated = [circuit.rated_current_a for circuit in circuits]
    known = [amps for amps in rated if amps is not None]
    if carried > bounds.most_a:
        shown, _ = show_against(carried, bounds.most_a, "A")
        yield _capacity(case, where, f"{shown} of {tags} together flow in it", bounds, numbers, Severity.SOON)
    elif carried > bounds.least_a:
        yield shared_return.gap(case, where, f"{show(carried, 'A', digits=3)} against {bounds.words}")
    elif sources_give_a(case) <= bounds.least_a:
        return
    elif len(known) < len(rated):
        yield shared_return.gap(case, where, "the rating of a device before it is not recorded")
    elif sum(known) > bounds.most_a:
        shown, _ = show_against(sum(known), bounds.most_a, "A")
        words = f"the devices of {tags} let {shown} into it together, and none of them protects it"
        yield _capacity(
            case, where, words, bounds, numbers | {"ratings together": Figure(sum(known), "A")}, Severity.WATCH
        )


def _capacity(
    case: CircuitCase, where: str, words: str, bounds: Bounds, numbers: dict[str, Figure], severity: Severity
) -> Finding:
    return shared_return.finding(
        case,
        where,
        f"{words}; as installed it may carry {bounds.words}",
        numbers=numbers,
        severity=severity,
        source=f"{shared_return.source}; {bounds.source}",
    )


def _largest_a(case: CircuitCase, of: SharedReturn) -> float | None:
    """The most in the return with every load on, at the voltage that makes it largest. [A]"""
    network = case.context.network
    node = network.node_at_run_end.get(of.runs[0].id)
    if node is None or any(
        network.design_current_a(network.node_at_run_end[run.id]) is None
        for run in of.runs
        if run.id in network.node_at_run_end
    ):
        return None
    amps = [abs(float(solved.back_a[node])) for solved in (network.design, network.lowest, network.highest)]
    return max((a for a in amps if not math.isnan(a)), default=None)


@dataclass(frozen=True, slots=True)
class _Back:
    """What flows back in a round."""

    own: Figure
    all: Figure
    terms: tuple[Weighted, ...]


def _of_round(case: CircuitCase, run: Run, of: SharedReturn, this: Round) -> Iterator[Finding | NotJudged]:
    """By readings: the drop along the return, and whether its neighbours were on."""
    branch = next(branch for branch, other in case.tree.ends.items() if other.id == run.id)
    read = [
        row
        for row in this.readings
        if row.quantity == "drop" and row.leg == case.return_leg and (row.at, row.to) == (run.from_point, branch)
    ]
    volts_read = branch in this.volts or any(pair[1] == branch for pair in this.direct)
    if not read and not volts_read:
        return
    where = f"return {of.name}, {run.name}, round {this.name}"
    try:
        back = _back(case, run, branch, this)
    except MissingData as error:
        if read:  # of voltages VD02 says so
            yield shared_return.gap(case, where, str(error))
        return
    if read and not of.figures.gap:
        yield from _explained(case, where, of, back, [Weighted(1 / len(read), this.shown[row.id]) for row in read])
    design = _largest_a(case, of)
    if design is not None and abs(back.all.value) < PART * design:
        yield shared_return.finding(
            case,
            where,
            f"it carried {show(back.all.value, 'A', back.all.u)} while {run.name} was read; with every circuit that shares it on it "
            f"carries {show(design, 'A', digits=3)}, and loses {show(of.figures.loop_ohm * design, 'V', digits=3)}: the reading "
            "says nothing of that",
            numbers={"current": back.all, "own current": back.own, "at design": Figure(design, "A")},
            severity=Severity.NOTE,
        )


def _back(case: CircuitCase, run: Run, branch: str, this: Round) -> _Back:
    own = current_at(branch, this, case.tree, case.limits)
    every = together([own, *case.tree.shared[run.id].others(this.name)])
    own_a, own_u = total(own.terms)
    all_a, all_u = total(every.terms)
    shares_u = [share for _, share in every.shares]
    return _Back(Figure(own_a, "A", own_u), Figure(all_a, "A", math.hypot(all_u, *shares_u)), every.terms)


def _explained(
    case: CircuitCase, where: str, of: SharedReturn, back: _Back, terms: list[Weighted]
) -> Iterator[Finding]:
    """A drop beyond what the own current explains, and within what all of them do."""
    volts, volts_u = total(terms)
    ohm = of.figures.loop_ohm
    record_u = math.sqrt(record_variance([Carrying(of.figures, back.all.value)], case.limits))
    u = math.hypot(volts_u, record_u, ohm * (back.all.u or 0.0))
    sure = case.limits["decision.beyond_doubt"]
    sense = math.copysign(1.0, back.all.value)
    beyond_own = probability_above(sense * (volts - ohm * back.own.value), 0.0, u) >= sure
    beyond_all = probability_above(sense * (volts - ohm * back.all.value), 0.0, u) >= sure
    if beyond_own and not beyond_all:
        yield shared_return.finding(
            case,
            where,
            f"{show(volts, 'V', volts_u)} were lost along it; its own {show(back.own.value, 'A', back.own.u)} explain "
            f"{show(ohm * back.own.value, 'V', digits=3)}, the {show(back.all.value, 'A', back.all.u)} of all that share it "
            f"{show(ohm * back.all.value, 'V', digits=3)}: the neighbours' current, no bad joint",
            numbers={"drop": Figure(volts, "V", volts_u), "own current": back.own, "current": back.all},
            severity=Severity.NOTE,
        )
