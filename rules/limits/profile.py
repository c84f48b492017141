"""
Limits profiles as data: packaged profile, then the site's own, then the site's ``[prior]``.

A profile is TOML: groups of plain numbers, each group with ``title``, ``unit``, ``source``, ``edition`` and
``status``; ``inherits`` names the profile that it starts from (``general`` where it names none). The keys
of ``general.toml`` are the keys there are: any other is an error that names the nearest.

A key may hold a word instead of a number where ``general.toml`` says which words there are:
``table = { word = "by size", accepted = ["by size", "iec"] }``. Any other profile writes the word alone,
``table = "iec"``.
"""

from __future__ import annotations

import difflib
import math
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from functools import cache
from importlib.resources import files
from typing import Any

from rules.assessment import Severity
from rules.errors import ProfileError
from rules.record import Site
from rules.text import quoted

ROOT = "general"
_MOST_SHOWN = 60
TEXT_KEYS = ("title", "unit", "source", "edition", "status")
DOUBTFUL = "reading or record doubtful"
"""The cause that keeps the profile's share where a site's ``[prior]`` does not name it."""


@dataclass(frozen=True, slots=True)
class LimitGroup:
    """Some numbers of one subject and where they come from."""

    name: str
    title: str
    unit: str
    source: str
    edition: str
    status: str
    origin: str
    """Name of the profile that stated it last."""
    values: Mapping[str, float]
    words: Mapping[str, str] = field(default_factory=dict)
    """What is chosen by a word; no key has both a word and a number."""
    accepted: Mapping[str, tuple[str, ...]] = field(default_factory=dict)
    """The words that each key of ``words`` may hold."""


@dataclass(frozen=True, slots=True)
class RuleSetting:
    """What a profile says of one rule."""

    off: bool
    severity: Severity | None
    reason: str


@dataclass(frozen=True, slots=True)
class Limits:
    """All limits, doubts and priors in force for a site."""

    name: str
    title: str
    groups: Mapping[str, LimitGroup]
    rules: Mapping[str, RuleSetting]

    def __getitem__(self, key: str) -> float:
        """
        One number by group and key.

        >>> of(Site(name="x"))["drop.allowed_percent"]
        3.0
        """
        group, _, name = key.partition(".")
        return self.groups[group].values[name]

    def word(self, key: str) -> str:
        """
        One word by group and key.

        >>> of(Site(name="x")).word("capacity.table")
        'by size'
        """
        group, _, name = key.partition(".")
        return self.groups[group].words[name]

    def values(self, group: str) -> Mapping[str, float]:
        """All numbers of one group."""
        return self.groups[group].values

    def citation(self, group: str) -> str:
        """Where the numbers of a group come from, for a finding."""
        chosen = self.groups[group]
        edition = f", edition {chosen.edition}" if chosen.edition else ""
        status = "" if chosen.status in ("verified", chosen.source) else f" ({chosen.status})"
        return f"{chosen.source}{edition}{status}; limits profile {chosen.origin}"

    @property
    def prior(self) -> Mapping[str, float]:
        """Share of circuits under each cause (with spaces), summing to one."""
        shares = self.values("prior")
        total = sum(shares.values())
        return {cause.replace("_", " "): share / total for cause, share in shares.items()}


def of(site: Site) -> Limits:
    """
    The limits in force for a site.

    Raises
    ------
    ProfileError
        One line for everything that is wrong with the profile, joined by newlines.
    """
    own = site.own_limits
    limits = _packaged(site.limits) if own is None else _parsed(site.limits, own, ())
    return _with_prior(limits, site.prior) if site.prior else limits


@cache
def names() -> tuple[str, ...]:
    """The packaged profiles."""
    found = (entry.name for entry in files("rules.limits").iterdir() if entry.name.endswith(".toml"))
    return tuple(sorted(name.removesuffix(".toml") for name in found))


@cache
def _packaged(name: str, above: tuple[str, ...] = ()) -> Limits:
    if name not in names():
        raise ProfileError(
            f"there is no limits profile {name!r}{_nearest(name, names())}; there are: {', '.join(names())}"
        )
    return _parsed(name, files("rules.limits").joinpath(f"{name}.toml").read_text(encoding="utf-8"), above)


