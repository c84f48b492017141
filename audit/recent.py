"""``ohmwalk`` alone: the site files opened last, and one of them opened."""

from __future__ import annotations

from collections.abc import Sequence

import click

from audit.errors import WrongUse
from audit.settings import RecentSite, UserSettings
from audit.terminal import is_terminal
from rules.text import clean

_NOTHING = "No site file was opened yet. Next: ohmwalk demo, or ohmwalk survey NAME.ohmwalk --new"


def choose_recent() -> int:
    """
    List the recent site files; in a terminal, ask for one and open it. The exit status is given back.

    Raises
    ------
    WrongUse
        If the answer is none of them.
    """
    settings = UserSettings()
    sites = settings.recent()
    settings.tell()
    if not sites:
        click.echo(_NOTHING)
        return 0
    for number, site in enumerate(sites, 1):
        click.echo(f"{number:>3}  {clean(str(site.path))}{'' if site.is_there else '  (not there now)'}")
    if is_terminal():
        only = len(sites) == 1
        asked = "Enter to open it, or 0 for none" if only else "Number to open, or Enter for none"
        answer = click.prompt(asked, default="1" if only else "", show_default=False).strip()
        if answer and not (only and answer == "0"):
            from audit.interface import open_interface

            return open_interface(_chosen(answer, sites).path, settings)
    return 0


def _chosen(answer: str, sites: Sequence[RecentSite]) -> RecentSite:
    if not answer.isascii() or not answer.isdigit() or not 1 <= int(answer[:9]) <= len(sites):
        raise WrongUse(f"{clean(answer)[:40]!r} is none of them; accepted: a number from 1 to {len(sites)}")
    return sites[int(answer) - 1]
