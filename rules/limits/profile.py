"""
Limits profiles as data: packaged profile, then the site's own, then the site's ``[prior]``.

A profile is TOML: groups of plain numbers, each group with ``title``, ``unit``, ``source``, ``edition`` and
``status``; ``inherits`` names the profile that it starts from (``general`` where it names none). The keys
of ``general.toml`` are the keys there are: any other is an error that names the nearest. A number that comes
from elsewhere than the rest of its group says so itself:
``allowed_percent = { value = 4, source = "…", edition = "…", status = "…" }``.

A key may hold a word instead of a number where ``general.toml`` says which words there are:
``table = { word = "by size", accepted = ["by size", "iec"] }``. Any other profile writes the word alone,
``table = "iec"``.
"""

from __future__ import annotations

import difflib
import math
import tomllib
from collections.abc import Iterable
from dataclasses import replace
from functools import cache
from importlib.resources import files
from typing import Any

from rules.assessment import Severity
from rules.errors import ProfileError
from rules.limits.bounds import impossible
from rules.limits.group import LimitGroup, Limits, RuleSetting, Stated
from rules.record import Site
from rules.text import quoted

ROOT = "general"
_MOST_SHOWN = 60
WHERE_FROM = ("source", "edition", "status")
TEXT_KEYS = ("title", "unit", *WHERE_FROM)
DOUBTFUL = "reading or record doubtful"
"""The cause that keeps the profile's share where a site's ``[prior]`` does not name it."""


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
    if name in above:
        raise ProfileError(f"profile {name!r} inherits itself: {' > '.join([*above, name])}")
    if name not in names():
        raise ProfileError(
            f"there is no limits profile {quoted(name)}{_nearest(name, names())}; there are: {', '.join(names())}"
        )
    return _parsed(name, _text_of(name), above)


def _text_of(name: str) -> str:
    return files("rules.limits").joinpath(f"{name}.toml").read_text(encoding="utf-8")


def _parsed(name: str, text: str, above: tuple[str, ...]) -> Limits:
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
    impossible(name, groups, faults)
    if faults:
        raise ProfileError("\n".join(faults))
    return Limits(name, title, groups, rules, (parent.name, *parent.inherited) if parent else ())


def _group(name: str, group: str, content: dict[str, Any], parent: LimitGroup | None, faults: list[str]) -> LimitGroup:
    texts = _texts(f"{name}: {group}", content, TEXT_KEYS, faults)
    if parent and texts.get("unit", parent.unit) != parent.unit:
        faults.append(f"{name}: {group}.unit is {texts['unit']!r}, its numbers are in {parent.unit!r}")
    unit = parent.unit if parent else texts.get("unit", "")
    values = dict(parent.values) if parent else {}
    words = dict(parent.words) if parent else {}
    accepted = dict(parent.accepted) if parent else {}
    stated = dict(parent.stated) if parent else {}
    unsourced = False
    for key, given in content.items():
        where, value, own = f"{name}: {group}.{key}", given, texts
        if (
            parent is None and isinstance(given, dict) and "accepted" in given
        ):  # the root alone says which words there are
            words[key], accepted[key] = given["word"], tuple(given["accepted"])
            value = given["word"]
        elif isinstance(given, dict) and "value" in given:
            value = given.pop("value")
            own = _texts(where, given, WHERE_FROM, faults)
            faults += [
                f"{where}: there is no {more!r}{_nearest(more, WHERE_FROM)}; value, {', '.join(WHERE_FROM)}"
                for more in given
            ]
        unsourced |= parent is not None and not own.get("source")
        if parent and key not in parent.values and key not in words:
            faults.append(f"{name}: there is no {group}.{key}{_nearest(key, [*parent.values, *parent.words])}")
            continue
        if key in words and value in accepted[key]:
            words[key] = value
        elif key in words:
            one_of = ", ".join(accepted[key])
            faults.append(f"{where} is {value!r}; one of {one_of}{_nearest(str(value), accepted[key])}")
        elif not _is_finite(value):
            faults.append(f"{where} is {_shown(value)}, not a finite number{_in_unit(unit)}")
        else:
            values[key] = float(value)
        stated[key] = Stated(own.get("source", ""), own.get("edition", ""), own.get("status", "not stated"), name)
    if unsourced:
        faults.append(f"{name}: [{group}] changes values without naming its source")
    title = texts.get("title", parent.title if parent else "")
    return LimitGroup(group, title, unit, values, words, accepted, stated)


def _texts(where: str, content: dict[str, Any], keys: tuple[str, ...], faults: list[str]) -> dict[str, str]:
    """The texts among some keys, taken out of what a profile gives."""
    texts = {key: content.pop(key) for key in keys if key in content}
    faults += [f"{where}.{key} is not a text" for key, text in texts.items() if not isinstance(text, str)]
    return {key: text for key, text in texts.items() if isinstance(text, str)}


def _in_unit(unit: str) -> str:
    """In which unit a group's numbers are, for whoever wrote another."""
    return "" if unit in ("", "1", "mixed", "words") else f" in {unit}"


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
        if rule not in rule_ids():
            faults.append(f"{name}: there is no rule {quoted(rule)}{_nearest(rule, rule_ids())}")
            continue
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
            settings[rule] = RuleSetting(
                off, Severity(severity) if severity is not None else None, reason.strip(), name
            )
    return settings


@cache
def rule_ids() -> tuple[str, ...]:
    """Ids of all rules, by the names of their files: a profile is read without loading them."""
    found = (entry.name.partition("_") for entry in files("rules.checks").iterdir() if entry.name.endswith(".py"))
    return tuple(sorted(id_.upper() for id_, _, _ in found if id_))


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
    stated = Stated("the site's own [prior]", "", "the auditor's expectation", "site")
    own_group = replace(group, values=values, stated=dict.fromkeys(values, stated))
    return replace(limits, groups={**limits.groups, "prior": own_group})


def _nearest(word: str, known: Iterable[str]) -> str:
    close = difflib.get_close_matches(word, list(known), 1)
    return f"; did you mean {close[0]!r}?" if close else ""
