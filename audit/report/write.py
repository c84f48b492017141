"""Write a report: the target's ending chooses the form, and a reader never sees half a file."""

from __future__ import annotations

import contextlib
import os
import secrets
from collections.abc import Callable
from pathlib import Path

from audit.errors import TargetExists, WriteFailed, WrongUse
from audit.report.blocks import Content
from audit.report.content import AUDIENCES, content_of
from audit.report.csv import csv_report
from audit.report.html import html_report
from audit.report.json import json_report
from audit.report.markdown import markdown_report
from rules.assessment import Assessment
from rules.record import Site
from rules.text import either, nearest, quoted

FORMS: dict[str, Callable[[Content], str]] = {
    ".html": html_report,
    ".md": markdown_report,
    ".csv": csv_report,
    ".json": json_report,
}
"""The forms of a report by the ending of its file."""


def check_target(target: Path, overwrite: bool) -> None:
    """
    Refuse a target before any work is done for it.

    Raises
    ------
    WrongUse
        If its ending names no form.
    TargetExists
        If something stands there and may not be replaced.
    WriteFailed
        If its folder is not there, or it is a folder itself.
    """
    ending = target.suffix.lower()
    if ending not in FORMS:
        shown = f"the ending {quoted(ending)}" if ending else f"{quoted(target.name)} without an ending"
        near = nearest(ending, FORMS)
        hint = "" if near is None else f", did you mean {quoted(near)}?"
        raise WrongUse(f"no report has {shown}{hint}; accepted: {either(list(FORMS))}")
    if target.is_dir():
        raise WriteFailed(f"{quoted(str(target))} is a folder; accepted: the name of a file")
    if ending in (".csv", ".xlsx") and (target.parent / "site.toml").is_file():
        raise WrongUse(
            f"{quoted(str(target))} would lie among a site's tables; accepted: a place outside the site folder"
        )
    if not overwrite and os.path.lexists(target):
        raise TargetExists(target)
    if not target.parent.is_dir():
        raise WriteFailed(f"the folder {quoted(str(target.parent))} is not there; make it first")


def write_report(
    site: Site,
    assessment: Assessment,
    target: Path,
    audience: str = "inspector",
    *,
    overwrite: bool = False,
    made_at: str | None = None,
) -> None:
    """
    Write the report of a site to a file.

    Parameters
    ----------
    audience : str
        One of ``AUDIENCES``.
    made_at : str or None
        Date and time to print; none is taken from the clock.

    Raises
    ------
    WrongUse
        If the audience or the ending is unknown.
    TargetExists, WriteFailed
        If it cannot be written there; what stood there before still does.
    """
    if audience not in AUDIENCES:
        near = nearest(audience, AUDIENCES)
        hint = "" if near is None else f", did you mean {quoted(near)}?"
        raise WrongUse(f"no report is for {quoted(audience)}{hint}; accepted: {either(AUDIENCES)}")
    check_target(target, overwrite)
    form = FORMS[target.suffix.lower()]
    text = form(content_of(site, assessment, audience, made_at))
    _put(target, text.encode("utf-8"))


def _put(target: Path, data: bytes) -> None:
    """Write beside the target, then move into place: a full disk leaves what was there."""
    beside = target.with_name(f".{target.name[:100]}.{secrets.token_hex(4)}.part")
    try:
        with beside.open("xb") as file:
            file.write(data)
            file.flush()
            os.fsync(file.fileno())
        beside.replace(target)
    except OSError as error:
        with contextlib.suppress(OSError):
            beside.unlink(missing_ok=True)
        raise WriteFailed(f"{quoted(str(target))} could not be written: {error.strerror or error}") from error
