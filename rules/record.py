"""
What is installed and what was measured: the tables of a survey as frozen rows.

Every row has an ``id`` that never changes; tags are fields that may be renamed. References go by
id. A reference whose tag names nothing carries the id ``?TAG``, so that ``rules.consistency`` can say
so with the rest. An empty cell is ``None`` (a number) or ``""`` (a text): not known, never zero; the
``…_or_default`` properties give what stands in for it.

Each field names its column in the site folder (``Column``), so that intake, unload, the site file and
the forms read one description. Values are in the column's own unit, which the field's name ends in.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from dataclasses import dataclass, fields, replace
from functools import cache
from typing import TypeAlias

from rules import columns as col
from rules.columns import Column

UNIT_OF_QUANTITY = {
    "voltage": "V",
    "drop": "V",
    "joint": "V",
    "current": "A",
    "residual": "A",
    "temperature": "degC",
    "resistance": "ohm",
}
"""The unit of a reading's value, by its quantity."""

LEGS = ("positive", "negative", "both")
METALS = ("copper", "tinned copper", "aluminium", "copper-clad aluminium")
STRANDINGS = ("solid", "stranded", "flexible")
CATEGORIES = ("CAT II", "CAT III", "CAT IV")
"""Measurement categories that a place may ask of a meter, the least first."""
_VOLTAGE = {"least": 1e-3, "most": 10_000}
"""Bounds here and below are our own, as ``rules.columns.OUTER``."""
RESERVED_POINTS = ("bus", "way", "device", "ambient")


@dataclass(frozen=True, slots=True)
class Figure:
    """One quantity with its standard uncertainty: exactly the JSON's quantity."""

    value: float
    unit: str
    """SI, or ``1`` for a share, ``degC`` for a temperature."""
    u: float | None = None
    """Standard uncertainty in the same unit; ``None`` where it has none."""


@dataclass(frozen=True, slots=True)
class Feed:
    """A reference to what feeds something: a source, a board, or a circuit (at a point)."""

    table: str
    """``sources``, ``boards`` or ``circuits``; empty where the tag names nothing."""
    id: str
    point: str = ""
    """A circuit's point; empty means its last point (``Site.last_point``)."""


