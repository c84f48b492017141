"""
An assessment as the JSON object ``ohmwalk.check/1`` of the format, and the schema that describes it.

A figure that is not known, not a number or infinite is left out, never written as one. Every text has
its control codes replaced, since the file may be shown in a terminal.
"""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Mapping
from importlib.resources import files
from typing import Any, TypeAlias

from rules.assessment import (
    Assessment,
    CircuitResult,
    Drop,
    Finding,
    NextReading,
    NotJudged,
    Place,
    PointVoltage,
    RuleChange,
)
from rules.record import Figure
from rules.text import clean

Json: TypeAlias = dict[str, Any]

SCHEMA_NAME = "ohmwalk.check/1"
"""What the object calls itself; the number grows when a key changes its meaning."""


def as_json(assessment: Assessment) -> Json:
    """The whole assessment, keys in the format's order."""
    return {
        "schema": SCHEMA_NAME,
        "program": clean(assessment.program),
        "site": {"name": clean(assessment.site), "limits": clean(assessment.limits)},
        "summary": assessment.summary,
        "circuits": [_circuit(result) for result in assessment.circuits],
        "findings": [_finding(finding) for finding in assessment.findings],
        "not_judged": [_not_judged(gap) for gap in assessment.not_judged],
        "rule_changes": [_rule_change(change) for change in assessment.rule_changes],
    }


def as_text(document: Mapping[str, Any]) -> str:
    """The JSON text: UTF-8 letters as they are, no NaN or infinity, one newline at the end."""
    return json.dumps(document, ensure_ascii=False, allow_nan=False, indent=2) + "\n"


def schema() -> Json:
    """The JSON Schema (2020-12) of ``check --json`` and of the ``.json`` report."""
    text = files("audit.report").joinpath("check.schema.json").read_text(encoding="utf-8")
    document: Json = json.loads(text)
    return document


def quantity(figure: Figure | None) -> Json | None:
    """``{"value", "u", "unit"}``; ``None`` where the figure is not known or not finite."""
    if figure is None or not math.isfinite(figure.value):
        return None
    out: Json = {"value": figure.value}
    if figure.u is not None and math.isfinite(figure.u):
        out["u"] = figure.u
    out["unit"] = figure.unit
    return out


def _circuit(result: CircuitResult) -> Json:
    return _without_none(
        {
            "circuit": clean(result.circuit),
            "visit": clean(result.visit),
            "status": str(result.status),
            "drop": _drop(result.drop),
            "causes": [_cause(place, result) for place in result.causes if math.isfinite(place.probability)],
            "points": [_point(point) for point in result.points],
            "next_reading": _next_reading(result.next_reading),
        }
    )


def _drop(drop: Drop | None) -> Json | None:
    if drop is None:
        return None
    figures = {name: quantity(getattr(drop, name)) for name in ("measured", "computed", "excess")}
    if None in figures.values():
        return None
    doubts = {clean(doubt.name): quantity(Figure(doubt.u_v, "V")) for doubt in drop.budget}
    return _without_none({"round": clean(drop.round), **figures, "doubts": _without_none(doubts) or None})


def _cause(place: Place, result: CircuitResult) -> Json:
    heat = result.heat_of(place)
    extra = {"value": place.best_ohm, "low": place.low_ohm, "high": place.high_ohm}
    known = {name: value for name, value in extra.items() if value is not None and math.isfinite(value)}
    return _without_none(
        {
            "cause": clean(place.cause),
            "where": clean(place.where),
            "probability": place.probability,
            "extra_resistance": {**known, "unit": "ohm"} if len(known) == len(extra) else None,
            "heat_read": quantity(heat.read) if heat is not None else None,
            "heat_design": quantity(heat.design) if heat is not None else None,
            "what": clean(place.what) or None,
            "for": [clean(fact) for fact in place.speaks_for] or None,
            "against": [clean(fact) for fact in place.speaks_against] or None,
        }
    )


def _point(point: PointVoltage) -> Json:
    return _without_none(
        {
            "point": clean(point.point),
            "design": quantity(point.design),
            "worst": quantity(point.worst),
            "lowest": quantity(point.lowest),
        }
    )


def _next_reading(reading: NextReading | None) -> Json | None:
    if reading is None:
        return None
    texts = {name: clean(getattr(reading, name)) for name in ("what", "quantity", "at", "to", "leg")}
    return _without_none(
        {name: text or None for name, text in texts.items()}
        | {
            "current_at_least": quantity(reading.current_at_least),
            "current_at_most": quantity(reading.current_at_most),
            "why": clean(reading.why) or None,
            "caution": clean(reading.caution) or None,
        }
    )


def _finding(finding: Finding) -> Json:
    return {
        "id": clean(finding.id),
        "rule": clean(finding.rule),
        "circuit": _clean_or_none(finding.circuit),
        "board": _clean_or_none(finding.board),
        "where": clean(finding.where),
        "severity": str(finding.severity),
        "cause": _clean_or_none(finding.cause),
        "title": clean(finding.title),
        "why": clean(finding.why),
        "consequences": [clean(text) for text in finding.consequences],
        "numbers": _numbers(finding.numbers.items()),
        "remedy": clean(finding.remedy),
        "caution": clean(finding.caution),
        "source": clean(finding.source),
    }


def _numbers(numbers: Iterable[tuple[str, Figure]]) -> Json:
    return _without_none({clean(name): quantity(figure) for name, figure in numbers})


def _rule_change(change: RuleChange) -> Json:
    return _without_none(
        {
            "rule": change.rule,
            "off": change.severity is None,
            "severity": str(change.severity) if change.severity is not None else None,
            "usual": str(change.usual),
            "reason": clean(change.reason),
            "profile": clean(change.profile),
        }
    )


def _not_judged(gap: NotJudged) -> Json:
    return {
        "rule": clean(gap.rule),
        "circuit": _clean_or_none(gap.circuit),
        "where": clean(gap.where),
        "why": clean(gap.why),
    }


def _clean_or_none(text: str | None) -> str | None:
    return None if text is None else clean(text)


def _without_none(document: Json) -> Json:
    return {key: value for key, value in document.items() if value is not None}
