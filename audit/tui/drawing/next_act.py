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
        wanted = None if result is None or (number > 0 and _is_left_out(survey, circuit_id)) else need(survey, result)
        if wanted is not None and result is not None:
            key = f" ({wanted.key})" if wanted.key else ""
            return NextAct(circuit_id, f"{result.circuit}{key}: {_lowered(wanted.words)}")
    return None


def _is_left_out(survey: Survey, circuit_id: str) -> bool:
    """Whether a reason is recorded why a circuit was not measured: it is not asked for again and again."""
    circuit = survey.index.circuits.get(circuit_id)
    return circuit is not None and bool(circuit.not_tested)


@dataclass(frozen=True, slots=True)
class Need:
    """What a circuit wants done."""

    words: str
    key: str = ""
    """The key that does it."""


def need(survey: Survey, result: CircuitResult) -> Need | None:
    """What a circuit wants done: danger first, then what tells most; ``None`` where it wants nothing."""
    urgent = [finding for finding in result.findings if finding.severity is Severity.IMMEDIATE]
    if urgent:
        return Need(f"{_lowered(urgent[0].title)}: {_lowered(urgent[0].remedy)}")
    following = result.next_reading
    if following is not None:
        measured = following.what == "round" or following.quantity == "voltage"
        return Need(next_reading_words(following), "m" if measured else "o" if following.quantity else "e")
    if result.status is Status.INCOMPLETE:
        return Need(result.why, "e")
    if result.circuit_id not in survey.read_now:
        return Need(f"current, then the voltage at {_points(survey.index.points_of(result.circuit_id))}", "m")
    soon = [finding for finding in result.findings if finding.severity is Severity.SOON]
    return Need(soon[0].remedy) if soon else None


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
