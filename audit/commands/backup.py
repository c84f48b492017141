"""``ohmwalk backup``: copy a site file, safe while others save in it."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="backup")
@click.argument("site", type=click.Path(path_type=Path))
@click.option("--to", "target", type=click.Path(path_type=Path), help="Default: SITE with date and time, beside it.")
@click.option("--overwrite", is_flag=True, help="Replace an existing file.")
def command(site: Path, target: Path | None, overwrite: bool) -> None:
    """Copy the site file SITE with its whole history; safe at any moment, while others save too."""
    from datetime import datetime

    from audit.site_file import site_file
    from rules.text import clean

    if target is None:
        target = site.with_name(f"{site.stem}-{datetime.now():%Y%m%d-%H%M%S}{site.suffix}")
    with site_file(site) as store:
        store.backup(target, overwrite=overwrite)
    click.echo(clean(f"wrote {target}"), err=True)
