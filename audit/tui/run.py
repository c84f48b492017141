"""The way in: open a site file in the terminal interface."""

from __future__ import annotations

from pathlib import Path

from audit.tui.app import OhmwalkApp
from audit.tui.settings import UserSettings
from db.errors import SiteReadOnly
from db.store import SiteStore


def run_survey(site_file: Path, settings: UserSettings) -> int:
    """
    Open a site file and leave when the person does.

    Returns
    -------
    int
        The exit status: 0, or 70 where the program met a fault of its own.

    Raises
    ------
    SiteError
        If the file cannot be opened: before the screen is touched, so that one line can be printed.
    """
    try:
        SiteStore(site_file, laptop=settings.laptop).close()
    except SiteReadOnly:
        SiteStore(site_file, read_only=True).close()
    app = OhmwalkApp(site_file, settings)
    app.run()
    return 70 if app.return_code else 0
