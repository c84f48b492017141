"""The text and the JSON of ``ohmwalk rules``: plain in a pipe, within 80 columns, in the encoding of the output."""

from __future__ import annotations

import inspect
import sys
from collections.abc import Iterable
from importlib.metadata import version
from typing import Any, TextIO

from audit.errors import WrongUse
from audit.report.text import Page, console_for
from audit.rule_page import RulePage, rule_page
from rules.assessment import Citation
from rules.limits import Limits
from rules.rule import Rule, catalogue
from rules.text import clean, nearest, quoted

SCHEMA_NAME = "ohmwalk.rules/1"
INDENT = 6


def rule_of(id_: str) -> Rule:
    """
    The rule of an id, in capitals or not.

    Raises
    ------
    WrongUse
        If there is none.
    """
    known = {rule.id: rule for rule in catalogue()}
    found = known.get(id_.strip().upper())
    if found is None:
        close = nearest(id_.strip().upper(), list(known))
        meant = f"; did you mean {close}?" if close else f"; there are: {', '.join(known)}"
        raise WrongUse(f"no rule {quoted(id_)}{meant}")
    return found


def print_rules(limits: Limits, stream: TextIO | None = None) -> None:
    """One entry a rule: id, title, what it is about, its usual severity, one line, and where it comes from."""
    page = _page(stream)
    for rule in catalogue():
        this = rule_page(rule, limits)
        page.hang(f"{this.id}  ", this.title, "bold")
        page.line(f"{this.usual}; here {this.here}" if this.here else this.usual, indent=INDENT)
        page.line(this.brief, indent=INDENT)
        page.line(this.origin, indent=INDENT)
    page.line()
    page.line(f"Limits: profile {limits.name}.")
    page.line("ohmwalk rules ID prints the page of one, with its limits and cautions.")


def print_rule(rule: Rule, limits: Limits, stream: TextIO | None = None) -> None:
    """The page of one rule."""
    page, this = _page(stream), rule_page(rule, limits)
    page.hang(f"{this.id}  ", this.title, "bold")
    for part in this.parts:
        page.line()
        if part.heading:
            page.line(part.heading, "bold")
        page.pairs(((row.label, row.words) for row in part.rows), indent=2)


def rules_json(rules: Iterable[Rule], limits: Limits) -> dict[str, Any]:
    """Rules with all that their pages say, as one JSON object."""
    return {
        "schema": SCHEMA_NAME,
        "program": clean(version("ohmwalk")),
        "limits": clean(limits.name),
        "rules": [_rule(rule, rule_page(rule, limits), limits) for rule in rules],
    }


def _rule(rule: Rule, page: RulePage, limits: Limits) -> dict[str, Any]:
    setting = limits.rules.get(rule.id)
    severity = setting.severity if setting is not None and setting.severity is not None else rule.severity
    return {
        "rule": rule.id,
        "title": rule.title,
        "about": [rule.about, *rule.also_about],
        "severity": str(rule.severity),
        "in_force": {
            "off": setting is not None and setting.off,
            "severity": str(severity),
            "reason": clean(setting.reason) if setting is not None else "",
        },
        "brief": page.brief,
        "text": inspect.cleandoc(rule.text),
        "remedy": rule.remedy,
        "caution": rule.caution,
        "sources": [_citation(citation) for citation in (rule.source, *rule.also)],
        "limits": [
            {
                "group": name,
                "key": key,
                "value": limits.groups[name].words.get(key, limits.groups[name].values.get(key)),
                "unit": clean(limits.groups[name].unit),
                "source": clean(stated.source),
                "edition": clean(stated.edition),
                "status": clean(stated.status),
                "profile": clean(stated.origin),
            }
            for name in rule.limits
            for stated, keys in limits.groups[name].by_source().items()
            for key in keys
        ],
    }


def _citation(citation: Citation) -> dict[str, str]:
    return {
        "document": citation.document,
        "edition": citation.edition,
        "clause": citation.clause,
        "status": citation.status,
    }


def _page(stream: TextIO | None) -> Page:
    out = sys.stdout if stream is None else stream
    return Page(console_for(out), getattr(out, "encoding", None) or "utf-8")
