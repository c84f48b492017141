"""
The machinery of rules: one rule, one file in ``rules/checks/``, found by walking that folder.

A cause and what follows from it are one finding. A rule says of what it may be a consequence, ``@rule(under=("VD01",))``; its
finding names those that would explain it where they stand, ``finding(…, under=(named("VD01", case, "p1"),))``. After all
rules have spoken, ``rules.fold`` puts it under the first of these that was found: its ``why`` (or ``as_consequence``) becomes a
consequence there, its numbers, caution and source are kept, and the whole has the gravest severity. Where the cause was not found, or
its rule is switched off or lowered by the profile to less than it, it stands on its own; no rule asks whether another one speaks.
"""

from __future__ import annotations

import importlib
import pkgutil
import traceback
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from functools import cache
from pathlib import PurePath
from typing import Any, Literal, TypeAlias

from rules.assessment import PROGRAM_FAULT, Citation, Finding, NotJudged, RuleChange, Severity
from rules.case import CircuitCase
from rules.context import Context
from rules.errors import RulesError
from rules.limits import ROOT, Limits
from rules.record import Board, Figure, Source

About: TypeAlias = Literal["circuit", "board", "source", "site"]

DOUBTS_OF_COMPUTED = ("length_doubt", "temperature_doubt", "resistance_doubt", "termination", "device_doubt")
"""Groups of the limits profile that the doubt of a computed drop is made of."""
DOUBTS_OF_READINGS = ("poor_meter",)
"""Groups of the limits profile that the doubt of a reading may be made of, beside its meter's own figures."""


@dataclass(frozen=True, slots=True)
class BoardCase:
    """A board or source for the rules about them."""

    context: Context
    row: Board | Source

    @property
    def tag(self) -> str:
        return self.row.tag


@dataclass(frozen=True, slots=True)
class SiteCase:
    """The whole site for the rules about it."""

    context: Context


Case: TypeAlias = CircuitCase | BoardCase | SiteCase


@dataclass(frozen=True, slots=True)
class Rule:
    """One rule with all that is said of it in one place."""

    id: str
    title: str
    about: About
    severity: Severity
    remedy: str
    caution: str
    source: Citation
    check: Callable[[Any], Iterator[Finding | NotJudged]]
    also: tuple[Citation, ...] = ()
    """Further sources, of what the text and the thresholds rest on."""
    limits: tuple[str, ...] = ()
    """Groups of the limits profile that it decides by."""
    also_about: tuple[About, ...] = ()
    """Other kinds of thing that it judges in the same way."""
    under: tuple[str, ...] = ()
    """Rules whose findings may explain one of its own, which then goes under theirs."""

    @property
    def text(self) -> str:
        """What it finds and what it leaves alone."""
        return (self.check.__doc__ or "").strip()

    def finding(
        self,
        case: Case,
        where: str,
        why: str,
        *,
        numbers: Mapping[str, Figure],
        severity: Severity | None = None,
        remedy: str | None = None,
        source: str | None = None,
        cause: str | None = None,
        consequences: tuple[str, ...] = (),
        as_circuit: str | None = None,
        without: tuple[str, ...] = (),
        under: tuple[str, ...] = (),
        as_consequence: str = "",
    ) -> Finding:
        """
        A finding of this rule; its ``id`` is built from rule, place and ``where``.

        ``as_circuit`` is for rules about the site that report on a circuit; ``without`` are groups of its ``limits``, or
        keys of them (``drop.allowed_percent``), that had no part in this finding. Values that the site's profile changes
        are named beside the source. ``under`` names the findings that explain this one, the first that stands;
        ``as_consequence`` is what it says there instead of ``why``.
        """
        strange = [name for name in under if name.partition("/")[0] not in self.under]
        assert not strange, f"{self.id} does not say that it may stand under {strange}"
        circuit = case.tag if isinstance(case, CircuitCase) else as_circuit
        board = case.tag if isinstance(case, BoardCase) else None
        limits = case.context.limits
        severity = severity or self.severity
        sources = [source or str(self.source)]
        sources += [changed for changed in self._changed_limits(limits, without) if changed not in sources[0]]
        setting = limits.rules.get(self.id)
        if setting is not None and setting.severity is not None and setting.severity is not severity:
            sources.append(
                f"{setting.severity} in place of {severity} by limits profile {setting.origin}: {setting.reason}"
            )
            severity = setting.severity
        return Finding(
            id=named(self.id, as_circuit if as_circuit is not None else case, where),
            rule=self.id,
            circuit=circuit,
            board=board,
            where=where,
            severity=severity,
            cause=cause,
            title=self.title,
            why=why,
            numbers=dict(numbers),
            remedy=remedy or self.remedy,
            caution=self.caution,
            source="; ".join(sources),
            consequences=consequences,
            by_profile=setting is not None and setting.severity is not None,
            under=under,
            as_consequence=as_consequence,
        )

    def _changed_limits(self, limits: Limits, without: tuple[str, ...]) -> list[str]:
        """Where the values come from that another profile than the general one states, of those that it decides by."""
        changed = [
            str(stated)
            for name in self.limits
            if (keys := limits.groups[name].deciding(without))
            for stated in limits.groups[name].by_source(keys)
            if stated.origin != ROOT
        ]
        return list(dict.fromkeys(changed))

    def gap(self, case: Case, where: str, why: str) -> NotJudged:
        """What this rule could not judge at one place; the rest of the case goes on."""
        return NotJudged(self.id, case.tag if isinstance(case, CircuitCase) else None, where, why)


