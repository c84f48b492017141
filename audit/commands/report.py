"""``ohmwalk report``: write the audit report of a site."""

from __future__ import annotations

from pathlib import Path

import click

AUDIENCES = ("electrician", "inspector", "supervisor")
"""As in ``audit.report.content``, which help must not import; a test holds them equal."""


@click.command(name="report")
@click.argument("site", type=click.Path(path_type=Path))
@click.option("--to", "target", required=True, type=click.Path(path_type=Path), help="Its ending chooses the form.")
@click.option("--for", "audience", type=click.Choice(AUDIENCES), default="inspector", show_default=True)
@click.option("--visit", metavar="NAME", help="Judge on this visit instead of the latest.")
@click.option("--overwrite", is_flag=True, help="Replace an existing file.")
def command(site: Path, target: Path, audience: str, visit: str | None, overwrite: bool) -> None:
    """Write the audit report of SITE, a site file or a site folder: .html, .md, .csv or .json."""
    from datetime import datetime

    from audit.opening import judge_site, open_site, settings_place
    from audit.report.write import check_target, write_report
    from rules.text import clean

    check_target(target, overwrite)
    record = open_site(site)
    made_at = datetime.now().astimezone().strftime("%Y-%m-%d %H:%M %z")
    assessment = judge_site(record, visit, settings_place(site), explain=audience != "supervisor")
    write_report(record, assessment, target, audience, overwrite=overwrite, made_at=made_at)
    click.echo(clean(f"wrote {target}"), err=True)
