"""CP01: a run carries more than its conductors may, as they are installed."""

from collections.abc import Iterator

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase
from rules.decision import Verdict, against_limit
from rules.errors import RulesError
from rules.loading import Bounds, bounds_of, current_of, read_in, together
from rules.protection import Overload, is_above, is_past, is_unprotected, overload_of
from rules.record import Run
from rules.rule import DOUBTS_OF_READINGS, rule
from rules.units import show, show_against


@rule(
    id="CP01",
    title="Current above the capacity of the conductors",
    about="circuit",
    severity=Severity.SOON,
    remedy="Compare size, insulation, method and grouping with what is installed; then take load off, enlarge the run or part the bundle.",
    caution="Insulation that is held above its temperature ages unseen and may fail when it is next moved: do not bend or dress a hot "
    "cable live. The table is for steady current in the ambient stated; local code and a licensed person decide.",
    source=Citation("IEC 60364-5-52", "2009", "523.1: current not above the corrected capacity", "from-memory"),
    also=(Citation("IEC 60364-4-43", "2008", "433.1: design current not above capacity", "from-memory"),),
    limits=("capacity", "decision", "overload", "temperature", "cold", *DOUBTS_OF_READINGS),
)
def current_above_capacity(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    More flows in a run than its conductors may carry as installed. It flows with every load on, at the source voltage that
    makes it largest, or a clamp showed it; they may carry the printed figure times the factors for ambient and
    grouping, and no more than the terminations allow.

    What the record does not say counts as the lowest (method A2, PVC). A current between that and the most favourable case
    is not judged: find out the method. Immediate where a clamp showed more than 1.45 times the most that it may carry.

    **Finds**: 20 A in 1.5 mm² copper, PVC, method C, 30 °C: 19.5 A.

    **Leaves alone**: 19.5 A in the same, which is its capacity; a short peak; the temperature that a run settles at.
    """
    gaps: list[tuple[str, str]] = []
    for run in case.runs:
        if run.size:  # else RC01 says so
            yield from _of_run(case, run, gaps)
    for where, why in together(gaps):
        yield current_above_capacity.gap(case, where, why)


def _of_run(case: CircuitCase, run: Run, gaps: list[tuple[str, str]]) -> Iterator[Finding]:
    amps, read = current_of(run, case), read_in(run, case)
    if amps is None and read is None:
        gaps.append((run.name, "what flows in it at design is not known"))
        return
    try:
        bounds = bounds_of(run, case)
    except RulesError as error:
        gaps.append((run.name, str(error)))
        return
    found = overload_of(case, run, bounds)
    if found is not None:
        yield _found(case, run, bounds, found)
    elif (
        read is not None and against_limit(read[1].value, bounds.most_a, read[1].u or 0.0, case.limits) is Verdict.OPEN
    ):
        said = show(read[1].value, "A", read[1].u)
        gaps.append((run.name, f"not settled: {said} read in round {read[0]} against {bounds.words}"))
    elif amps is not None and is_above(amps, bounds.least_a):
        gaps.append((run.name, f"{show(amps, 'A', digits=3)} with every load on against {bounds.words}"))


def _found(case: CircuitCase, run: Run, bounds: Bounds, found: Overload) -> Finding:
    said, _ = show_against(found.current.value, bounds.most_a, "A")
    how = f"were read in round {found.round}" if found.round else "with every load on"
    urgent = found.round and is_past(found.current, case.limits["overload.immediate_factor"] * bounds.most_a, case)
    return current_above_capacity.finding(
        case,
        run.name,
        f"{said} {how} in {run.name}; as installed it may carry {bounds.words}",
        numbers={"current": found.current} | bounds.numbers,
        severity=Severity.IMMEDIATE if urgent else None,
        source=f"{current_above_capacity.source}; {bounds.source}",
        consequences=tuple(_consequences(case, run, bounds)),
    )


def _consequences(case: CircuitCase, run: Run, bounds: Bounds) -> Iterator[str]:
    limit_c, rated = bounds.capacity.limit_c, case.circuit.rated_current_a
    yield f"its conductors are held above the {limit_c:g} °C that their insulation or terminals stand"
    if rated is not None and is_unprotected(case, run, bounds):
        yield f"nor does the device of {show(rated, 'A')} protect it: its rating is above that too"
