"""CP02: the protective device lets more through for good than the conductors behind it may carry."""

from collections.abc import Iterator
from dataclasses import replace

from rules.assessment import Citation, Finding, NotJudged, Severity
from rules.case import CircuitCase
from rules.errors import MissingData, RulesError
from rules.loading import Bounds, bounds_of, together
from rules.protection import largest_device_a, overload_of, sources_give_a
from rules.record import Figure, Run
from rules.rule import rule
from rules.units import show_against


@rule(
    id="CP02",
    title="Device rating above the capacity of the conductors",
    about="circuit",
    severity=Severity.SOON,
    remedy="Compare the rating on the device and the conductors' size with the record; then fit a device that protects the thinnest run, "
    "or enlarge the run.",
    caution="Until then an overload heats the conductors and nothing opens. A smaller device may not carry the load's start: rating and "
    "discrimination are decided under local code by a licensed person. Change a device only isolated and proved dead.",
    source=Citation("IEC 60364-4-43", "2008", "433.1: rated current not above capacity", "from-memory"),
    also=(
        Citation("NFPA 70", "2023", "240.4(B): the next standard rating up to 800 A", "from-memory"),
        Citation("NFPA 70", "2023", "240.4(D): small conductors", "from-memory"),
    ),
    limits=("capacity",),
)
def device_above_capacity(case: CircuitCase) -> Iterator[Finding | NotJudged]:
    """
    The rating of the circuit's device is above what a run behind it may carry as installed. For AWG and kcmil sizes the
    next standard rating above the ampacity is allowed up to 800 A, and small conductors have a largest device of their own:
    15 A for 14 AWG copper, 20 A for 12 AWG, 30 A for 10 AWG.

    **Finds**: a 20 A breaker before 1.5 mm² copper, PVC, method C, 30 °C: 19.5 A. A 20 A fuse before 14 AWG copper.

    Copper-clad aluminium is held against copper of its size, which carries more.

    **Leaves alone**: a 16 A breaker before the same; a 60 A fuse before 6 AWG of 55 A; a circuit whose sources cannot
    give more than the capacity; a run that is loaded above its capacity, where CP01 tells of the device too. Where the
    rating lies between the capacity with what is not recorded at its lowest and at its most favourable it is not judged.
    That a gG fuse of the rating may need 1.6 times it to open is left to the standard.
    """
    circuit = case.circuit
    if circuit.device == "none":
        if case.runs:
            yield device_above_capacity.gap(
                case, "", "no device of its own: what protects its conductors is not judged"
            )
        return
    if circuit.rated_current_a is None:
        raise MissingData("the rating of the device is not recorded")
    gaps: list[tuple[str, str]] = []
    found: list[tuple[float, Run, Bounds, str]] = []
    for run in case.runs:
        if not run.size:
            continue  # RC01
        try:
            bounds = bounds_of(run, case)
        except RulesError as error:
            at_most = _as_copper(case, run)
            if at_most is None:
                gaps.append((run.name, str(error)))
            else:
                found.append(at_most)
            continue
        least_a, rule_words = largest_device_a(run, bounds, bounds.least_a)
        most_a, _ = largest_device_a(run, bounds, bounds.most_a)
        if overload_of(case, run, bounds) is not None:
            continue  # one conductor too small for its load is one finding: CP01 tells of the device too
        if circuit.rated_current_a <= least_a or sources_give_a(case) <= bounds.least_a:
            continue
        if circuit.rated_current_a <= most_a:
            rated, _ = show_against(circuit.rated_current_a, least_a, "A")
            gaps.append((run.name, f"a device of {rated} before {bounds.words}"))
            continue
        found.append((most_a, run, bounds, rule_words))
    for where, why in together(gaps):
        yield device_above_capacity.gap(case, where, why)
    if found:
        most_a, run, bounds, rule_words = min(found, key=lambda item: item[0])
        rated, limit = show_against(circuit.rated_current_a, most_a, "A")
        more = f", and {len(found) - 1} more of its runs with it" if len(found) > 1 else ""
        yield device_above_capacity.finding(
            case,
            run.name,
            f"the device of {rated} protects {run.name}, which may carry {bounds.words}{rule_words.format(limit)}{more}",
            numbers={"rating": Figure(circuit.rated_current_a, "A"), "largest device": Figure(most_a, "A")}
            | bounds.numbers,
            source=f"{device_above_capacity.source}; {bounds.source}",
        )


def _as_copper(case: CircuitCase, run: Run) -> tuple[float, Run, Bounds, str] | None:
    """Copper-clad aluminium, which no table has, carries less than copper: ``None`` where the device suits even that."""
    rated = case.circuit.rated_current_a
    if run.material_or_default != "copper-clad aluminium" or rated is None:
        return None
    copper = replace(run, material="copper", return_material="")
    try:
        bounds = bounds_of(copper, case)
    except RulesError:
        return None
    most_a, words = largest_device_a(copper, bounds, bounds.most_a)
    if rated <= most_a or sources_give_a(case) <= bounds.most_a:
        return None
    return most_a, run, bounds, f", were it copper; copper-clad aluminium less{words}"