Typed: TypeAlias = tuple[tuple[str, str], ...]
"""Field and text as typed, only where the text was not the plain number in the column's own unit."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Row:
    """What all rows have."""

    id: str
    typed: Typed = ()

    def as_typed(self, name: str) -> str | None:
        """The text that the field ``name`` was given as, if it differed from the plain number."""
        return dict(self.typed).get(name)


@dataclass(frozen=True, slots=True, kw_only=True)
class Source(Row):
    """A battery, rectifier, power supply, PV array or converter that feeds a busbar."""

    tag: str = col.tag("source")
    kind: str = col.column(
        "", "kind", "choice", header=True, filled=True,
        choices=("battery", "rectifier", "power supply", "pv", "converter"),
    )  # fmt: skip
    nominal_voltage_v: float | None = col.number("nominal", "V", header=True, **_VOLTAGE)
    working_voltage_v: float | None = col.number("working", "V", **_VOLTAGE)
    lowest_voltage_v: float | None = col.number("lowest", "V", **_VOLTAGE)
    highest_voltage_v: float | None = col.number("highest", "V", **_VOLTAGE)
    resistance_ohm: float | None = col.number("resistance", "ohm", least=0, most=1e12)
    rated_current_a: float | None = col.number("rating", "A", least=1e-6, most=100_000)
    current_limit_a: float | None = col.number("current_limit", "A", least=1e-6, most=100_000)
    earthing: str = col.column(
        "", "earthing", "choice", choices=("floating", "negative earthed", "positive earthed", "mid earthed")
    )
    cells: int | None = col.column(None, "cells", "whole", least=1, most=10_000)
    fed_from: Feed | None = col.column(None, "fed_from", "reference", tables=("circuits",))
    efficiency_percent: float | None = col.number("efficiency", "%", least=1e-3, most=100)
    category: str = col.column("", "category", "choice", choices=CATEGORIES)
    """The least measurement category that a meter needs at its terminals."""
    notes: str = col.notes()

    @property
    def working_or_nominal_v(self) -> float | None:
        """Voltage at the terminals under load; nominal where it is not known. [V]"""
        return self.nominal_voltage_v if self.working_voltage_v is None else self.working_voltage_v


@dataclass(frozen=True, slots=True, kw_only=True)
class Board(Row):
    """A distribution board, fuse panel or terminal row with a busbar."""

    tag: str = col.tag("board")
    fed_by: tuple[Feed, ...] = col.column(
        (), "fed_by", "feeds", header=True, filled=True, tables=("sources", "circuits")
    )
    nominal_voltage_v: float | None = col.number("nominal", "V", **_VOLTAGE)
    location: str = col.column("", "location")
    category: str = col.column("", "category", "choice", choices=CATEGORIES)
    """The least measurement category that a meter needs on it and on its circuits."""
    walk_order: float | None = col.order()
    notes: str = col.notes()


@dataclass(frozen=True, slots=True, kw_only=True)
class Circuit(Row):
    """What one protective device on a board feeds: one or more runs and their loads."""

    tag: str = col.tag("circuit")
    fed_from: Feed | None = col.column(
        None, "fed_from", "reference", header=True, filled=True, tables=("boards", "sources")
    )
    description: str = col.column("", "description")
    location: str = col.column("", "location")
    nominal_voltage_v: float | None = col.number("nominal", "V", **_VOLTAGE)
    device: str = col.column(
        "", "device", "choice",
        choices=("none", "breaker B", "breaker C", "breaker D", "fuse gG", "fuse blade", "electronic"),
    )  # fmt: skip
    rated_current_a: float | None = col.number("device_rating", "A", least=1e-6, most=100_000)
    device_poles: int | None = col.column(None, "device_poles", "whole", least=1, most=4)
    device_leg: str = col.column("", "device_leg", "choice", choices=LEGS)
    device_voltage_v: float | None = col.number("device_voltage", "V", **_VOLTAGE)
    breaking_capacity_a: float | None = col.number("breaking_capacity", "A", least=1e-6, most=100_000)
    trip_current_a: float | None = col.number("trip_current", "A", least=1e-6, most=100_000)
    allowed_drop_percent: float | None = col.number("allowed_drop", "%", least=1e-3, most=100)
    not_tested: str = col.column("", "not_tested")
    walk_order: float | None = col.order()
    notes: str = col.notes()


@dataclass(frozen=True, slots=True, kw_only=True)
class Run(Row):
    """One length of cable between two points of a circuit, both conductors of it."""

    circuit_id: str = col.circuit()
    number: int = col.column(0, "run", "whole", header=True, filled=True, least=1, most=1_000_000)
    from_point: str = col.column("", "from", "point", header=True, filled=True)
    to_point: str = col.column("", "to", "point", header=True, filled=True, tables=("boards",))
    """A point's name; empty where the run ends on a board."""
    to_board_id: str = ""
    """Id of the board that the run ends on (``board:TAG`` in the folder), closing a mesh."""
    one_way_length_m: float | None = col.number("length", "m", header=True, least=0, most=100_000)
    length_by: str = col.column(
        "", "length_by", "choice", choices=("marks", "tape", "tdr", "paced", "drawing", "guess")
    )
    size: str = col.column("", "size", "size", header=True)
    material: str = col.column("", "material", "choice", choices=METALS)
    stranding: str = col.column("", "stranding", "choice", choices=STRANDINGS)
    parallel: int | None = col.column(None, "parallel", "whole", least=1, most=1_000)
    insulation: str = col.column("", "insulation", "choice", choices=("PVC", "XLPE", "EPR", "unknown"))
    method: str = col.column("", "method")
    grouped: int | None = col.column(None, "grouped", "whole", least=1, most=10_000)
    conductor_temperature_c: float | None = col.number("temperature", "degC", least=-90, most=400)
    temperature_by: str = col.column("", "temperature_by", "choice", choices=("probe", "air", "assumed"))
    return_conductor: str = col.column("", "return", "return")
    """``own``, ``shared:NAME`` or ``structure``."""
    return_size: str = col.column("", "return_size", "size")
    return_material: str = col.column("", "return_material", "choice", choices=METALS)
    notes: str = col.notes()

    @property
    def name(self) -> str:
        """How findings and readings call it: ``run 2``."""
        return f"run {self.number}"

    @property
    def material_or_default(self) -> str:
        return self.material or "copper"

    @property
    def stranding_or_default(self) -> str:
        return self.stranding or "stranded"

    @property
    def length_by_or_default(self) -> str:
        return self.length_by or "drawing"

    @property
    def parallel_or_default(self) -> int:
        return self.parallel or 1

    @property
    def return_or_default(self) -> str:
        return self.return_conductor or "own"

    @property
    def return_size_or_default(self) -> str:
        return self.return_size or self.size

    @property
    def return_material_or_default(self) -> str:
        return self.return_material or self.material_or_default


