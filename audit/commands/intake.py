"""``ohmwalk intake``: take a site folder, or single tables, into a site file."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="intake")
@click.argument("site", type=click.Path(path_type=Path))
@click.argument("sources", metavar="FOLDER|FILE…", nargs=-1, required=True, type=click.Path(path_type=Path))
@click.option("--dry-run", is_flag=True, help="Say what would change, and write nothing.")
@click.option("--replace", "replacing", is_flag=True, help="Take values that differ from those in the site file.")
@click.option("--by", metavar="NAME", help="Who saves.")
def command(site: Path, sources: tuple[Path, ...], dry_run: bool, replacing: bool, by: str | None) -> None:
    """
    Take a site folder, or tables as CSV or XLSX files named like the table, into the site file SITE: all of it, or
    nothing and a line for each problem.

    SITE is made if it is not there. Rows equal to those in it change nothing; a row that differs is refused with both
    values, or taken with --replace. A reading is never overwritten: with --replace a further one replaces it. A
    column that a table lacks says nothing about the rows in SITE; an empty cell says "not known".
    """
    from audit.intake.into_file import take_in
    from audit.intake.summary import summary
    from audit.settings import UserSettings
    from audit.terminal import Progress
    from rules.text import clean

    settings, is_new = UserSettings(by), not site.exists()
    with Progress(sources) as progress:
        outcome = take_in(
            site,
            sources,
            who=settings.who_or_login,
            laptop="" if dry_run else settings.laptop,
            replacing=replacing,
            dry_run=dry_run,
            stage=progress.stage,
        )
    for line in summary(site, outcome, dry_run):
        click.echo(line)
    if is_new and not dry_run:
        settings.opened(site)
        click.echo(clean(f"Next: ohmwalk check {site}"), err=True)
    settings.tell()
