"""
What an assessment says: the one object that the screens, the reports and the JSON show.

None of them computes a verdict of its own. The classes mirror section "check --json" of the format, and
``audit.report.as_json`` writes them out.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import StrEnum
from typing import NamedTuple

from rules.record import Figure


class Severity(StrEnum):
    """How soon someone has to act; not how sure we are."""

    IMMEDIATE = "immediate"
    SOON = "soon"
    WATCH = "watch"
    NOTE = "note"

    @property
    def rank(self) -> int:
        """0 for the most urgent."""
        return list(Severity).index(self)


class Status(StrEnum):
    """What is to be done about a circuit; says what was read, not that it is safe or complies."""

    SOUND = "sound"
    WATCH = "watch"
    ACT = "act"
    MEASURE = "measure"
    INCOMPLETE = "incomplete"


STATUS_SIGNS = {
    Status.SOUND: "✓",
    Status.WATCH: "~",
    Status.ACT: "!",
    Status.MEASURE: "?",
    Status.INCOMPLETE: "…",
}
"""The sign that repeats each status beside its word."""


@dataclass(frozen=True, slots=True)
class Citation:
    """Where a limit or a formula stands written."""

    document: str
    edition: str = ""
    clause: str = ""
    status: str = ""
    """``verified``, ``computed``, ``from-memory`` or ``common practice, no source``."""

    def __str__(self) -> str:
        text = self.document + (f":{self.edition}" if self.edition else "")
        parts = [text, self.clause, self.status if self.status != "verified" else ""]
        return ", ".join(part for part in parts if part)


@dataclass(frozen=True, slots=True)
class Finding:
    """One thing that a rule reports."""

    id: str
    """Built from rule, place and ``where``: the same in the next check."""
    rule: str
    circuit: str | None
    """Tag of the circuit; ``None`` for a finding on a board, a source or the site."""
    board: str | None
    """Tag of the board or source where ``circuit`` is ``None``; ``None`` for the site."""
    where: str
    severity: Severity
    cause: str | None
    """The cause that it claims from readings; ``None`` where it claims none."""
    title: str
    why: str
    numbers: dict[str, Figure]
    remedy: str
    caution: str
    source: str
    consequences: tuple[str, ...] = ()
    by_profile: bool = False
    """Whether the limits profile sets its severity, which nothing graver that it explains then raises: that stands beside it."""
    under: tuple[str, ...] = ()
    """Ids of findings that explain it, or ``RULE/place`` of any of that rule there: it goes under the first that stands."""
    as_consequence: str = ""
    """What it says there; empty where that is its ``why``."""
    holds: tuple[Finding, ...] = ()
    """Those that went under it, as they would stand on their own."""


@dataclass(frozen=True, slots=True)
class NotJudged:
    """What a rule could not judge, and why: a gap is not a pass."""

    rule: str
    circuit: str | None
    where: str
    why: str


PROGRAM_FAULT = "fault of the program in this rule"
"""How the reason of a rule begins that failed by a fault of its own."""


@dataclass(frozen=True, slots=True)
class RuleChange:
    """A rule that the limits profile switches off, or gives another severity, with the profile's reason."""

    rule: str
    title: str
    usual: Severity
    severity: Severity | None
    """``None`` where it is switched off."""
    reason: str
    profile: str

    @property
    def words(self) -> str:
        """What the profile does, and why."""
        does = "is switched off" if self.severity is None else f"reports {self.severity}, usually {self.usual}"
        return f"{self.rule} ({self.title}) {does}, by limits profile {self.profile}: {self.reason}"


@dataclass(frozen=True, slots=True)
class Doubt:
    """What one doubt adds to the standard uncertainty of a drop's excess."""

    name: str
    u_v: float
    """[V]"""
    group: str = ""
    """Group of the limits profile that states it; empty where it is a meter's own figure."""
    by_instruments: bool = False
    """Beside that group the record of instruments has part in it: one meter is recorded and another is not."""


