"""What the screens show: the record, what was said of it so far, and the visit at hand."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING

from rules.assessment import Assessment, CircuitResult, Status
from rules.index import Index
from rules.record import Site

if TYPE_CHECKING:  # it brings numpy, and the first screen does not wait for that
    from rules.context import Context


@dataclass(frozen=True, slots=True)
class Survey:
    """A site as the screens see it; every change is a new one."""

    site: Site
    index: Index
    visit: str
    """Tag of the visit that readings go to; empty on a site that was never visited."""
    read: Mapping[str, frozenset[str]]
    """By visit: ids of the circuits on which something was read."""
    read_only: bool = False
    """The file may not be written."""
    is_outline: bool = False
    """Runs, loads and readings are not read yet."""
    context: Context | None = None
    """What circuits are judged in; of an earlier state of the record until this one is judged."""
    results: Mapping[str, CircuitResult] = field(default_factory=dict)
    """By circuit id; what is not judged yet is missing, or as it was before the last save."""
    assessment: Assessment | None = None
    """Of this very record; ``None`` until all of it is judged."""
    cannot_judge: str = ""
    """Why this very record cannot be judged; then nothing was."""

    def of(self, site: Site, index: Index, visit: str, read: Mapping[str, frozenset[str]]) -> Survey:
        """Another state of the same site: what was judged stands until it is judged anew."""
        results = {id_: result for id_, result in self.results.items() if id_ in index.circuits}
        return replace(
            self, site=site, index=index, visit=visit, read=read, results=results, assessment=None, cannot_judge=""
        )

    @property
    def is_judged(self) -> bool:
        """Whether what is in sight was judged in this very record, not in an earlier state of it."""
        return self.context is not None and self.context.recorded is self.site

    @property
    def read_now(self) -> frozenset[str]:
        """Ids of the circuits on which something was read in the visit at hand."""
        return self.read.get(self.visit or "1", frozenset())

    def count_of(self, status: Status) -> int:
        """How many circuits have a status, of those judged so far."""
        return sum(result.status is status for result in self.results.values())


def read_by_visit(site: Site) -> dict[str, frozenset[str]]:
    """By visit: ids of the circuits on which something was read."""
    read: dict[str, set[str]] = defaultdict(set)
    for reading in site.readings:
        read[reading.visit_or_default].add(reading.circuit_id)
    return {visit: frozenset(circuits) for visit, circuits in read.items()}


def latest_visit(site: Site) -> str:
    """
    The visit that readings go to unless another is chosen: the last one in the visits' order.

    A visit that readings name without describing it counts where none is described.
    """
    if site.visits:
        order = sorted(site.visits, key=lambda row: float("inf") if row.walk_order is None else row.walk_order)
        return order[-1].tag
    if site.readings:
        return max(site.readings, key=lambda row: row.taken_at).visit_or_default
    return ""
