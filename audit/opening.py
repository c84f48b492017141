"""Opening what a command was given as SITE, and judging it."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

from audit.errors import WrongUse
from audit.intake.folder import read_folder
from audit.site_file import site_file
from rules import limits
from rules.assess import assess
from rules.assessment import Assessment
from rules.errors import ProfileError
from rules.limits import Limits
from rules.record import Site
from rules.text import nearest


def open_site(path: Path) -> Site:
    """
    The record of a site file or a site folder; a file is only read, its bytes are left alone.

    Raises
    ------
    IntakeRefused
        If it is a folder that does not hold together.
    SiteError
        If it is a file, but none of a site, or there is nothing of that name.
    """
    if path.is_dir():
        return read_folder(path)
    with site_file(path) as store:
        return store.site()


def settings_place(path: Path) -> str:
    """Where the settings of what ``open_site`` opened stand: ``site.toml``, or the site file."""
    return "site.toml" if path.is_dir() else str(path)


def judge_site(site: Site, visit: str | None = None, place: str = "site.toml", *, explain: bool = False) -> Assessment:
    """
    Assess a site, on one visit if named.

    Parameters
    ----------
    site : Site
        The record.
    visit : str, optional
        The visit to judge on; each circuit's latest unless named.
    place : str
        Where the settings stand, for what is wrong with the limits that they name.
    explain : bool
        Whether causes say what speaks for and against each.

    Raises
    ------
    WrongUse
        If the visit or the limits profile is not there.
    """
    if visit is not None:
        known = list(dict.fromkeys([row.tag for row in site.visits] + [r.visit_or_default for r in site.readings]))
        if visit not in known:
            raise WrongUse(f"--visit: no visit {visit!r}{_meant(visit, known)}")
        site = on_visit(site, visit)
    return assess(site, limits_in_force(site, place), explain)


def limits_in_force(site: Site, place: str = "site.toml") -> Limits:
    """
    The limits in force for a site; what is wrong with them stands where they are named.

    Raises
    ------
    WrongUse
        If the limits profile is not there, or does not hold together.
    """
    try:
        return limits.of(site)
    except ProfileError as error:
        raise WrongUse(*(f"{place}:limits: {line}" for line in str(error).splitlines())) from None


def only(assessment: Assessment, circuit: str) -> Assessment:
    """
    The part of an assessment about one circuit.

    Raises
    ------
    WrongUse
        If there is no such circuit.
    """
    results = tuple(result for result in assessment.circuits if result.circuit == circuit)
    if not results:
        known = [result.circuit for result in assessment.circuits]
        raise WrongUse(f"--circuit: no circuit {circuit!r}{_meant(circuit, known)}")
    return replace(
        assessment,
        circuits=results,
        findings=tuple(finding for result in results for finding in result.findings),
        # what is about no place at all, such as a rule that is switched off, is about this circuit too
        not_judged=tuple(
            gap for gap in assessment.not_judged if gap.circuit == circuit or (gap.circuit is None and not gap.where)
        ),
    )


def on_visit(site: Site, visit: str) -> Site:
    """
    The site with the readings of one visit alone.

    A reading may be replaced by one of another visit, so that this is settled first: readings that are replaced are
    left out, and those that stay name none that is left out.
    """
    ids = {row.id for row in site.readings}
    replaced = {row.replaces_id for row in site.readings}
    kept = [row for row in site.readings if row.visit_or_default == visit and row.id not in replaced]
    readings = tuple(replace(row, replaces_id="") if row.replaces_id in ids else row for row in kept)
    return replace(site, readings=readings)


def _meant(word: str, known: list[str]) -> str:
    close = nearest(word, known)
    return f"; did you mean {close!r}?" if close else ""