@dataclass(frozen=True, slots=True, kw_only=True)
class Load(Row):
    """What draws current at a point of a circuit."""

    circuit_id: str = col.circuit()
    point: str = col.column("", "point", "point", header=True, filled=True)
    tag: str = col.tag("load")
    kind: str = col.column("", "kind", "choice", choices=("constant current", "constant power", "constant resistance"))
    current_a: float | None = col.number("current", "A", least=0, most=100_000)
    power_w: float | None = col.number("power", "W", least=0, most=10_000_000)
    resistance_ohm: float | None = col.number("resistance", "ohm", least=1e-9, most=1e12)
    lowest_voltage_v: float | None = col.number("lowest", "V", **_VOLTAGE)
    highest_voltage_v: float | None = col.number("highest", "V", **_VOLTAGE)
    peak_current_a: float | None = col.number("peak", "A", least=0, most=100_000)
    peak_time_s: float | None = col.number("peak_time", "s", least=0, most=1e9)
    simultaneous: float | None = col.number("simultaneous", least=0, most=1)
    function: str = col.column("", "function", "choice", choices=("ordinary", "life safety", "trip or close"))
    notes: str = col.notes()

    @property
    def simultaneous_or_default(self) -> float:
        return 1.0 if self.simultaneous is None else self.simultaneous

    @property
    def function_or_default(self) -> str:
        return self.function or "ordinary"


@dataclass(frozen=True, slots=True, kw_only=True)
class Instrument(Row):
    """One range of one meter."""

    tag: str = col.tag("instrument")
    quantity: str = col.column(
        "", "quantity", "choice", header=True, filled=True,
        choices=("voltage", "current", "resistance", "temperature"),
    )  # fmt: skip
    full_scale: float | None = col.number("range", "*", above=0)
    """Largest value of the range, in the quantity's unit; ``None`` holds every value."""
    accuracy_percent: float | None = col.number("accuracy", "%", header=True, least=0, most=100)
    counts: float | None = col.number("counts", header=True, least=0, most=1_000_000)
    resolution: float | None = col.number("resolution", "*", header=True, above=0)
    zero: float | None = col.number("zero", "*")
    input_resistance_ohm: float | None = col.number("input_resistance", "ohm", least=1e-9, most=1e12)
    category: str = col.column("", "category")
    """As printed on it: ``CAT III 600 V``, or several."""
    rated_voltage_v: float | None = col.number("rated_voltage", "V", **_VOLTAGE)
    """The highest d.c. voltage that it may be connected to."""
    calibrated_until: str = col.column("", "calibrated_until", "date")
    notes: str = col.notes()


