"""Taking a site folder or single tables into a site file: all of it, or nothing and a line for each problem."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

from audit.errors import IntakeRefused, WrongUse
from audit.intake.given import Given, Stage, given_files, given_folder, no_stage
from audit.intake.incoming import Incoming
from audit.intake.merge import SITE, Merge, merge
from audit.intake.told import differing_lines, refusal, taken
from audit.site_file import check_new, site_file
from db.errors import TakenId
from db.ids import with_ids_exchanged
from db.save import Save
from db.schema import SCHEMA
from db.store import SiteStore
from db.tables import no_collection
from rules import limits
from rules.consistency import problems
from rules.errors import ProfileError
from rules.index import Index
from rules.record import TABLES, Site


@dataclass(slots=True)
class Outcome:
    """What an intake did, or would do."""

    is_new: bool
    """Whether the site file was made."""
    added: Counter[str] = field(default_factory=Counter)
    """Rows that were new, by table."""
    changed: Counter[str] = field(default_factory=Counter)
    """Rows that were there and changed, by table; ``site`` for the settings."""
    left: Counter[str] = field(default_factory=Counter)
    """Rows that were there already as they came in, by table."""
    taken: list[str] = field(default_factory=list)
    """Each differing value that was taken, as a line."""
    replacing: int = 0
    """How many of the readings added replace one that was there."""

    @property
    def is_change(self) -> bool:
        """Whether the site file is another one now."""
        return self.is_new or bool(self.added or self.changed)


def take_in(
    path: Path,
    sources: Sequence[Path],
    *,
    who: str,
    laptop: str,
    replacing: bool = False,
    dry_run: bool = False,
    stage: Stage = no_stage,
) -> Outcome:
    """
    Take a site folder, or single tables, into a site file.

    Parameters
    ----------
    path : Path
        The site file; it is made where there is none.
    sources : sequence of Path
        One site folder, or tables as CSV files or XLSX workbooks. Tables that come into a new file without a
        ``site.toml`` leave it named like the file.
    who, laptop : str
        Who saves, and on which laptop.
    replacing : bool
        Take values that differ from those of the rows that are there.
    dry_run : bool
        Write nothing.
    stage : callable
        Is told what begins.

    Raises
    ------
    IntakeRefused
        With a line for every problem and every differing value; nothing is written.
    SiteError
        If the site file cannot be read or written.
    """
    why = f"intake of {', '.join(source.absolute().name for source in sources)}"
    with no_collection():
        if not path.exists():
            check_new(path)
            site = _new_site(_given(sources, stage), path.stem, stage)  # the texts are let go before the save
            if not dry_run:
                stage("save")
                SiteStore.create(path, site, who, laptop, why).close()
            return Outcome(True, Counter({table: len(site.table(table)) for table in TABLES if site.table(table)}))
        with site_file(path, read_only=dry_run, laptop=laptop) as store:
            given = _given(sources, stage)
            seen, into = store.version, store.site()
            merged = _merged(given, into, replacing, stage)
            if merged.is_change and not dry_run:
                stage("save")
                with store.save(who, why) as save:
                    if store.version != seen:  # someone else has saved meanwhile
                        into = store.site()
                        merged = _merged(given, into, replacing, stage)
                    write(save, merged)
            return _outcome(into, merged)


def _given(sources: Sequence[Path], stage: Stage) -> Given:
    folders = [source for source in sources if source.is_dir()]
    if folders and len(sources) > 1:
        raise WrongUse(f"{folders[0]} is a folder beside others; accepted: one site folder, or tables alone")
    return given_folder(folders[0], stage) if folders else given_files(sources, stage)


def _new_site(given: Given, name: str, stage: Stage) -> Site:
    incoming = Incoming(given, None, stage)
    site = incoming.site if given.settings is not None else replace(incoming.site, name=name)
    stage("check the record")
    incoming.judge(site)
    _judge_limits(incoming, site)
    if incoming.faults.found:
        raise IntakeRefused(incoming.faults.lines())
    return site


def _merged(given: Given, into: Site, replacing: bool, stage: Stage) -> Merge:
    """What becomes of a site, or every reason why nothing does."""
    incoming = Incoming(given, into, stage)
    stage("compare with what is there")
    coming = incoming.site
    fields_given = {table: incoming.given_fields(table) for table in TABLES if coming.table(table)}
    merged = merge(into, coming, fields_given, incoming.settings)
    for difference, here, comes in differing_lines(into, merged):
        place = difference.table, difference.row, difference.column
        if incoming.could_read(*place) and not (replacing and difference.can_be_taken):
            incoming.fault(*place, refusal(difference, here, comes))
    if merged.is_change or incoming.faults.found:
        stage("check the record")
        incoming.judge(merged.site, known=lambda: problems(into), came_from=merged.came_from)
        _judge_limits(incoming, merged.site)
    if incoming.faults.found:
        raise IntakeRefused(incoming.faults.lines())
    return merged


def _judge_limits(incoming: Incoming, site: Site) -> None:
    """A limits profile that is not there, or cannot be used, would stop every check."""
    if not incoming.is_whole or not {"limits", "prior"} & set(incoming.settings or ()):
        return
    try:
        limits.of(site)
    except ProfileError as error:
        for line in str(error).splitlines():
            incoming.fault("site", "", "limits", line)


def _outcome(into: Site, merged: Merge) -> Outcome:
    outcome = Outcome(False, left=merged.left, replacing=len(merged.came_from))
    outcome.added.update({table: len(rows) for table, rows in merged.added.items() if rows})
    outcome.changed.update({table: len(rows) for table, rows in merged.changed.items() if rows})
    if merged.settings:
        outcome.changed[SITE] = 1
    if merged.differences:
        index = Index(into)
        outcome.taken = [taken(*found, index) for found in differing_lines(into, merged)]
    return outcome


def write(save: Save, merged: Merge) -> None:
    """
    Ask a save for all of a merge.

    An id that a row of this file had before it was removed is exchanged for a new one.
    """
    exchanged: dict[tuple[str, str], str] = {}
    for table, rows in merged.added.items():
        try:
            save.add_all(table, rows)
        except TakenId:
            new = save.add_all(table, [replace(row, id="") for row in rows])
            exchanged |= {(table, row.id): id_ for row, id_ in zip(rows, new, strict=True) if row.id != id_}
    changed: dict[str, Any] = {table: tuple(row for row, _ in rows.values()) for table, rows in merged.changed.items()}
    for table, rows in changed.items():
        after = with_ids_exchanged(Site(name="", **changed), exchanged).table(table)
        for row, new_row in zip(rows, after, strict=True):
            names = merged.changed[table][row.id][1]
            typed = tuple((name, text) for name, text in row.typed if name in names)
            save.change(table, row.id, typed=typed, **{name: getattr(new_row, name) for name in names})
    if merged.settings:
        values = {name: getattr(merged.site, name) for name in merged.settings}
        save.settings(typed=tuple((name, text) for name, text in merged.site.typed if name in values), **values)
    if exchanged:
        _refer_to_new_ids(save, merged, exchanged)


def _refer_to_new_ids(save: Save, merged: Merge, exchanged: dict[tuple[str, str], str]) -> None:
    """Let the rows that were added refer to the ids that others of them got."""
    added: dict[str, Any] = {table: tuple(rows) for table, rows in merged.added.items()}
    after = with_ids_exchanged(Site(name="", **added), exchanged)
    for table, rows in added.items():
        names = [known.name for known in SCHEMA[table].fields if known.targets]
        for row, new in zip(rows, after.table(table), strict=True):
            values = {name: getattr(new, name) for name in names if getattr(new, name) != getattr(row, name)}
            if values:
                save.change(table, new.id, **values)
