"""A site file as commands meet it: what was given as SITE is opened, or refused in one line."""

from __future__ import annotations

from pathlib import Path

from audit.errors import WrongUse
from db.connection import SUFFIX
from db.errors import BadFileName, NoSuchSite
from db.store import SiteStore


def site_file(path: Path, *, read_only: bool = True, laptop: str = "") -> SiteStore:
    """
    Open a site file.

    Raises
    ------
    WrongUse
        If it is a folder, which may be a site but is no site file, or a pipe or a device.
    SiteError
        If it is not there, no site file, damaged or newer, or may not be written where it is to be.
    """
    if path.is_dir():
        raise WrongUse(f"{path} is a folder; accepted: a site file, which intake makes of a site folder")
    if path.exists() and not path.is_file():  # opened, a pipe would wait for a writer
        raise WrongUse(f"{path} is a pipe or a device; accepted: a site file")
    return SiteStore(path, read_only=read_only, laptop=laptop)


def check_new(path: Path) -> None:
    """
    Refuse a path at which no site file can be made, before any work is done for it.

    Raises
    ------
    SiteError
        If its name has another ending, or its folder is not there.
    """
    if path.suffix != SUFFIX:
        raise BadFileName(path, f"the name of a site file ends in {SUFFIX}")
    if not path.absolute().parent.is_dir():
        raise NoSuchSite(path, "there is no such folder")
