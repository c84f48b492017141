"""What a report prints of sources, boards, meters and visits."""

from __future__ import annotations

from audit.report.blocks import Cell, Column, Table
from audit.report.phrases import visit_words
from audit.report.records import NOT_KNOWN, NOT_RECORDED, feed_words, joined, quantity
from rules.index import Index
from rules.record import Instrument, Site
from rules.units import show


def sources_table(site: Site, index: Index) -> Table | None:
    """One row a source; ``None`` where there is none."""
    rows: list[tuple[Cell, ...]] = [
        (
            source.tag,
            joined(
                source.kind,
                f"fed from {feed_words(index, source.fed_from)}" if source.fed_from else "",
                source.category,
            ),
            quantity(source, "nominal_voltage_v", source.nominal_voltage_v, "V"),
            show(source.working_voltage_v, "V")
            if source.working_voltage_v is not None
            else f"{quantity(source, 'nominal_voltage_v', source.nominal_voltage_v, 'V')} (nominal, assumed)",
            quantity(source, "lowest_voltage_v", source.lowest_voltage_v, "V"),
            quantity(source, "rated_current_a", source.rated_current_a, "A"),
            source.earthing or NOT_RECORDED,
            source.notes,
        )
        for source in index.walked_sources
    ]
    columns = (
        Column("Source", share=2), Column("Kind", share=3), Column("Nominal", "right", share=2),
        Column("Working", "right", share=2), Column("Lowest", "right", share=2), Column("Rating", "right", share=2),
        Column("Earthing", share=2), Column("Notes", share=4),
    )  # fmt: skip
    return Table(columns, tuple(rows), "Sources") if rows else None


def boards_table(index: Index) -> Table | None:
    """One row a board in walking order; ``None`` where there is none."""
    rows: list[tuple[Cell, ...]] = [
        (
            board.tag,
            " + ".join(feed_words(index, feed) for feed in board.fed_by) or NOT_KNOWN,
            quantity(board, "nominal_voltage_v", board.nominal_voltage_v, "V"),
            joined(board.location, board.category) or NOT_RECORDED,
            board.notes,
        )
        for board in index.walked_boards
    ]
    columns = (
        Column("Board", share=2), Column("Fed by", share=3), Column("Nominal", "right", share=2),
        Column("Location", share=3), Column("Notes", share=5),
    )  # fmt: skip
    return Table(columns, tuple(rows), "Boards") if rows else None


def instruments_table(site: Site) -> Table | None:
    """One row a range; ``None`` where no instrument is recorded."""
    rows: list[tuple[Cell, ...]] = [
        (
            row.tag,
            joined(row.quantity, f"to {show(row.full_scale, unit)}" if row.full_scale is not None else "any range"),
            NOT_KNOWN if row.accuracy_percent is None else f"{row.accuracy_percent:g} %",
            NOT_KNOWN if row.counts is None else f"{row.counts:g}",
            NOT_KNOWN if row.resolution is None else show(row.resolution, unit),
            joined(row.category, f"rated {show(row.rated_voltage_v, 'V')}" if row.rated_voltage_v is not None else "")
            or NOT_RECORDED,
            row.calibrated_until or NOT_RECORDED,
            joined(f"zero {show(row.zero, unit)}" if row.zero else "", row.notes),
        )
        for row in site.instruments
        for unit in (_instrument_unit(row),)
    ]
    columns = (
        Column("Meter", share=3), Column("Measures", share=4), Column("Accuracy", "right", share=2),
        Column("Counts", "right", share=2), Column("Resolution", "right", share=3), Column("Category", share=4),
        Column("Calibrated until", share=3), Column("Notes", share=5),
    )  # fmt: skip
    return Table(columns, tuple(rows), "Meters") if rows else None


def visits_words(site: Site) -> str:
    """Every visit with its date; visits that only readings name are said to be undescribed."""
    described = [visit_words(visit) for visit in site.visits]
    known = {visit.tag for visit in site.visits}
    others = dict.fromkeys(reading.visit_or_default for reading in site.readings)
    described += [f"{tag} (not described)" for tag in others if tag not in known]
    return "; ".join(described) or "none recorded"


def _instrument_unit(row: Instrument) -> str:
    return {"voltage": "V", "current": "A", "resistance": "ohm", "temperature": "degC"}.get(row.quantity, "")