def _parsed(name: str, text: str, above: tuple[str, ...]) -> Limits:
    if name in above:
        raise ProfileError(f"profile {name!r} inherits itself: {' > '.join([*above, name])}")
    try:
        data = tomllib.loads(text)
    except ValueError as error:  # tomllib's own, and Python's where a number has thousands of digits
        raise ProfileError(f"{name}: not TOML: {error}") from None
    title = data.pop("title", name)
    parent_name = data.pop("inherits", None if name == ROOT else ROOT)
    if not isinstance(title, str) or not isinstance(parent_name, str | None):
        raise ProfileError(f"{name}: 'title' and 'inherits' are texts")
    parent = _packaged(parent_name, (*above, name)) if parent_name is not None else None
    faults: list[str] = []
    rules = _rules(name, data.pop("rules", {}), parent, faults)
    groups = dict(parent.groups) if parent else {}
    for group, content in data.items():
        if parent and group not in parent.groups:
            faults.append(f"{name}: there is no group [{group}]{_nearest(group, parent.groups)}")
        elif not isinstance(content, dict):
            faults.append(f"{name}: {group} is not a group of numbers, [{group}]")
        else:
            groups[group] = _group(name, group, content, parent.groups[group] if parent else None, faults)
    _impossible(name, groups, faults)
    if faults:
        raise ProfileError("\n".join(faults))
    return Limits(name, title, groups, rules)


def _group(name: str, group: str, content: dict[str, Any], parent: LimitGroup | None, faults: list[str]) -> LimitGroup:
    texts = {key: content.pop(key) for key in TEXT_KEYS if key in content}
    for key, text in texts.items():
        if not isinstance(text, str):
            faults.append(f"{name}: {group}.{key} is not a text")
    if parent:
        if content and not texts.get("source"):
            faults.append(f"{name}: [{group}] changes values without naming its source")
        if texts.get("unit", parent.unit) != parent.unit:
            faults.append(f"{name}: {group}.unit is {texts['unit']!r}, its numbers are in {parent.unit!r}")
    values = dict(parent.values) if parent else {}
    words = dict(parent.words) if parent else {}
    accepted = dict(parent.accepted) if parent else {}
    for key, value in content.items():
        where = f"{name}: {group}.{key}"
        if parent is None and isinstance(value, dict):  # the root alone says which words there are
            words[key], accepted[key] = value["word"], tuple(value["accepted"])
        elif key in words:
            if value in accepted[key]:
                words[key] = value
            else:
                one_of = ", ".join(accepted[key])
                faults.append(f"{where} is {value!r}; one of {one_of}{_nearest(str(value), accepted[key])}")
        elif parent and key not in parent.values:
            faults.append(f"{name}: there is no {group}.{key}{_nearest(key, [*parent.values, *parent.words])}")
        elif not _is_finite(value):
            faults.append(f"{where} is {_shown(value)}, not a finite number")
        else:
            values[key] = float(value)
    return LimitGroup(
        name=group,
        title=texts.get("title", parent.title if parent else ""),
        unit=parent.unit if parent else texts.get("unit", ""),
        source=texts.get("source", parent.source if parent else ""),
        edition=texts.get("edition", "" if "source" in texts or not parent else parent.edition),
        status=texts.get("status", "not stated" if "source" in texts or not parent else parent.status),
        origin=name if content or not parent else parent.origin,
        values=values,
        words=words,
        accepted=accepted,
    )


def _is_finite(value: object) -> bool:
    """Whether a value is a number that a float can hold; TOML's whole numbers have any length."""
    if isinstance(value, bool) or not isinstance(value, int | float):
        return False
    try:
        return math.isfinite(float(value))
    except OverflowError:
        return False


def _shown(value: object) -> str:
    """A value in an error line; Python writes no whole number of more than 4,300 digits."""
    try:
        return quoted(value) if isinstance(value, str) else repr(value)[:_MOST_SHOWN]
    except ValueError:
        return "a number of thousands of digits"


