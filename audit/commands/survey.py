"""``ohmwalk survey``: open the terminal interface on a site file."""

from __future__ import annotations

from pathlib import Path

import click


@click.command(name="survey")
@click.argument("site", type=click.Path(path_type=Path))
@click.option("--new", is_flag=True, help="Make the site file first.")
@click.option("--by", metavar="NAME", help="Who saves.")
def command(site: Path, new: bool, by: str | None) -> int:
    """Open the terminal interface on the site file SITE."""
    from audit.interface import make_site, open_interface, refuse_without_terminal
    from audit.settings import UserSettings

    settings = UserSettings(by)
    refuse_without_terminal(f"ohmwalk check {site}")
    if new:
        make_site(site, settings)
    return open_interface(site, settings)
