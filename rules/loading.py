"""How the runs of a circuit are loaded: their largest current, and between which capacities they lie as installed."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

from rules.calc.ampacity import Capacity
from rules.calc.doubt import total
from rules.capacity import capacity_of
from rules.case import CircuitCase
from rules.errors import MissingData
from rules.record import Figure, Run
from rules.runs import SharedReturn
from rules.units import show
from rules.worst import largest_current_a

FAVOURABLE_INSULATION, FAVOURABLE_METHOD = "XLPE", "E"
"""Of those that tables are held for, the ones with which a conductor may carry most."""


@dataclass(frozen=True, slots=True)
class Bounds:
    """Between what a run's capacity lies, by what its record leaves open."""

    capacity: Capacity
    """With what is not recorded counted as the lowest (group ``capacity`` of the profile)."""
    most_a: float
    """Ampacity if what is not recorded were the most favourable; infinite where no table has that. [A]"""

    @property
    def least_a(self) -> float:
        """What it may carry at least, as installed. [A]"""
        return self.capacity.ampacity_a

    @property
    def is_of_terminals(self) -> bool:
        """Whether it is the temperature of its terminals that caps it, not the conductor in its place."""
        return self.capacity.ampacity_a < self.capacity.corrected_a * (1 - 1e-9)

    @property
    def words(self) -> str:
        """``18.5 A (PVC, method B1)``, with what was taken and the most that it could be."""
        taken = [text for text in self.capacity.assumed if text not in self.capacity.column]
        guessed = f"; not recorded, so taken: {', '.join(taken)}" if taken else ""
        least = f"{show(self.least_a, 'A', digits=3)} ({self.capacity.column}{guessed})"
        least += f", as its terminals of {self.capacity.terminal_c:g} °C allow" if self.is_of_terminals else ""
        if self.most_a in (self.least_a, float("inf")):
            return least
        return f"{least}, at the most favourable {show(self.most_a, 'A', digits=3)}"

    @property
    def numbers(self) -> dict[str, Figure]:
        """For a finding."""
        capacity = self.capacity
        return {
            "capacity": Figure(self.least_a, "A"),
            "as tabulated": Figure(capacity.tabulated_a * capacity.parallel, "A"),
            "ambient factor": Figure(capacity.ambient_factor, "1"),
            "grouping factor": Figure(capacity.grouping_factor, "1"),
        } | (
            {"corrected, before its terminals": Figure(self.capacity.corrected_a, "A")} if self.is_of_terminals else {}
        )

    @property
    def source(self) -> str:
        """Where the printed figure stands."""
        capacity = self.capacity
        status = "" if capacity.status == "verified" else f", {capacity.status}"
        return f"{capacity.source}, edition {capacity.edition}{status}"


def bounds_of(run: Run, case: CircuitCase) -> Bounds:
    """
    Between what the capacity of a run lies.

    Raises
    ------
    MissingData
        If its size is not known, or no table has the case.

    Notes
    -----
    Insulation, method and the marking of terminals that are not recorded open the range; the number of cables beside it
    does not, since one that is not recorded counts as none, which is favourable already.
    """
    site, limits, rated_a = case.context.site, case.limits, case.circuit.rated_current_a
    capacity = capacity_of(run, site, limits, rated_a)
    known = run.insulation not in ("", "unknown")
    better = replace(run, insulation=run.insulation if known else FAVOURABLE_INSULATION)
    if not run.method and capacity.terminal_c is None:  # a table that is printed by method
        better = replace(better, method=FAVOURABLE_METHOD)
    try:
        most = capacity_of(better, site, limits, rated_a)
    except MissingData:
        return Bounds(capacity, float("inf"))
    by_size = any(text.startswith("terminals") for text in most.assumed)
    return Bounds(capacity, max(most.corrected_a if by_size else most.ampacity_a, capacity.ampacity_a))


def current_of(run: Run, case: CircuitCase) -> float | None:
    """Largest current in a run with every load on, at the voltage that makes it largest; ``None`` where not known. [A]"""
    node = case.context.network.node_at_run_end.get(run.id)
    return None if node is None else largest_current_a(case.context.network, node)


def read_in(run: Run, case: CircuitCase) -> tuple[str, Figure] | None:
    """Round and value of the largest current that a clamp showed in a run; ``None`` where none was read."""
    branch = next((branch for branch, other in case.tree.ends.items() if other.id == run.id), "")
    read = [(this.name, *total(this.amps[branch])) for this in case.rounds if branch in this.amps]
    if not read:
        return None
    name, value, u = max(read, key=lambda item: abs(item[1]))
    return name, Figure(abs(value), "A", u)


def together(gaps: Sequence[tuple[str, str]]) -> Iterator[tuple[str, str]]:
    """
    Places with what could not be judged of them, those of one reason told once.

    >>> list(together([("run 1", "no table"), ("run 2", "no table"), ("run 3", "no size")]))
    [('runs 1, 2', 'no table'), ('run 3', 'no size')]
    """
    by_reason: dict[str, list[str]] = {}
    for where, why in gaps:
        by_reason.setdefault(why, []).append(where)
    for why, places in by_reason.items():
        names = ", ".join(place.removeprefix("run ") for place in places)
        yield (places[0] if len(places) == 1 else f"runs {names}"), why


def as_run(shared: SharedReturn) -> Run:
    """The conductor of a shared return as if it were a run of its own, for its capacity."""
    first = shared.runs[0]
    size = next((run.return_size for run in shared.runs if run.return_size), first.size)
    material = next((run.return_material for run in shared.runs if run.return_material), first.material)
    return replace(
        first, size=size, material=material, parallel=1, return_conductor="", return_size="", return_material=""
    )