def _rules(name: str, given: object, parent: Limits | None, faults: list[str]) -> dict[str, RuleSetting]:
    settings = dict(parent.rules) if parent else {}
    if not isinstance(given, dict):
        faults.append(f"{name}: [rules] holds groups such as [rules.VD01]")
        return settings
    for rule, content in given.items():
        if not isinstance(content, dict) or (unknown := sorted(set(content) - {"severity", "off", "reason"})):
            what = (
                f"there is no rules.{rule}.{unknown[0]}" if isinstance(content, dict) else f"rules.{rule} is no group"
            )
            faults.append(f"{name}: {what}; a rule may have severity, off, reason")
            continue
        reason, off, severity = content.get("reason", ""), content.get("off", False), content.get("severity")
        if not isinstance(reason, str) or not reason.strip():
            faults.append(f"{name}: rules.{rule} has no reason")
        elif not isinstance(off, bool):
            faults.append(f"{name}: rules.{rule}.off is {off!r}; true or false")
        elif severity is not None and severity not in list(Severity):
            faults.append(f"{name}: rules.{rule}.severity is {severity!r}; one of {', '.join(Severity)}")
        else:
            settings[rule] = RuleSetting(off, Severity(severity) if severity is not None else None, reason.strip())
    return settings


ABOVE_ZERO = (
    "drop", "termination", "heat", "length_doubt", "bad_connection", "series_semiconductor", "longer_route", "slip",
)  # fmt: skip
SHARES = ("decision", "other_metal", "doubtful")


def _impossible(name: str, groups: Mapping[str, LimitGroup], faults: list[str]) -> None:
    """Numbers that make no sense whatever their source."""
    for group in groups.values():
        for key, value in group.values.items():
            where = f"{name}: {group.name}.{key} is {value:g}"
            if group.name in ("temperature", "cold", "ambient"):
                if not -90 <= value <= 400:
                    faults.append(f"{where}; a temperature from -90 to 400 degC")
            elif value < 0:
                faults.append(f"{where}; not below 0")
            elif value == 0 and key != "geometric_sd" and group.name in ABOVE_ZERO:
                faults.append(f"{where}; above 0")
            elif value <= 1 and key == "geometric_sd":
                faults.append(f"{where}; above 1")
            elif value > 1 and group.name in SHARES:
                faults.append(f"{where}; a share from 0 to 1")
    for group_name, low, high in (
        ("bad_connection", "low_ohm", "high_ohm"),
        ("series_semiconductor", "low_v", "high_v"),
        ("longer_route", "low_factor", "high_factor"),
        ("slip", "parallel_low", "parallel_high"),
        ("decision", "passes_at", "fails_at"),
    ):
        values = groups[group_name].values if group_name in groups else {}
        if low in values and high in values and values[low] >= values[high]:
            faults.append(f"{name}: {group_name}.{low} is not below {group_name}.{high}")
    if "prior" in groups and not sum(groups["prior"].values.values()) > 0:
        faults.append(f"{name}: the shares of [prior] sum to nothing")


def _with_prior(limits: Limits, prior: Iterable[tuple[str, float]]) -> Limits:
    """The site's own shares; a cause that it leaves out has none, but for a doubtful reading or record."""
    own = dict(prior)
    group = limits.groups["prior"]
    known = [key.replace("_", " ") for key in group.values]
    for cause, share in own.items():
        if cause not in known:
            raise ProfileError(
                f"[prior] names no cause {cause!r}{_nearest(cause, known)}; there are: {', '.join(known)}"
            )
        if not math.isfinite(share) or share < 0:
            raise ProfileError(f"[prior] gives {cause!r} the share {share:g}; a finite number not below 0")
    packaged_total = sum(group.values.values())
    total = sum(own.values())
    if total <= 0:
        raise ProfileError("[prior]: the shares sum to nothing")
    doubtful = group.values[DOUBTFUL.replace(" ", "_")] / packaged_total
    kept = {} if DOUBTFUL in own else {DOUBTFUL: doubtful}
    shares = {cause: own.get(cause, 0.0) / total for cause in known} | kept
    values = {cause.replace(" ", "_"): share for cause, share in shares.items()}
    stated = replace(
        group, source="the site's own [prior]", status="the auditor's expectation", origin="site", values=values
    )
    return replace(limits, groups={**limits.groups, "prior": stated})


def _nearest(word: str, known: Iterable[str]) -> str:
    close = difflib.get_close_matches(word, list(known), 1)
    return f"; did you mean {close[0]!r}?" if close else ""