@dataclass(frozen=True, slots=True)
class Drop:
    """Measured against computed drop of one round, between two points of a circuit."""

    round: str
    start: str
    end: str
    measured: Figure
    computed: Figure
    excess: Figure
    """Measured less computed; its ``u`` holds both doubts with what they share."""
    current: Figure
    """In the circuit's first run, in that round."""
    by: str
    """How it was measured: ``two voltages`` or ``direct drops``."""

    @property
    def sense(self) -> float:
        """1, or -1 while the current flows towards the source: what is lost is then a rise."""
        return -1.0 if self.current.value < 0 else 1.0

    @property
    def lost(self) -> Figure:
        """Measured, in the sense of the current."""
        return Figure(self.sense * self.measured.value, self.measured.unit, self.measured.u)

    @property
    def too_much(self) -> Figure:
        """Excess, in the sense of the current."""
        return Figure(self.sense * self.excess.value, self.excess.unit, self.excess.u)

    budget: tuple[Doubt, ...] = ()
    """What its doubt is made of, largest first: the squares add to that of the excess's ``u``."""
    unfinished: tuple[tuple[str, str], ...] = ()
    """Rounds of a higher current that give no comparison, each with what it lacks."""


class Place(NamedTuple):
    """A probability of a cause at a place: a row of ``causes``. A tuple, since a site has a million of them."""

    cause: str
    where: str
    probability: float
    low_ohm: float | None = None
    best_ohm: float | None = None
    high_ohm: float | None = None
    """Extra resistance of a bad connection: median and central 95 % of its posterior. [ohm]"""
    heat: float | None = None
    """Probability of a bad connection there whose heat at design current passes the profile's limit."""
    what: str = ""
    """The cause's most probable way: ``one size smaller``, or which reading is doubtful and how."""
    point: str = ""
    """Where the branch of the place ends: ``way`` for the device; empty for the whole circuit."""
    joints: tuple[Place, ...] = ()
    """Of bad connections in two places at once: each, with its own figures."""
    speaks_for: tuple[str, ...] = ()
    speaks_against: tuple[str, ...] = ()
    """What was read that speaks for the cause and against it, as sentences; only where an explanation was asked for."""


@dataclass(frozen=True, slots=True)
class JointHeat:
    """Heat in a bad connection or a semiconductor suspected at one place; what is not known is ``None``."""

    where: str
    """As in ``Place``."""
    read_a: Figure | None
    """The most that it carried while it was read. [A]"""
    read: Figure | None
    """Heat at that current. [W]"""
    design_a: Figure | None
    """At design and the voltage that makes it largest. [A]"""
    design: Figure | None
    """Heat at that current. [W]"""
    cause: str = "bad connection"
    """As in ``Place``: a bad connection grows with the square of the current, a semiconductor with the current."""


@dataclass(frozen=True, slots=True)
class PointVoltage:
    """Voltages of one point of a circuit; what is not known is ``None``."""

    point: str
    design: Figure | None = None
    worst: Figure | None = None
    lowest: Figure | None = None


@dataclass(frozen=True, slots=True)
class RunService:
    """One run at its design current: what it may carry and how warm that makes it; no verdict."""

    run: str
    current: Figure | None
    """At design; ``None`` where it is not known."""
    ampacity: Figure | None
    """As installed; ``None`` where no table has the case."""
    temperature: Figure | None
    """Of the conductor in service; ``None`` where it is not known or above what its insulation stands."""
    basis: str
    """Column, table and edition of the capacity."""
    assumed: tuple[str, ...]
    """What the record does not say and was taken instead."""
    gap: str
    """Why something is not known; empty where all is."""


@dataclass(frozen=True, slots=True)
class NextReading:
    """The reading to take next; filled by the diagnosis."""

    what: str
    quantity: str = ""
    at: str = ""
    to: str = ""
    leg: str = ""
    current_at_least: Figure | None = None
    why: str = ""
    caution: str = ""
    current_at_most: Figure | None = None
    """What device, cable, source and the heat in a suspected joint allow; where a current is asked for."""
    minutes: float | None = None
    """What it takes, by the limits profile."""
    fall_nats: float | None = None
    """Expected fall in entropy of the causes, where the diagnosis chose it. [nat]"""


