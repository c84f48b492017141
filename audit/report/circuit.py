"""One circuit in a report: what is said of it, what is installed, what was read."""

from __future__ import annotations

from audit.report.blocks import Block, Cell, Column, Facts, Paragraph, Section, Table
from audit.report.phrases import (
    doubt_rows,
    drop_words,
    extra_words,
    fault_is_likely,
    figure_words,
    heat_words,
    next_reading_words,
    peak_words,
    source_words,
    status_words,
    with_and_without,
)
from audit.report.records import circuit_facts, circuit_line, loads_table, readings_table, runs_table
from rules.assessment import CircuitResult, Place
from rules.index import Index
from rules.limits import Limits
from rules.record import Figure
from rules.verdict import probability_words

MOST_BESIDE = 6
"""Points that fit beside each other on a page."""


def circuit_section(
    index: Index, limits: Limits, result: CircuitResult, cards: tuple[Block, ...], visit: str | None
) -> Section:
    """One circuit: what is said of it, what is installed, what was read; ``visit`` alone where given."""
    circuit = index.circuits.get(result.circuit_id)
    blocks: list[Block] = [Facts(_verdict(result)), _drop(result), *cards]
    description = ""
    if circuit is not None:
        description = circuit.description
        parts = (
            circuit_line(index, circuit, result),
            circuit_facts(index, circuit, result),
            runs_table(index, circuit, limits),
            loads_table(index, circuit),
            _points(result),
            _margins(result),
            _doubts(result),
            _service(result),
            readings_table(index, circuit.id, visit),
        )
        blocks += [part for part in parts if part is not None]
        if not index.readings_of(circuit.id):
            blocks.append(Paragraph("No reading was taken."))
    title = " · ".join(text for text in (result.circuit, description, status_words(result.status)) if text)
    return Section(title, tuple(blocks), level=3)


def _verdict(result: CircuitResult) -> tuple[tuple[str, str], ...]:
    status = status_words(result.status)
    rows = [("Status", f"{status}: {result.why}" if result.why else status)]
    if result.drop is None and result.visit:
        rows.append(("Judged on", f"visit {result.visit}"))
    for place in result.causes:
        rows.append(_cause(place))
        heat = result.heat_of(place)
        rows += [
            ("heat", heat_words(heat) if heat is not None else ""),
            ("for", "; ".join(place.speaks_for)),
            ("against", "; ".join(place.speaks_against)),
        ]
    if fault_is_likely(result):
        rows += [("At worst", with_and_without(margin)) for margin in result.margins]
    if (following := result.next_reading) is not None:
        said = next_reading_words(following)
        rows.append(("Read next", f"{said}: {following.why}" if following.why else said))
        rows.append(("Caution", following.caution))
    return tuple((label, text) for label, text in rows if text)


def _drop(result: CircuitResult) -> Table:
    """The bar with its figures: of the round that is judged, and computed at design current."""
    words = drop_words(result)
    rows: list[tuple[Cell, ...]] = []
    if (drop := result.drop) is not None:
        rows.append(
            (
                words.bar or "",
                _lines(figure_words(drop.measured), words.of_allowed),
                _lines(figure_words(drop.computed), words.computed),
                figure_words(drop.excess),
                f"{result.visit}, round {drop.round}, by {drop.by}\n"
                f"{drop.start} to {drop.end}, {figure_words(drop.current)}",
            )
        )
    if result.design_drop is not None:
        beside = words if drop is None else None
        rows.append(
            (
                beside.bar or "" if beside else "",
                beside.of_allowed if beside else "",
                _lines(figure_words(result.design_drop), beside.computed if beside else ""),
                "",
                "at design current, from the board",
            )
        )
    columns = (
        Column("Drop", share=3), Column("Measured", share=3), Column("Computed", share=3),
        Column("Difference", share=3), Column("State", share=6),
    )  # fmt: skip
    return Table(columns, tuple(rows) or (("", words.of_allowed, "not known", "", ""),))


