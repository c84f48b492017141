"""
The HTML form: one self-contained file without script that prints on A4.

The template escapes every text; only the drawings of ``bar`` and ``line`` are put in as markup, and they
escape their own. The page forbids scripts and outside content besides.
"""

from __future__ import annotations

import re
from html import escape
from importlib.resources import files
from typing import TYPE_CHECKING, Any

from audit.report.bar import Bar, svg_bar
from audit.report.blocks import Content, Line, Table
from audit.report.line import svg_line
from rules.text import clean

if TYPE_CHECKING:
    from markupsafe import Markup


_RIGHT_TO_LEFT = "\u0590-\u08ff\ufb1d-\ufdff\ufe70-\ufefc\U00010800-\U00010fff\U0001e800-\U0001eeff"
"""Letters of scripts that run from right to left."""

_RUN = re.compile(rf"[{_RIGHT_TO_LEFT}](?:[\s\d'’-]*[{_RIGHT_TO_LEFT}])*")


def html_report(content: Content) -> str:
    """The report as an HTML page."""
    # jinja2 is slow to import, and this form alone needs it.
    from jinja2 import Environment, StrictUndefined

    environment = Environment(autoescape=True, undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True)
    environment.filters |= {
        "bar": _bar,
        "line": _line,
        "kind": _kind,
        "widths": _widths,
        "clean": clean,
        "isolated": _isolated,
    }
    template = environment.from_string(_file("report.html.jinja"))
    return template.render(content=content, style=_markup(_file("report.css")))


def _file(name: str) -> str:
    return files("audit.report").joinpath(name).read_text(encoding="utf-8")


def _markup(text: str) -> Markup:
    from markupsafe import Markup

    return Markup(text)


def _isolated(text: str) -> Markup:
    """
    A text, escaped, in which words that run from right to left keep to themselves.

    Without that, a date or figure behind such a word changes its place, and 2026-03-02 is read from its end.
    """
    return _markup(_RUN.sub(lambda run: f"<bdi>{run.group()}</bdi>", escape(text)))


def _bar(bar: Bar) -> Markup:
    return _markup(svg_bar(bar))


def _line(line: Line) -> Markup:
    return _markup(svg_line(line))


def _kind(value: Any) -> str:
    return type(value).__name__


def _widths(table: Table) -> list[float]:
    """Width of each column in percent."""
    total = sum(column.share for column in table.columns)
    return [round(100 * column.share / total, 2) for column in table.columns]
