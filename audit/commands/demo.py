"""``ohmwalk demo``: copy an invented sample site here and check it."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="demo")
@click.argument("name", required=False)
@click.option(
    "--to", "target", type=click.Path(path_type=Path), help="Folder to write; default: the site's name, here."
)
@click.option("--overwrite", is_flag=True, help="Replace an existing folder.")
def command(name: str | None, target: Path | None, overwrite: bool) -> None:
    """Copy a packaged sample site (default: the 48 V plant) here as a site folder and check it."""
    from audit.demo import copy_sample
    from audit.opening import judge_site, open_site
    from audit.report.text import print_check

    folder, fresh = copy_sample(name, target, overwrite)
    record = open_site(folder)
    print_check(record, judge_site(record))
    what = "an invented building, copied to" if fresh else "the earlier copy in"
    click.echo(f"This is {what} {folder}. Next: ohmwalk report {folder} --to audit.html", err=True)
