"""The way from the command line into the terminal interface."""

from __future__ import annotations

import importlib
from pathlib import Path

from audit.errors import WrongUse
from audit.settings import UserSettings
from audit.site_file import check_new, site_file
from audit.terminal import is_terminal
from db.errors import NoSuchSite
from db.store import SiteStore


def refuse_without_terminal(instead: str) -> None:
    """
    Refuse to open the interface where there is no terminal.

    Raises
    ------
    WrongUse
        With the command that serves instead.
    """
    if not is_terminal():
        raise WrongUse(f"the terminal interface needs a terminal; accepted: a terminal, or {instead}")


def make_site(path: Path, settings: UserSettings) -> None:
    """
    Make an empty site file, named like the file.

    Raises
    ------
    SiteError
        If there is something of that name already, or it cannot be written.
    """
    check_new(path)
    SiteStore.create(path, None, settings.who_or_login, settings.laptop, "new site file").close()


def open_interface(path: Path, settings: UserSettings) -> int:
    """
    Open the terminal interface on a site file, and come back when it is left, with its exit status.

    Raises
    ------
    SiteError
        If it is no site file, before any screen is drawn.
    """
    try:
        site_file(path).close()
    except NoSuchSite as error:
        raise WrongUse(f"{error}; accepted: a site file, or --new, which makes it") from None
    settings.opened(path)
    # The toolkit takes half a second to load: only whoever opens the interface waits for it.
    status: int = importlib.import_module("audit.tui.run").run_survey(path, settings)
    settings.tell()
    return status
