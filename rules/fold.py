"""A cause and what follows from it are one finding: after the rules have spoken, findings go under those that explain them."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace

from rules.assessment import Finding
from rules.record import Figure

_SENTENCE = re.compile(r"(?<=\.)\s+")


def folded(findings: Sequence[Finding]) -> list[Finding]:
    """
    Findings with those under a cause that the cause explains, in their order.

    A finding goes under the first of its ``under`` that is among them: as a consequence, with its numbers, its caution and its
    source; the severity of the whole is the gravest. What claims a cause goes under nothing that does not claim the same, and
    nothing under what the profile made less grave. Under a finding of its own rule it is a part of what that one says
    already, unless it says more (``as_consequence``).
    Where no cause is among them, it stands on its own.
    """
    if not any(finding.under for finding in findings):
        return list(findings)
    standing: dict[str, int] = {}
    for number, finding in enumerate(findings):
        standing.setdefault(finding.id, number)
        standing.setdefault("/".join(finding.id.split("/")[:2]), number)
    above = {
        number: cause for number in range(len(findings)) if (cause := _cause(number, findings, standing)) is not None
    }
    held: dict[int, list[Finding]] = defaultdict(list)
    for number in above:
        held[_uppermost(number, above)].append(findings[number])
    return [
        _whole(finding, held[number]) if number in held else finding
        for number, finding in enumerate(findings)
        if number not in above
    ]


def said(findings: Sequence[Finding]) -> Iterator[Finding]:
    """All findings, each followed by those under it."""
    for finding in findings:
        yield finding
        yield from finding.holds


def _cause(number: int, findings: Sequence[Finding], standing: Mapping[str, int]) -> int | None:
    """Number of the finding that one goes under; ``None`` where it stands on its own."""
    finding = findings[number]
    for name in finding.under:
        at = standing.get(name)
        if at is None or at == number:
            continue
        cause = findings[at]
        lowered = cause.by_profile and finding.severity.rank < cause.severity.rank
        if finding.cause in (None, cause.cause) and not lowered:
            return at
    return None


def _uppermost(number: int, above: Mapping[int, int]) -> int:
    """The cause of a cause; rules stand under each other in no circle, which a test holds."""
    while number in above:
        number = above[number]
    return number


def _whole(cause: Finding, under: Sequence[Finding]) -> Finding:
    """A cause with all that follows from it."""
    others = [finding for finding in under if finding.rule != cause.rule or finding.as_consequence]
    numbers, caution, source = dict(cause.numbers), cause.caution, cause.source
    for finding in others:
        numbers |= _numbers(finding, numbers, _is_away(finding, cause))
        caution = " ".join(dict.fromkeys([*_SENTENCE.split(caution), *_SENTENCE.split(finding.caution)]))
        if finding.source not in source:
            source = f"{source}; {finding.rule}: {finding.source}"
    return replace(
        cause,
        severity=min((cause.severity, *(finding.severity for finding in under)), key=lambda severity: severity.rank),
        consequences=(*cause.consequences, *(_words(finding, cause) for finding in others)),
        numbers=numbers,
        caution=caution,
        source=source,
        holds=(*cause.holds, *(replace(finding, holds=()) for finding in said(under))),
    )


def _is_away(finding: Finding, cause: Finding) -> bool:
    """Whether it is about a circuit of which the cause is not."""
    return finding.circuit is not None and finding.circuit != cause.circuit


def _words(finding: Finding, cause: Finding) -> str:
    """A finding as a consequence: what it says, its rule, and what follows from it in turn."""
    place = f"{finding.circuit}: " if _is_away(finding, cause) else ""
    return "; ".join((f"{place}{finding.as_consequence or finding.why} ({finding.rule})", *finding.consequences))


def _numbers(finding: Finding, whole: Mapping[str, Figure], away: bool) -> dict[str, Figure]:
    """Its figures by the names that they have in the whole: ``VD04 measured``; those that stand there already stand once."""
    new = {name: figure for name, figure in finding.numbers.items() if whole.get(name) != figure}
    short = {f"{finding.rule} {name}": figure for name, figure in new.items()}
    if not away and whole.keys().isdisjoint(short):
        return short
    place = f"{finding.circuit} " if away else ""
    return {f"{finding.rule} {place}{finding.where}: {name}": figure for name, figure in new.items()}
