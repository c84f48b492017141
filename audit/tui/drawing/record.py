"""What is installed on a circuit, in lines: device, runs, loads, what it feeds."""

from __future__ import annotations

from audit.report.blocks import Table
from audit.report.records import circuit_facts, loads_table, runs_table
from audit.tui.drawing.pieces import Line, piece, wrapped
from rules.assessment import CircuitResult
from rules.index import Index
from rules.limits import Limits
from rules.record import Circuit

_LABEL = 21


def record_lines(index: Index, circuit: Circuit, result: CircuitResult, limits: Limits, width: int) -> list[Line]:
    """The circuit's own row, its runs and its loads, each value with its provenance."""
    lines: list[Line] = []
    for label, text in circuit_facts(index, circuit, result).rows:
        lines += wrapped(text, width - 1, _LABEL + 3, "", f"   {label}")
    fed = ", ".join(row.tag for row in index.fed_by_circuit(circuit.id))
    if fed:
        lines += wrapped(fed, width - 1, _LABEL + 3, "", "   Feeds")
    for name, table in (("run", runs_table(index, circuit, limits)), ("load", loads_table(index, circuit))):
        lines += _table_lines(name, table, width)
    return lines


def _table_lines(name: str, table: Table | None, width: int) -> list[Line]:
    """Each row as its name, then what is known of it in running text."""
    if table is None:
        return wrapped(f"no {name} is recorded", width - 1, 3, "incomplete")
    lines: list[Line] = []
    for row in table.rows:
        first, *others = (cell if isinstance(cell, str) else "" for cell in row)
        title = f"run {first}" if name == "run" else first
        lines.append((piece(f"   {title}", "strong"),))
        lines += wrapped(" · ".join(text for text in others if text), width - 1, 6)
    return lines