def _doubts(result: CircuitResult) -> Table | None:
    """The doubt budget of the difference; ``None`` where no drop was compared."""
    if result.drop is None or not result.drop.budget:
        return None
    rows: tuple[tuple[Cell, ...], ...] = tuple(
        (row.name, row.adds, row.share, row.bar or "", row.stated) for row in doubt_rows(result.drop)
    )
    columns = (
        Column("Doubt of the difference", share=3), Column("Adds", "right", share=2), Column("Of u²", "right", share=2),
        Column("", share=3), Column("Stated by", share=4),
    )  # fmt: skip
    return Table(columns, rows)


def _lines(*texts: str) -> str:
    """Different texts, one a line."""
    return "\n".join(dict.fromkeys(text for text in texts if text))


def _cause(place: Place) -> tuple[str, str]:
    """Its probability, then the cause with its place and extra resistance."""
    said = ", ".join(part for part in (f"{place.cause} {place.where}".strip(), extra_words(place)) if part)
    return probability_words(place.probability), said


def _service(result: CircuitResult) -> Table | None:
    """What each run carries at design, what it may carry, and how warm that makes it; ``None`` without runs."""
    rows: list[tuple[Cell, ...]] = [
        (
            each.run,
            "not known" if each.current is None else figure_words(each.current),
            "not known" if each.ampacity is None else figure_words(each.ampacity),
            "not known" if each.temperature is None else figure_words(each.temperature),
            _lines(each.basis, f"assumed: {', '.join(each.assumed)}" if each.assumed else "", each.gap),
        )
        for each in result.service
    ]
    columns = (
        Column("In service at design"), Column("Current", "right"), Column("Capacity", "right"),
        Column("Conductor", "right"), Column("From", share=5),
    )  # fmt: skip
    return Table(columns, tuple(rows)) if rows else None


def _margins(result: CircuitResult) -> Table | None:
    """What is left between each load's worst voltage and its lowest; ``None`` where no load's is known."""
    if all(each.margin is None and each.below_highest is None and each.dip is None for each in result.margins):
        return None

    def words(figure: Figure | None) -> str:
        return "not known" if figure is None else figure_words(figure)

    rows: list[tuple[Cell, ...]] = []
    for each in result.margins:
        kept = (words(each.lowest), words(each.margin), words(each.below_highest))
        rows.append((f"{each.load}, {each.point}", words(each.design), words(each.worst), *kept))
        if each.peak is not None:
            dips = (words(each.dip), words(each.dip_worst), words(each.lowest), words(each.dip_margin), "")
            rows.append((f"{each.load}, {peak_words(each)}", *dips))
    if said := source_words(result.margins):
        rows.append((said,))
    columns = (
        Column("Margin of each load", share=4), Column("At design", "right"), Column("At worst", "right"),
        Column("Its lowest", "right"), Column("Margin", "right"), Column("Below its highest", "right"),
    )  # fmt: skip
    return Table(columns, tuple(rows))


def _points(result: CircuitResult) -> Table | None:
    """
    Computed voltages of the points; few points stand beside each other, as on the line.

    ``None`` where the line says it all: only the design voltages are known.
    """
    if all(point.worst is None and point.lowest is None for point in result.points):
        return None
    names = ("At design", "At worst", "Load's lowest")
    by_point = [
        tuple("" if f is None else figure_words(f) for f in (point.design, point.worst, point.lowest))
        for point in result.points
    ]
    kept = [place for place in range(len(names)) if any(texts[place] for texts in by_point)]
    rows: list[tuple[Cell, ...]]
    if len(result.points) <= MOST_BESIDE:
        columns = (Column("Computed"), *(Column(point.point, "right") for point in result.points))
        rows = [(names[place], *(texts[place] for texts in by_point)) for place in kept]
        return Table(columns, tuple(rows))
    columns = (Column("Computed at"), *(Column(names[place], "right") for place in kept))
    rows = [
        (point.point, *(texts[place] for place in kept)) for point, texts in zip(result.points, by_point, strict=True)
    ]
    return Table(columns, tuple(rows))