def named(rule_id: str, place: Case | Source | Board | str, where: str = "") -> str:
    """
    The id of a rule's finding at a place; without ``where`` it stands for any that the rule finds there.

    ``place`` is a case, a board or source, or the tag of a circuit.

    >>> named("VD01", "B1/7", "p1"), named("SR01", Source(id="s", tag="BAT"), "terminals")
    ('VD01/B1%2F7/p1', 'SR01/board BAT/terminals')
    >>> named("VD01", "board BAT"), named("VD01", "site")
    ('VD01/%62oard BAT', 'VD01/%73ite')
    """
    if isinstance(place, SiteCase):
        at = "site"
    elif isinstance(place, BoardCase | Board | Source):
        at = _unslashed(f"board {place.tag}")
    else:
        at = _of_circuit(place if isinstance(place, str) else place.tag)
    return "/".join(part for part in (rule_id, at, _unslashed(where)) if part)


def _unslashed(part: str) -> str:
    """A part of an id: a slash within it is written so that two places never make one id."""
    return part.replace("%", "%25").replace("/", "%2F")


def _of_circuit(tag: str) -> str:
    """A circuit in an id; one that is called like a board or the site differs by its first letter's code."""
    if tag == "site" or tag.startswith("board "):
        return f"%{ord(tag[0]):X}{_unslashed(tag[1:])}"
    return _unslashed(tag)


def rule(
    *,
    id: str,  # noqa: A002 - the rule's own word for it
    title: str,
    about: About,
    severity: Severity,
    remedy: str,
    caution: str,
    source: Citation,
    also: tuple[Citation, ...] = (),
    limits: tuple[str, ...] = (),
    also_about: tuple[About, ...] = (),
    under: tuple[str, ...] = (),
) -> Callable[[Callable[[Any], Iterator[Finding | NotJudged]]], Rule]:
    """Make a rule of a function that yields findings, and what it could not judge, about one case."""

    def made(check: Callable[[Any], Iterator[Finding | NotJudged]]) -> Rule:
        return Rule(id, title, about, severity, remedy, caution, source, check, also, limits, also_about, under)

    return made


@cache
def catalogue() -> tuple[Rule, ...]:
    """Every rule in ``rules/checks/``, by id."""
    package = importlib.import_module("rules.checks")
    found: dict[str, Rule] = {}
    for entry in pkgutil.iter_modules(package.__path__):
        module = importlib.import_module(f"rules.checks.{entry.name}")
        found |= {item.id: item for item in vars(module).values() if isinstance(item, Rule)}
    return tuple(found[name] for name in sorted(found))


def judge(case: Case, about: About) -> tuple[list[Finding], list[NotJudged]]:
    """
    What all rules about one kind of thing say of one case.

    A rule that misses something, or that fails by a fault of its own, is reported as not judged, and the others go on;
    rules that the profile switches off are left out (``switched_off`` reports them once).
    """
    circuit = case.tag if isinstance(case, CircuitCase) else None
    where = case.tag if isinstance(case, BoardCase) else ""
    findings: list[Finding] = []
    gaps: list[NotJudged] = []
    for this in catalogue():
        if about not in (this.about, *this.also_about):
            continue
        setting = case.context.limits.rules.get(this.id)
        if setting is not None and setting.off:
            continue
        try:
            for said in this.check(case):
                if isinstance(said, Finding):
                    findings.append(said)
                else:
                    gaps.append(said)
        except RulesError as error:
            gaps.append(NotJudged(this.id, circuit, where, str(error)))
        except MemoryError:
            raise
        except Exception as error:
            gaps.append(NotJudged(this.id, circuit, where, fault_words(error)))
    return findings, gaps


def fault_words(error: Exception) -> str:
    """What is said of a rule that failed by a fault of the program, with the line that it failed in."""
    last = traceback.extract_tb(error.__traceback__)[-1]
    said = f": {error}" if str(error) else ""
    return f"{PROGRAM_FAULT}: {type(error).__name__}{said} ({PurePath(last.filename).name}, line {last.lineno})"


def changes_of(limits: Limits) -> tuple[RuleChange, ...]:
    """What a profile switches off, raises or lowers, by rule."""
    return tuple(
        RuleChange(
            this.id,
            this.title,
            this.severity,
            None if setting.off else setting.severity,
            setting.reason,
            setting.origin,
        )
        for this in catalogue()
        if (setting := limits.rules.get(this.id)) is not None and (setting.off or setting.severity is not None)
    )


def switched_off(limits: Limits) -> list[NotJudged]:
    """The rules that a profile switches off, each with the profile's reason."""
    return [
        NotJudged(change.rule, None, "", f"switched off by limits profile {change.profile}: {change.reason}")
        for change in changes_of(limits)
        if change.severity is None
    ]
