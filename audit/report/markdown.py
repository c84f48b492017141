"""
The Markdown form (CommonMark with pipe tables).

What came from the site can become neither markup nor HTML nor a link: every character that could is
escaped, and so is what could make a link of a bare address.
"""

from __future__ import annotations

import re
from collections.abc import Iterator

from audit.report.bar import Bar, text_bar
from audit.report.blocks import Blanks, Block, Bullets, Cell, Content, Facts, FindingCard, Line, Paragraph, Table
from audit.report.line import text_line

_ENTITIES = {"&": "&amp;", "<": "&lt;", ">": "&gt;"}
_SPECIAL = re.compile(r"[\\`*_{}\[\]#|@$^]|~(?=\S)|(?<=\S)~")
_COLON = re.compile(r":(?=[^\s0-9])")
_ADDRESS = re.compile(r"\b(www)\.", re.IGNORECASE)
_LINE_START = re.compile(r"^([-+=])|^(\d+)([.)])(?=\s|$)")


def markdown_report(content: Content) -> str:
    """The report as Markdown text."""
    lines = [f"# {escaped(content.title)}", ""]
    for section in content.sections:
        lines += [f"{'#' * (section.level + 1)} {escaped(section.title)}", ""]
        for block in section.blocks:
            lines += [*_block(block), ""]
    return "\n".join(lines).rstrip("\n") + "\n"


def escaped(text: str) -> str:
    r"""
    Text in one line that Markdown shows as it is.

    >>> escaped("run_2 <b>*50 %*</b> | [x](http://y)")
    'run\\_2 &lt;b&gt;\\*50 %\\*&lt;/b&gt; \\| \\[x\\](http\\://y)'
    """
    # splitlines knows every line break; a newline would end the paragraph or the table's row.
    text = " ".join(line.strip() for line in text.splitlines())
    text = _SPECIAL.sub(lambda match: "\\" + match.group(), text)
    text = "".join(_ENTITIES.get(letter, letter) for letter in text)
    text = _ADDRESS.sub(r"\1\\.", _COLON.sub(r"\\:", text))
    return _LINE_START.sub(lambda match: f"\\{match[1]}" if match[1] else f"{match[2]}\\{match[3]}", text)


def _block(block: Block) -> Iterator[str]:
    match block:
        case Paragraph():
            text = "  \n".join(escaped(line) for line in block.text.splitlines() if line.strip())
            yield f"**{text}**" if block.tone == "caution" and "\n" not in text else text
        case Bullets():
            for text in block.texts:
                yield f"- {escaped(text)}"
        case Facts():
            for label, text in block.rows:
                yield f"- **{escaped(label)}:** {escaped(text)}"
        case Table():
            yield from _table(block)
        case Line():
            yield from _literal([" ".join(text_line(path).split()) for path in block.paths])
        case FindingCard():
            yield f"**{escaped(str(block.severity))}: {escaped(block.title)}**"
            yield ""
            for label, text in block.rows:
                yield f"- **{escaped(label)}:** {escaped(text)}"
            yield f"- **Finding:** {escaped(block.id)}"
        case Blanks():
            yield "| | Name | Date | Signature |"
            yield "| --- | --- | --- | --- |"
            for label in block.labels:
                yield f"| {escaped(label)} | | | |"


def _literal(lines: list[str]) -> Iterator[str]:
    """Lines shown as they are, in a fence that none of them can close."""
    longest = max((len(run) for line in lines for run in re.findall("`+", line)), default=0)
    fence = "`" * max(3, longest + 1)
    yield from (fence, *lines, fence)


def _table(table: Table) -> Iterator[str]:
    if table.caption:
        yield f"*{escaped(table.caption)}*"
        yield ""
    yield _row([escaped(column.name) for column in table.columns])
    yield _row(["---:" if column.align == "right" else "---" for column in table.columns])
    for row in table.rows:
        cells = [_cell(cell) for cell in row]
        if len(cells) == 1 and len(table.columns) > 1:
            cells[0] = f"**{cells[0]}**"
        yield _row(cells + [""] * (len(table.columns) - len(cells)))


def _row(cells: list[str]) -> str:
    return f"| {' | '.join(cells)} |"


def _cell(cell: Cell) -> str:
    return text_bar(cell) if isinstance(cell, Bar) else escaped(cell)