@dataclass(frozen=True, slots=True, kw_only=True)
class Visit(Row):
    """One survey of the site."""

    tag: str = col.tag("visit")
    kind: str = col.column("", "kind", "choice", choices=("as found", "as left", "periodic"))
    date: str = col.column("", "date", "date")
    by: str = col.column("", "by")
    walk_order: float | None = col.order()
    notes: str = col.notes()


@dataclass(frozen=True, slots=True, kw_only=True)
class Reading(Row):
    """One value that an instrument showed."""

    circuit_id: str = col.column("", "circuit", "reference", tables=("circuits",))
    """Empty for a reading on a busbar."""
    board: Feed | None = col.column(None, "board", "reference", tables=("boards", "sources"))
    visit: str = col.column("", "visit")
    round: str = col.column("", "round", header=True, filled=True)
    taken_at: str = col.column("", "taken_at", "time")
    quantity: str = col.column("", "quantity", "choice", header=True, filled=True, choices=tuple(UNIT_OF_QUANTITY))
    at: str = col.column("", "at", "point", header=True, filled=True)
    to: str = col.column("", "to", "point")
    leg: str = col.column("", "leg", "choice", choices=LEGS)
    value: float = col.column(0.0, "value", "number", unit="*", header=True, filled=True)
    instrument: str = col.column("", "instrument")
    """Tag of the instrument; its row follows from the range."""
    full_scale: float | None = col.number("range", "*", above=0)
    test_resistor_ohm: float | None = col.number("test_resistor", "ohm", least=1e-9, most=1e12)
    test_resistor_leg: str = col.column("", "test_resistor_leg", "choice", choices=LEGS[:2])
    loads_off: str = col.column("", "loads_off", "choice", choices=("yes",))
    """Taken with every load of its circuit or board off: it belongs to no load state."""
    by: str = col.column("", "by")
    tag: str = col.column("", "reading", "tag")
    replaces_id: str = col.column("", "replaces", "reference", tables=("readings",))
    reason: str = col.column("", "reason")
    notes: str = col.notes()

    @property
    def visit_or_default(self) -> str:
        return self.visit or "1"

    @property
    def unit(self) -> str:
        return UNIT_OF_QUANTITY.get(self.quantity, "")

    @property
    def is_unloaded(self) -> bool:
        """Whether it was taken with the loads off, so that it belongs to no load state."""
        return self.loads_off == "yes"


@dataclass(frozen=True, slots=True, kw_only=True)
class Decision(Row):
    """What a person decided about a finding."""

    finding: str = col.column("", "finding", header=True, filled=True)
    visit: str = col.column("", "visit")
    decision: str = col.column(
        "", "decision", "choice", header=True, filled=True,
        choices=("accepted", "sent back", "not agreed", "repaired"),
    )  # fmt: skip
    by: str = col.column("", "by", header=True, filled=True)
    at: str = col.column("", "at", "time", header=True, filled=True)
    reason: str = col.column("", "reason")
    notes: str = col.notes()


@dataclass(frozen=True, slots=True, kw_only=True)
class Acknowledgement(Row):
    """A caution that a person has read on a visit."""

    caution: str = col.column("", "caution", header=True, filled=True)
    visit: str = col.column("", "visit", header=True, filled=True)
    by: str = col.column("", "by", header=True, filled=True)
    at: str = col.column("", "at", "time", header=True, filled=True)


TABLES: dict[str, type[Row]] = {
    "sources": Source,
    "boards": Board,
    "circuits": Circuit,
    "runs": Run,
    "loads": Load,
    "instruments": Instrument,
    "visits": Visit,
    "readings": Reading,
    "decisions": Decision,
    "acknowledged": Acknowledgement,
}
"""Tables of a site in the order in which they can be read: what is referred to comes first."""

