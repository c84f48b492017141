"""``ohmwalk history``: who changed what in a site file, and when."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="history")
@click.argument("site", type=click.Path(path_type=Path))
@click.option("--circuit", metavar="TAG", help="Only what was done to this circuit, its runs, loads and readings.")
def command(site: Path, circuit: str | None) -> None:
    """Who changed what in the site file SITE and when, the earliest first, with what was there before."""
    from audit.history_text import print_history
    from audit.site_file import site_file

    with site_file(site) as store:
        print_history(store, circuit)