@dataclass(frozen=True, slots=True)
class LoadMargin:
    """Voltage at one load, and how far it stays from what the load lives with; what is not known is ``None``."""

    load: str
    point: str
    design: Figure | None = None
    worst: Figure | None = None
    """With the source at its lowest, hot conductors and what readings support."""
    worst_recorded: Figure | None = None
    """The same with everything as recorded: without a fault."""
    source_lowest: Figure | None = None
    """At the source's terminals, at its lowest."""
    source_working: Figure | None = None
    """At the source's terminals, at its working voltage: the source of ``design`` and ``dip``."""
    lowest: Figure | None = None
    """The load's own."""
    margin: Figure | None = None
    """From ``worst`` down to ``lowest``; below zero where it is not kept."""
    below_highest: Figure | None = None
    """From the source's highest up to the load's own."""
    dip: Figure | None = None
    """At the load's peak current, from the design voltage."""
    peak: Figure | None = None
    """The load's peak current; ``None`` where none is recorded."""
    dip_worst: Figure | None = None
    """At its peak with the source at its lowest, hot conductors, everything as recorded."""
    dip_margin: Figure | None = None
    """From ``dip_worst`` down to ``lowest``."""


@dataclass(frozen=True, slots=True)
class CircuitResult:
    """What is said of one circuit on the visit that it is judged on."""

    circuit: str
    circuit_id: str
    visit: str
    """Empty where nothing was read."""
    status: Status
    why: str
    """One sentence: why this status."""
    drop: Drop | None = None
    allowed_drop_percent: float | None = None
    nominal_voltage_v: float | None = None
    design_drop: Figure | None = None
    """Largest computed drop from the feeding board to a load at design current. [V]"""
    causes: tuple[Place, ...] = ()
    joints: tuple[JointHeat, ...] = ()
    """Heat where a connection may be bad or a semiconductor may be, each place once for each."""
    points: tuple[PointVoltage, ...] = ()
    margins: tuple[LoadMargin, ...] = ()
    """One for each load, in the order of their rows."""
    service: tuple[RunService, ...] = ()
    """Capacity and temperature in service of each run."""
    next_reading: NextReading | None = None
    findings: tuple[Finding, ...] = ()
    """All that are about it, those too that the site's list has under a finding of its source."""
    not_judged: tuple[NotJudged, ...] = ()

    def heat_of(self, place: Place) -> JointHeat | None:
        """Heat in what a row of causes supposes; ``None`` where none follows."""
        return next((heat for heat in self.joints if (heat.cause, heat.where) == (place.cause, place.where)), None)


@dataclass(frozen=True, slots=True)
class Assessment:
    """What ``assess`` says of a site."""

    program: str
    site: str
    limits: str
    circuits: tuple[CircuitResult, ...]
    """In walking order."""
    findings: tuple[Finding, ...]
    """All of them: the site's, the boards' and sources', then the circuits' in walking order."""
    not_judged: tuple[NotJudged, ...]
    cautions: tuple[str, ...] = field(default=())
    """Cautions of the site's voltages, to be read before anyone takes a reading."""
    rule_changes: tuple[RuleChange, ...] = ()
    """What the limits profile switches off, raises or lowers."""

    @property
    def summary(self) -> dict[str, int]:
        """Number of circuits, in all and by status."""
        counts = {"circuits": len(self.circuits)}
        for status in Status:
            counts[str(status)] = sum(result.status is status for result in self.circuits)
        return counts

    @property
    def rule_faults(self) -> dict[str, str]:
        """Reason by rule, of those that failed by a fault of the program: the first of each."""
        found: dict[str, str] = {}
        for gap in self.not_judged:
            if gap.why.startswith(PROGRAM_FAULT):
                found.setdefault(gap.rule, gap.why)
        return found
