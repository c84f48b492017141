"""A site to a site folder: the mirror of ``audit.intake.folder``."""

from __future__ import annotations

import csv
import io
import json
import re
import secrets
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

from audit.errors import AuditError, TargetExists, WriteFailed
from audit.intake.header import title
from rules.columns import Column
from rules.index import Index
from rules.problems.settings import SETTINGS, is_profile_file
from rules.record import TABLES, Row, Run, Site, columns
from rules.references import feed_text, feeds_text
from rules.text import clean
from rules.units import plain

_OUR_FILES = frozenset({"site.toml", *(f"{table}.csv" for table in TABLES)})


def unload(site: Site, folder: Path, *, overwrite: bool = False) -> None:
    """
    Write a site as a site folder; reading that folder gives an equal site.

    Tables without rows are left out, and so are columns that are not required and hold nothing. The folder is
    written under another name beside and moved into place, so that it is there whole or not at all.

    Parameters
    ----------
    site : Site
        What to write.
    folder : Path
        Where to; the folder above must be there.
    overwrite : bool
        Replace a site folder that is there, but none that holds anything else.

    Raises
    ------
    TargetExists
        If something is there already.
    WriteFailed
        If it cannot be written.
    """
    _check_target(folder, overwrite)
    files = folder_files(site)
    folder = folder.resolve()
    beside = folder.with_name(f".{folder.name}.{secrets.token_hex(4)}")
    try:
        try:
            beside.mkdir()
            for name, text in files.items():
                (beside / name).write_bytes(text.encode())
            _move(beside, folder)
        finally:
            shutil.rmtree(beside, ignore_errors=True)
    except OSError as error:
        raise WriteFailed(
            f"{folder} cannot be written: {error.strerror}; accepted: a place that you may write to"
        ) from error


def folder_files(site: Site) -> dict[str, str]:
    """
    The files of a site folder: name and text.

    Raises
    ------
    AuditError
        If the site's own profile has a name that no file beside ``site.toml`` can have.
    """
    files = {"site.toml": _settings_text(site)}
    if site.own_limits is not None:
        if not is_profile_file(site.limits):
            raise AuditError(f"{site.limits!r} cannot be the file of the site's own profile; accepted: NAME.toml")
        files[site.limits] = site.own_limits
    index = Index(site)
    for table in TABLES:
        if site.table(table):
            files[f"{table}.csv"] = _table_text(table, index)
    return files


def _check_target(folder: Path, overwrite: bool) -> None:
    if not folder.exists() and not folder.is_symlink():
        return
    if not overwrite:
        raise TargetExists(folder)
    if not folder.is_dir():
        raise WriteFailed(f"{folder} is a file, which no folder overwrites; accepted: another name")
    names = {path.name for path in folder.iterdir()}
    for path in sorted(folder.iterdir()):
        is_profile = path.suffix == ".toml" and "site.toml" in names
        if not path.is_file() or not (path.name in _OUR_FILES or is_profile):
            what = f"{folder} holds {clean(path.name)}, which is no part of a site folder"
            raise WriteFailed(f"{what}; accepted: another name")


def _move(beside: Path, folder: Path) -> None:
    """Put the new folder where the old one is; the old one comes back if that fails."""
    if not folder.exists():
        beside.rename(folder)
        return
    old = beside.with_name(beside.name + ".old")
    folder.rename(old)
    try:
        beside.rename(folder)
    except OSError:
        old.rename(folder)
        raise
    shutil.rmtree(old)


def _table_text(table: str, index: Index) -> str:
    """One table as CSV."""
    rows = index.site.table(table)
    cells_of = {column: [cell_text(row, name, column, index) for row in rows] for name, column in columns(table)}
    kept = [column for column, cells in cells_of.items() if column.header or any(cells)]
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(title(column) for column in kept)
    writer.writerows(zip(*(cells_of[column] for column in kept), strict=True))
    return out.getvalue()


def cell_text(row: Row, name: str, column: Column, index: Index) -> str:
    """One cell as it would be typed; ``index`` is that of the row's site."""
    typed = row.as_typed(name) if row.typed else None
    if typed is not None:
        return typed
    if isinstance(row, Run) and name == "to_point":
        return index.end_of(row)
    value = getattr(row, name)
    if value is None:
        return ""
    if column.kind in ("reference", "feeds"):
        return _REFERENCES[name](value, index)
    return plain(value) if column.kind == "number" else str(value)


def _circuit_tag(id_: str, index: Index) -> str:
    circuit = index.circuits.get(id_)
    return id_.removeprefix("?") if circuit is None else circuit.tag


def _reading_tag(id_: str, index: Index) -> str:
    reading = index.readings.get(id_)
    return id_.removeprefix("?") if reading is None else reading.tag


_REFERENCES: dict[str, Callable[[Any, Index], str]] = {
    "circuit_id": _circuit_tag,
    "replaces_id": _reading_tag,
    "fed_from": feed_text,
    "fed_by": feeds_text,
    "board": feed_text,
}
"""How each field that refers to another row is written."""


def _settings_text(site: Site) -> str:
    """``site.toml``."""
    typed = dict(site.typed)
    lines: list[str] = []
    for key, (name, _) in SETTINGS.items():
        value = typed.get(name, getattr(site, name))
        if value is not None and value != "":
            lines.append(f"{key} = {_toml(value)}")
    if site.prior:
        lines += ["", "[prior]", *(f"{_key(cause)} = {_toml(share)}" for cause, share in site.prior)]
    return "\n".join(lines) + "\n"


def setting_text(site: Site, name: str) -> str:
    """One setting as it would be typed, by its field: the shares of ``prior`` in a row, an own profile's text as it is."""
    value = dict(site.typed).get(name, getattr(site, name))
    if value is None:
        return ""
    if isinstance(value, tuple):
        return ", ".join(f"{_key(cause)} = {plain(share)}" for cause, share in value)
    return plain(value) if isinstance(value, float) else str(value)


def _key(cause: str) -> str:
    key = cause.replace(" ", "_")
    return key if re.fullmatch(r"[a-z_]+", key) else _toml(key)


def _toml(value: str | float) -> str:
    """A TOML value; JSON's strings are TOML's but for DEL."""
    if isinstance(value, str):
        return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007F")
    return plain(value)
