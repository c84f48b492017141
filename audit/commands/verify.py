"""``ohmwalk verify``: whether a site file is whole."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="verify")
@click.argument("site", type=click.Path(path_type=Path))
def command(site: Path) -> None:
    """
    Look through the whole site file SITE: what SQLite can check, the digest of every save, and whether the tables are
    what the journal comes to. Exit status 3 where anything is wrong.
    """
    from audit.errors import SiteDamaged
    from audit.site_file import site_file
    from rules.text import clean

    with site_file(site) as store:
        wrong = store.verify()
        record = None if wrong else store.site()
    if record is None:
        raise SiteDamaged(*(f"{clean(str(site))}: {clean(line)}" for line in wrong))
    click.echo(f"{clean(str(site))}: whole; {len(record.circuits):,} circuits, {len(record.readings):,} readings")
