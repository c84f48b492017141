"""
A site folder to a site: all of it, or a line for everything that is wrong with it.

``read_folder`` reads files, ``site_of`` the same from plain texts; both go one way (``audit.intake.incoming``).
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from pathlib import Path

from audit.errors import IntakeRefused
from audit.intake.given import Given, given_folder, given_texts
from audit.intake.incoming import Incoming
from db.tables import no_collection
from rules.record import Site


def read_folder(path: Path) -> Site:
    """
    Read a site folder.

    Parameters
    ----------
    path : Path
        A folder with ``site.toml`` and the tables as CSV files or as sheets of XLSX workbooks.

    Raises
    ------
    IntakeRefused
        With a line for every problem; nothing is written in any case.
    """
    given = given_folder(path)
    if given.settings is None:  # no folder at all
        raise IntakeRefused(given.faults.lines())
    return _site(given, check=True)


def site_of(
    tables: Mapping[str, Iterable[Mapping[str, str]]],
    settings: Mapping[str, object] | None = None,
    check: bool = True,
) -> Site:
    """
    Make a site of texts, as if they stood in a site folder.

    Parameters
    ----------
    tables : dict
        By table, its rows: header (``length [ft]`` counts) and text of each cell. A key that a row lacks is
        an empty cell. No table is required.
    settings : dict, optional
        As in ``site.toml``; without it the site is named ``site``.
    check : bool
        Ask ``rules.consistency`` too; without it only what cannot be read is refused.

    Raises
    ------
    IntakeRefused
        With a line for every problem, named as if the tables were CSV files.
    """
    return _site(given_texts(tables, settings), check)


def _site(given: Given, check: bool) -> Site:
    with no_collection():
        incoming = Incoming(given)
        site = incoming.site
        if check:
            incoming.judge(site)
    if incoming.faults.found:
        raise IntakeRefused(incoming.faults.lines())
    return site
