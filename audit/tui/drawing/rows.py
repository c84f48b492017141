"""Rows of the record as titles and as lines of a list."""

from __future__ import annotations

from dataclasses import dataclass

from audit.report.phrases import visit_words
from audit.report.records import board_title, device_words, feed_words, joined
from audit.tui.drawing.pieces import Line, Piece, cut, fit, piece
from audit.tui.drawing.walk import CHOSEN
from audit.tui.entry.fields import SITE
from rules.index import Index
from rules.record import Board, Circuit, Feed, Instrument, Load, Row, Run, Site, Source, Visit
from rules.units import show, show_size

_TAG_CELLS = 18


@dataclass(frozen=True, slots=True)
class Item:
    """One line of the record: a heading, or a row that can be opened."""

    table: str
    id: str = ""
    heading: str = ""
    is_empty: bool = False
    """No row stands under the heading."""

    @property
    def is_choosable(self) -> bool:
        return not self.heading


def circuit_items(index: Index, circuit_id: str) -> tuple[Item, ...]:
    """The circuit's own row, its runs and its loads."""
    return (
        *_section("circuits", "circuit", [circuit_id]),
        *_section("runs", "runs", [run.id for run in index.runs_of(circuit_id)]),
        *_section("loads", "loads", [load.id for load in index.loads_of(circuit_id)]),
    )


def site_items(site: Site) -> tuple[Item, ...]:
    """The settings, sources, boards, meters and visits."""
    items = [*_section(SITE, "site", [""])]
    for table, heading in (
        ("sources", "sources"),
        ("boards", "boards"),
        ("instruments", "meters"),
        ("visits", "visits"),
    ):
        items += _section(table, heading, [row.id for row in site.table(table)])
    return tuple(items)


def _section(table: str, heading: str, ids: list[str]) -> list[Item]:
    return [Item(table, heading=heading, is_empty=not ids), *(Item(table, id_) for id_ in ids)]


def item_line(item: Item, row: Row | Site | None, index: Index, width: int, *, chosen: bool) -> Line:
    """One line: a tag, and the rest in a few words."""
    if item.heading:
        return (piece(f" {item.heading}", "strong"), piece("   none: a adds one" if item.is_empty else "", "quiet"))
    if row is None:
        return ()
    mark = Piece(f"   {CHOSEN if chosen else ' '} ", "cursor")
    return cut(
        (mark, piece(fit(row_tag(row), _TAG_CELLS), "strong"), piece(f"  {row_words(row, index)}")),
        width,
    )


def row_tag(row: Row | Site) -> str:
    """What a row is called within its table."""
    if isinstance(row, Run):
        return row.name
    return row.name if isinstance(row, Site) else str(getattr(row, "tag", ""))


def row_title(table: str, row: Row | Site, index: Index) -> str:
    """What a row is called in the site: ``run 2 of DB1-02``."""
    if isinstance(row, Run | Load):
        circuit = index.circuits.get(row.circuit_id)
        noun = "load " if isinstance(row, Load) and not row.tag.startswith("load") else ""
        return f"{noun}{row_tag(row)} of {circuit.tag if circuit is not None else '?'}"
    if isinstance(row, Site):
        return "the site"
    noun = {"instruments": "meter"}.get(table, table.removesuffix("s"))
    return f"{noun} {row_tag(row)}"


def row_words(row: Row | Site, index: Index) -> str:
    """What is known of a row, in a few words."""
    if isinstance(row, Site):
        return joined(row.address, f"limits {row.limits}", by=" · ")
    if isinstance(row, Source):
        volts = "" if row.nominal_voltage_v is None else show(row.nominal_voltage_v, "V")
        return joined(row.kind, volts, by=" · ") or "nothing else is known"
    if isinstance(row, Board):
        return joined(
            board_title(index, Feed("boards", row.id)).removeprefix(row.tag).strip(", "), row.location, by=" · "
        )
    if isinstance(row, Circuit):
        return joined(row.description, f"from {feed_words(index, row.fed_from)}", device_words(row), by=" · ")
    if isinstance(row, Run):
        length = "length not known" if row.one_way_length_m is None else show(row.one_way_length_m, "m")
        size = show_size(row.size) if row.size else "size not known"
        return joined(f"{row.from_point} to {index.end_of(row)}", length, size, row.material, by=" · ")
    if isinstance(row, Load):
        figures = ((row.current_a, "A"), (row.power_w, "W"), (row.resistance_ohm, "ohm"))
        drawn = [show(value, unit) for value, unit in figures if value is not None]
        return joined(f"at {row.point}", " / ".join(drawn) or "what it draws is not known", row.function, by=" · ")
    if isinstance(row, Instrument):
        unit = {"voltage": "V", "current": "A", "resistance": "ohm", "temperature": "degC"}.get(row.quantity, "")
        scale = "every value" if row.full_scale is None else f"to {show(row.full_scale, unit)}"
        percent = "accuracy not known" if row.accuracy_percent is None else f"± {row.accuracy_percent:g} %"
        return joined(row.quantity, scale, percent, by=" · ")
    return visit_words(row).removeprefix(row.tag).strip(", ") if isinstance(row, Visit) else ""
