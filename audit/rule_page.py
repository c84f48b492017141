"""
The page of one rule: what it finds, what it leaves alone, the limits in force, cautions and sources.

The command, the terminal interface and the JSON all show what ``rule_page`` makes.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from audit.limit_words import limit_words
from rules.assessment import Citation, RuleChange
from rules.limits import Limits
from rules.rule import Rule, changes_of

FROM_MEMORY = "from-memory"
_LABEL = re.compile(r"\*\*(.+?)\*\*:?\s*")


@dataclass(frozen=True, slots=True)
class Row:
    """A label and what stands beside it."""

    label: str
    words: str
    role: str = ""
    """``strong``, ``caution`` or ``quiet`` where it stands out or back."""


@dataclass(frozen=True, slots=True)
class Part:
    """Rows under one heading; the first part has none."""

    heading: str
    rows: tuple[Row, ...]


@dataclass(frozen=True, slots=True)
class RulePage:
    """Everything that is said of a rule, under the limits of a profile."""

    id: str
    title: str
    brief: str
    """What it finds in one sentence."""
    usual: str
    """What it is about and its usual severity."""
    here: str
    """What the profile makes of it; empty where it leaves it as it is."""
    origin: str
    """Where it comes from in one line, with what is from memory."""
    parts: tuple[Part, ...]


def rule_page(rule: Rule, limits: Limits) -> RulePage:
    """The page of a rule, with its limits as a profile holds them."""
    paragraphs = _paragraphs(rule.text)
    usual = f"{_listed((rule.about, *rule.also_about))}, usually {rule.severity}"
    here = next((_change_words(change) for change in changes_of(limits) if change.rule == rule.id), "")
    about = [Row("about", usual), *([Row("here", here, "strong")] if here else [])]
    text = [Row(label, words) for label, words in paragraphs]
    acts = [Row("do", rule.remedy, "strong"), Row("caution", rule.caution, "caution")]
    in_force: list[Row] = []
    for group in (limits.groups[name] for name in rule.limits):
        for stated, keys in group.by_source().items():
            values = "; ".join(limit_words(group, key) for key in keys)
            in_force += (Row(group.name.replace("_", " "), f"{group.title}: {values}"), Row("", str(stated), "quiet"))
    none = (Row("", "It decides by no limit of the profile.", "quiet"),)
    cited = (rule.source, *rule.also)
    return RulePage(
        id=rule.id,
        title=rule.title,
        brief=_first_sentence(paragraphs[0][1]),
        usual=usual,
        here=here,
        origin="; ".join([*map(str, cited), *_limits_from_memory(rule, limits)]),
        parts=(
            Part("", (*about, *text, *acts)),
            Part(f"Limits in force, profile {limits.name}", tuple(in_force) or none),
            Part("Sources", tuple(Row(citation.status, _place(citation)) for citation in cited)),
        ),
    )


def _listed(words: tuple[str, ...]) -> str:
    """
    Words of a list.

    >>> _listed(("circuit",)), _listed(("circuit", "board", "source"))
    ('circuit', 'circuit, board and source')
    """
    return " and ".join(filter(None, (", ".join(words[:-1]), words[-1])))


def _paragraphs(text: str) -> list[tuple[str, str]]:
    """Label and words of each paragraph; the first says what is found, in general."""
    found = []
    for number, paragraph in enumerate(re.split(r"\n\s*\n", text)):
        words = " ".join(paragraph.replace("``", "").split())
        labelled = _LABEL.match(words)
        label = labelled[1].lower() if labelled else "what" if number == 0 else ""
        found.append((label, _capital(words[labelled.end() :] if labelled else words)))
    return found


def _capital(words: str) -> str:
    """A sentence of its own, beside its label."""
    return words[:1].upper() + words[1:]


def _first_sentence(words: str) -> str:
    return re.split(r"(?<=[.:;]) ", words, maxsplit=1)[0].rstrip(":;.") + "."


def _change_words(change: RuleChange) -> str:
    does = "switched off" if change.severity is None else f"reports {change.severity}"
    return f"{does}, by limits profile {change.profile}: {change.reason}"


def _limits_from_memory(rule: Rule, limits: Limits) -> list[str]:
    names = [
        name.replace("_", " ")
        for name in rule.limits
        if any(stated.status == FROM_MEMORY for stated in limits.groups[name].by_source())
    ]
    return [f"limits {FROM_MEMORY}: {', '.join(names)}"] if names else []


def _place(citation: Citation) -> str:
    """Document, edition and clause."""
    document = f"{citation.document}:{citation.edition}" if citation.edition else citation.document
    return f"{document}, {citation.clause}" if citation.clause else document
