"""The JSON form: the object of ``check --json`` with the report's content under ``report``."""

from __future__ import annotations

from typing import Any

from audit.report.as_json import Json, as_json, as_text
from audit.report.bar import Bar
from audit.report.blocks import (
    Blanks,
    Block,
    Bullets,
    Cell,
    Content,
    Facts,
    FindingCard,
    Line,
    Paragraph,
    Section,
    Table,
)
from audit.report.line import text_line


def json_report(content: Content) -> str:
    """The report as JSON text."""
    return as_text(document(content))


def document(content: Content) -> Json:
    """The object that is written; it validates against the schema of ``check --json``."""
    report: dict[str, Any] = {"for": content.audience}
    if content.made_at is not None:
        report["made_at"] = content.made_at
    report["title"] = content.title
    report["sections"] = [_section(section) for section in content.sections]
    return {**as_json(content.assessment), "report": report}


def _section(section: Section) -> Json:
    return {
        "title": section.title,
        "level": section.level,
        "blocks": [_block(block) for block in section.blocks],
    }


def _block(block: Block) -> Json:
    match block:
        case Paragraph():
            return {"kind": "paragraph", "tone": block.tone, "texts": [block.text]}
        case Bullets():
            return {"kind": "list", "tone": block.tone, "texts": list(block.texts)}
        case Facts():
            return {"kind": "facts", "rows": [list(row) for row in block.rows]}
        case Table():
            return {
                "kind": "table",
                "caption": block.caption,
                "columns": [column.name for column in block.columns],
                "rows": [[_cell(cell) for cell in row] for row in block.rows],
            }
        case Line():
            return {"kind": "line", "paths": [text_line(path) for path in block.paths]}
        case FindingCard():
            return {
                "kind": "finding",
                "id": block.id,
                "severity": str(block.severity),
                "title": block.title,
                "rows": [list(row) for row in block.rows],
            }
        case Blanks():
            return {"kind": "blanks", "labels": list(block.labels)}


def _cell(cell: Cell) -> str:
    return cell.words if isinstance(cell, Bar) else cell
