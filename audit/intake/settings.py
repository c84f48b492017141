"""``site.toml`` to the settings of a site."""

from __future__ import annotations

import math
import re
import tomllib
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

from audit.intake.cell import read_cell, trimmed
from audit.intake.faults import Faults
from audit.intake.utf8 import NotUtf8, decode
from rules.columns import Column
from rules.errors import RulesError, UnreadableText
from rules.problems.cells import accepted
from rules.problems.settings import SETTINGS
from rules.text import either, nearest, quoted

FILE = "site.toml"
_LINE = re.compile(r"^(.*) \(at line (\d+), column \d+\)$", re.DOTALL)


@dataclass(slots=True)
class Settings:
    """What was read from ``site.toml``."""

    values: dict[str, Any] = field(default_factory=dict)
    """Fields of ``Site``."""
    told: set[str] = field(default_factory=set)
    """Keys whose problem is told already."""
    whole: bool = True
    """The file could be read."""


def read_toml(file: str, content: bytes, faults: Faults) -> dict[str, Any] | None:
    """The content of a TOML file; ``None`` where it could not be read, which goes to ``faults``."""
    try:
        return tomllib.loads(decode(content))
    except NotUtf8 as error:
        faults.add(file, error.what, row=error.line)
    except ValueError as error:  # tomllib's own, and Python's where a number has thousands of digits
        found = _LINE.match(str(error))
        reason, line = (found[1], int(found[2])) if found else (str(error), 0)
        faults.add(file, f'is not TOML: {reason}; accepted: lines such as name = "Plant 2"', row=line)
    except RecursionError:
        faults.add(file, "is not TOML that can be read: brackets within brackets too deep; accepted: plain keys")
    return None


def read_settings(data: Mapping[str, Any], beside: Callable[[str], bytes | None], faults: Faults) -> Settings:
    """
    The settings of a site.

    Parameters
    ----------
    data : dict
        As ``site.toml`` holds them.
    beside : callable
        Content of the file of a name beside ``site.toml``, ``None`` where there is none.
    faults : Faults
        Takes keys that are not known and values of the wrong type.
    """
    settings = Settings()
    typed: list[tuple[str, str]] = []

    def fault(key: str, what: str) -> None:
        faults.add(FILE, what, column=key, order=(0, place_of(key)))

    for key, value in data.items():
        if key == "prior":
            settings.values["prior"] = _prior(value, fault)
        elif key not in SETTINGS:
            near = nearest(key[:100], (*SETTINGS, "prior"))
            hint = "" if near is None else f", did you mean {near}?"
            fault(key, f"there is no setting of this name; accepted: {either((*SETTINGS, '[prior]'))}{hint}")
        else:
            name, column = SETTINGS[key]
            try:
                cell_value, text = _setting(value, column)
            except RulesError as error:
                fault(key, str(error))
                settings.told.add(key)
                continue
            settings.values[name] = cell_value
            if text is not None:
                typed.append((name, text))
    if "name" not in data:
        settings.told.add("name")
        fault("name", 'is missing; accepted: the name of the site, name = "Plant 2"')
    settings.values["typed"] = tuple(sorted(typed))
    _own_limits(settings, beside, faults)
    return settings


def place_of(key: str) -> int:
    """Place of a setting, by which error lines are sorted."""
    return list(SETTINGS).index(key) if key in SETTINGS else len(SETTINGS)


def _setting(value: object, column: Column) -> tuple[Any, str | None]:
    """Value of one key, and the text that it was typed as."""
    if isinstance(value, str):
        text = trimmed(value, column)
        if column.kind != "number":
            return text, None
        cell = read_cell(text, column, column.unit)
        return cell.value, cell.typed
    if column.kind == "number" and isinstance(value, int | float) and not isinstance(value, bool):
        return _float(value), None
    kind = f"{accepted(column)}, or with its unit in quotes" if column.kind == "number" else "a text in quotes"
    raise UnreadableText(f"{_shown(value)} is of the wrong kind; accepted: {kind}")


def _prior(value: object, fault: Callable[[str, str], None]) -> tuple[tuple[str, float], ...]:
    """Shares by cause, the causes with spaces."""
    if not isinstance(value, dict) or not value:
        fault("prior", f"{_shown(value)} names no cause; accepted: [prior] with lines such as as_recorded = 0.8")
        return ()
    shares: list[tuple[str, float]] = []
    for key, share in value.items():
        if isinstance(share, bool) or not isinstance(share, int | float):
            fault("prior", f"the share of {quoted(key)} is {_shown(share)}; accepted: a number, 0 or more")
            share = 1.0  # stands in, so that the other keys can be judged too
        shares.append((key.replace("_", " "), _float(share)))
    return tuple(shares)


def _own_limits(settings: Settings, beside: Callable[[str], bytes | None], faults: Faults) -> None:
    """Read the profile of the site's own that ``limits`` names as a file."""
    name = settings.values.get("limits", "")
    if not name.endswith(".toml"):
        return
    is_plain_name = not re.search(r"[/\\\x00]", name)
    content = beside(name) if is_plain_name else None
    if content is None:
        settings.told.add("limits")
        what = f"{quoted(name)} is no file beside {FILE}; accepted: a file there"
        faults.add(FILE, what, column="limits", order=(0, place_of("limits")))
        return
    if read_toml(name, content, faults) is not None:
        settings.values["own_limits"] = decode(content)


def _float(value: int | float) -> float:
    try:
        return float(value)
    except OverflowError:  # TOML's whole numbers have any length
        return math.inf if value > 0 else -math.inf


def _shown(value: object) -> str:
    if isinstance(value, bool):
        return quoted(str(value).lower())
    if isinstance(value, int) and math.isinf(_float(value)):
        return "a number too large to be read"  # str() of it fails from 4,300 digits on
    return quoted(str(value))
