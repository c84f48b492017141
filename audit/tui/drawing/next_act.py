"""The next useful act: one sentence above the keys, the loudest thing on the screen."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from audit.report.phrases import next_reading_words
from audit.tui.state import Survey
from rules.assessment import CircuitResult, Severity, Status

_PATIENCE = 400
"""How many circuits of the walk are looked through for one that wants doing."""


@dataclass(frozen=True, slots=True)
class NextAct:
    """What to do, and at which circuit."""

    circuit_id: str
    """Empty where it is not about a circuit."""
    words: str


def next_act(survey: Survey, here: str, following: Iterable[str]) -> NextAct | None:
    """
    The next act in the walk.

    Parameters
    ----------
    here : str
        Id of the circuit at the cursor; its own need comes first.
    following : iterable of str
        Ids of the circuits after it, in walking order.

    Returns
    -------
    NextAct or None
        ``None`` where nothing is left to do, or nothing is judged yet.
    """
    if not survey.index.circuits:
        return NextAct("", _first_steps(survey))
    for number, circuit_id in enumerate((here, *following)):
        if number > _PATIENCE:
            break
        result = survey.results.get(circuit_id)
        words = "" if result is None else need(survey, result)
        if words and result is not None:
            return NextAct(circuit_id, f"{result.circuit}: {_lowered(words)}")
    return None


def need(survey: Survey, result: CircuitResult) -> str:
    """What a circuit wants done; empty where it wants nothing."""
    urgent = [finding for finding in result.findings if finding.severity is Severity.IMMEDIATE]
    if urgent:
        return f"{_lowered(urgent[0].title)}: {_lowered(urgent[0].remedy)}"
    if result.next_reading is not None:
        return next_reading_words(result.next_reading)
    if result.status is Status.INCOMPLETE:
        return f"{result.why}: e enters it"
    circuit = survey.index.circuits.get(result.circuit_id)
    if result.circuit_id not in survey.read_now and circuit is not None and not circuit.not_tested:
        points = survey.index.points_of(result.circuit_id)
        return f"current, then the voltage at {_points(points)}: m measures"
    soon = [finding for finding in result.findings if finding.severity is Severity.SOON]
    return soon[0].remedy if soon else ""


def _lowered(sentence: str) -> str:
    """A sentence as the part of another; a word in capitals stays."""
    return sentence if sentence[1:2].isupper() else sentence[:1].lower() + sentence[1:]


def _points(points: tuple[str, ...]) -> str:
    return ", ".join(points) if len(points) <= 3 else f"{points[0]}, {points[1]} … {points[-1]}"


def _first_steps(survey: Survey) -> str:
    if not survey.site.sources:
        return "a adds what is there: first a source, then a board on it, then its circuits"
    if not survey.site.boards:
        return "a adds a board, or a circuit on the source"
    return "a adds a circuit to the board at the cursor"
