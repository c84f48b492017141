"""``ohmwalk unload``: write a site file as a site folder."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="unload")
@click.argument("site", type=click.Path(path_type=Path))
@click.argument("folder", type=click.Path(path_type=Path))
@click.option("--overwrite", is_flag=True, help="Replace a site folder that is there.")
def command(site: Path, folder: Path, overwrite: bool) -> None:
    """Write the whole record of the site file SITE as a site folder, from which intake makes an equal site."""
    from audit.site_file import site_file
    from audit.unload import unload
    from rules.consistency import problems
    from rules.text import clean

    with site_file(site) as store:
        record = store.site()
    unload(record, folder, overwrite=overwrite)
    click.echo(clean(f"wrote {folder}; journal, signatures and drafts stay in {site}"), err=True)
    if wrong := len(problems(record)):
        click.echo(
            f"cells that do not hold together: {wrong:,}; intake would name them, as ohmwalk check does", err=True
        )