KEY_FIELDS: dict[str, tuple[str, ...]] = {
    "sources": ("tag",),
    "boards": ("tag",),
    "circuits": ("tag",),
    "runs": ("circuit_id", "number"),
    "loads": ("circuit_id", "tag"),
    "instruments": ("tag", "quantity", "full_scale"),
    "visits": ("tag",),
}
"""Fields that make a row's tag; two rows alike in them are an error. Other tables have untagged rows."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Site:
    """One building or plant: its settings and its tables. Two sites are equal when their records are."""

    name: str
    address: str = ""
    limits: str = "general"
    nominal_voltage_v: float | None = None
    ambient_temperature_c: float | None = None
    surveyed_by: str = ""
    extent: str = ""
    limitations: str = ""
    notes: str = ""
    prior: tuple[tuple[str, float], ...] = ()
    """Cause (with spaces) and share as given; normalised where it is used."""
    own_limits: str | None = None
    """Text of the limits profile that came beside ``site.toml``."""
    typed: Typed = ()
    sources: tuple[Source, ...] = ()
    boards: tuple[Board, ...] = ()
    circuits: tuple[Circuit, ...] = ()
    runs: tuple[Run, ...] = ()
    loads: tuple[Load, ...] = ()
    instruments: tuple[Instrument, ...] = ()
    visits: tuple[Visit, ...] = ()
    readings: tuple[Reading, ...] = ()
    decisions: tuple[Decision, ...] = ()
    acknowledged: tuple[Acknowledgement, ...] = ()

    def table(self, name: str) -> tuple[Row, ...]:
        """The rows of one table, in their order."""
        rows: tuple[Row, ...] = getattr(self, name)
        return rows

    def with_rows(self, name: str, rows: tuple[Row, ...]) -> Site:
        """The same site with one table exchanged."""
        return replace(self, **{name: rows})  # type: ignore[arg-type]

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Site):
            return NotImplemented
        return self._without_ids() == other._without_ids()

    def __hash__(self) -> int:
        return hash((self.name, len(self.circuits), len(self.readings)))

    def _without_ids(self) -> list[object]:
        """Every value, with each id replaced by table and place: ids may differ between equal sites."""
        place = {row.id: f"{name} {n}" for name in TABLES for n, row in enumerate(self.table(name))}

        def plain(value: object) -> object:
            if isinstance(value, Feed):
                return (value.table, place.get(value.id, value.id), value.point)
            if isinstance(value, tuple):
                return tuple(plain(item) for item in value)
            return value

        out: list[object] = [plain(getattr(self, f.name)) for f in fields(self) if f.name not in TABLES]
        for name, row_type in TABLES.items():
            names = [f.name for f in fields(row_type) if f.name != "id"]
            for row in self.table(name):
                out.append(
                    tuple(
                        place.get(getattr(row, n), getattr(row, n)) if n.endswith("_id") else plain(getattr(row, n))
                        for n in names
                    )
                )
            out.append(name)
        return out


@cache
def columns(table: str) -> tuple[tuple[str, Column], ...]:
    """Field name and column of every column of a table, in the format's order."""
    return tuple((f.name, f.metadata["column"]) for f in fields(TABLES[table]) if "column" in f.metadata)


def row_id(table: str, *key: object, salt: int = 0) -> str:
    """
    The id of a row that has a tag: derived from table and tag as first given, so that two laptops that
    add the same tag share one row; ``salt`` counts up while the id is taken.
    """
    text = "\x1f".join((table, *map(str, key), str(salt)))
    return hashlib.blake2b(text.encode(), digest_size=8).hexdigest()


def missing(tag: str) -> str:
    """The id that stands for a tag that names nothing."""
    return "?" + tag


def is_missing(id_: str) -> bool:
    """Whether an id stands for a tag that names nothing."""
    return id_.startswith("?")


def rows_of(site: Site) -> Iterator[tuple[str, Row]]:
    """Every row with its table's name."""
    for name in TABLES:
        for row in site.table(name):
            yield name, row
