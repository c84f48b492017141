"""``ohmwalk tables``: the reference data in use, with source and status of each group."""

from __future__ import annotations

import click


@click.command(name="tables")
@click.argument("name", required=False)
def command(name: str | None) -> None:
    """List the tables of reference data and the limits profiles, or print the values of the one that is called NAME."""
    from audit.tables_text import print_table, print_tables

    if name is None:
        print_tables()
    else:
        print_table(name)
