"""The text of ``ohmwalk tables``."""

from __future__ import annotations

from rich.table import Table
from rich.text import Text

from audit.console import PlainConsole
from audit.errors import WrongUse
from rules.tables.loader import Group, groups
from rules.text import nearest


def print_tables() -> None:
    """One entry a group: name, title, and where it comes from."""
    console = PlainConsole()
    for group in groups():
        console.print(Text(group.name, style="bold"), Text(group.title))
        console.print(Text(f"    {_origin(group)}", style="dim"))
    console.print(Text("\nohmwalk tables NAME prints the values of one."))


def print_table(name: str) -> None:
    """All values of one group."""
    known = {group.name: group for group in groups()}
    if name not in known:
        close = nearest(name, list(known))
        meant = f"; did you mean {close!r}?" if close else ""
        raise WrongUse(f"no table {name!r}{meant}; there are: {', '.join(known)}")
    group = known[name]
    console = PlainConsole()
    console.print(Text(group.title, style="bold"))
    console.print(Text(_origin(group)))
    if group.unit:
        console.print(Text(f"unit: {group.unit}"))
    table = Table(box=None, pad_edge=False)
    for title in group.columns:
        table.add_column(title)
    for row in group.rows:
        table.add_row(
            *(Text("–" if cell is None else cell if isinstance(cell, str) else f"{cell:.10g}") for cell in row)
        )
    console.print(table)
    if group.note:
        console.print(Text(group.note))


def _origin(group: Group) -> str:
    edition = f", {group.edition}" if group.edition else ""
    return f"{group.source}{edition} · {group.status}"
