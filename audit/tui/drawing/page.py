"""
The page of one circuit: the sketch with what was read above what is computed, the verdict, the profile, then
findings, rounds and record.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

from audit.report.bar import text_bar
from audit.report.phrases import (
    STATUS_MEANING,
    drop_words,
    figure_words,
    next_reading_words,
    status_words,
)
from audit.report.records import READING_DIGITS, circuit_line
from audit.tui.drawing.causes import cause_lines
from audit.tui.drawing.doubts import doubt_lines
from audit.tui.drawing.findings import finding_lines, gap_lines
from audit.tui.drawing.margins import margin_lines
from audit.tui.drawing.pieces import Line, Piece, apart, cut, piece, wrapped
from audit.tui.drawing.profile import profile_lines, profile_of
from audit.tui.drawing.record import record_lines
from audit.tui.drawing.rounds import round_lines
from audit.tui.drawing.sketch import Bad, sketch_lines
from audit.tui.state import Survey
from rules.assessment import CircuitResult, Status
from rules.record import Circuit, Figure, Reading
from rules.units import show

MOST_READ = 2
"""Readings that stand above one point; all of them stand in the rounds."""


@dataclass(frozen=True, slots=True)
class CircuitView:
    """One circuit with what was said of it, and what is being typed."""

    circuit: Circuit
    result: CircuitResult | None
    round: str
    """The round whose voltages are shown; empty where nothing was read."""
    readings: Sequence[Reading]
    """Of that round, not replaced; what is being typed among them."""
    expected: Mapping[str, Figure]
    """Computed voltage of each point in that round."""
    is_typing: bool = False
    """Nothing of it is saved yet."""


def view_of(survey: Survey, circuit_id: str) -> CircuitView | None:
    """What the record and its judgement say of a circuit; ``None`` for one that is not there (any more)."""
    circuit = survey.index.circuits.get(circuit_id)
    if circuit is None:
        return None
    result = survey.results.get(circuit_id)
    replaced = survey.index.replaced
    readings = [r for r in survey.index.readings_of(circuit_id) if r.id not in replaced and not r.is_unloaded]
    name = ""
    if result is not None and result.visit:
        of_visit = [reading for reading in readings if reading.visit_or_default == result.visit]
        name = result.drop.round if result.drop is not None else _last_round(of_visit)
        readings = [reading for reading in of_visit if reading.round == name]
    expected = _expected(survey, circuit_id, name)
    return CircuitView(circuit, _explained(survey, circuit, result), name, readings if name else (), expected)


def _explained(survey: Survey, circuit: Circuit, result: CircuitResult | None) -> CircuitResult | None:
    """A result whose causes say what speaks for and against each: only of what is looked at."""
    if survey.context is None or result is None or not result.causes:
        return result
    from rules.explain import causes_with_facts  # it brings numpy, for which the first screen does not wait

    known = survey.context.index.circuits.get(circuit.id)
    if known is None:
        return result
    return replace(result, causes=causes_with_facts(survey.context, known, result.causes))


def _last_round(readings: Sequence[Reading]) -> str:
    """The last round with a voltage, else the last; empty where nothing was read."""
    with_volts = [reading.round for reading in readings if reading.quantity == "voltage"]
    return next(reversed(with_volts or [reading.round for reading in readings]), "")


def _expected(survey: Survey, circuit_id: str, round_name: str) -> Mapping[str, Figure]:
    context = survey.context
    if context is None or not round_name or (circuit := context.index.circuits.get(circuit_id)) is None:
        return {}
    from rules.case import case_of  # it brings numpy, for which the first screen does not wait
    from rules.expected import expected_voltages

    return expected_voltages(case_of(context, circuit), round_name)


def page_lines(survey: Survey, view: CircuitView, width: int, height: int) -> list[Line]:
    """
    The whole page.

    Parameters
    ----------
    height : int
        Cells in sight: the profile takes its share of them.
    """
    circuit, result = view.circuit, view.result
    waits = "" if survey.cannot_judge else "judging … "
    lines = [head_line(circuit, result, width, is_typing=view.is_typing, waits=waits), ()]
    lines += circuit_sketch(survey, view, width)
    if result is None:
        return [cut(one, width) for one in (*lines, (), _waiting(survey))]
    lines += _verdict(result, width)
    lines += cause_lines(result, width)
    plotted = profile_lines(
        profile_of(survey.index, circuit.id, _computed(view), _volts(view)), width, min(14, max(8, height // 3))
    )
    lines += [(), *plotted] if plotted else []
    for finding in result.findings:
        lines += [(), *finding_lines(finding, width, place=False)]
    if loads := margin_lines(result, width):
        lines += _section("loads", loads)
    if doubts := doubt_lines(result, width):
        lines += _section("doubt", doubts)
    rounds = round_lines(survey.index, circuit.id, width)
    lines += _section("rounds", rounds or [(piece("   nothing was read", "measure"),)])
    if survey.context is not None:
        lines += _section("record", record_lines(survey.index, circuit, result, survey.context.limits, width))
    lines += _section("not judged", gap_lines(result.not_judged, width)) if result.not_judged else []
    return [cut(one, width) for one in (*lines, ())]


def head_line(
    circuit: Circuit, result: CircuitResult | None, width: int, *, is_typing: bool = False, waits: str = "judging … "
) -> Line:
    """Tag and description, and the status at the right; while a value is typed, that it would have."""
    status: Line = (piece(waits, "quiet"),)
    if result is not None:
        status = (piece(f"{status_words(result.status)} ", str(result.status)),)
    if is_typing:
        status = (piece("as typed  ", "quiet"), *status)
    return apart((piece(" "), piece(circuit.tag, "strong"), piece(f"  {circuit.description}")), status, width)


def _waiting(survey: Survey) -> Line:
    """Where a verdict would stand: that it is being worked out, or why there is none."""
    if survey.cannot_judge:
        return (piece(f"   not judged: {survey.cannot_judge}", "wrong"),)
    return (Piece("   judging …", "quiet"),)


def _section(name: str, lines: list[Line]) -> list[Line]:
    return [(), (piece(f" {name}", "quiet"),), *lines]


def circuit_sketch(survey: Survey, view: CircuitView, width: int) -> list[Line]:
    """The circuit from left to right, what was read above what is computed."""
    result = view.result or CircuitResult(view.circuit.tag, view.circuit.id, "", Status.MEASURE, "")
    drawn = circuit_line(survey.index, view.circuit, result)
    if drawn is None:
        return [(piece("   no run is recorded: a adds one", "incomplete"),)]
    read: dict[str, list[str]] = {}
    for reading in view.readings:
        if reading.quantity == "voltage" and reading.leg in ("", "both"):
            read.setdefault(reading.at, []).append(show(reading.value, "V", digits=READING_DIGITS))
    above = {
        point: ", ".join(texts[:MOST_READ]) + (" …" if len(texts) > MOST_READ else "") for point, texts in read.items()
    }
    below = {point: figure_words(figure) for point, figure in _computed(view).items()}
    return sketch_lines(drawn.paths, above, below, width, _bad_places(survey, result))


def _bad_places(survey: Survey, result: CircuitResult) -> dict[str, Bad]:
    """The likeliest bad place, by the point where its run ends."""
    leading = max(result.causes, key=lambda place: place.probability, default=None)
    if leading is None or not leading.where.startswith("run "):
        return {}
    from rules.verdict import probability_words  # who judged has it loaded; the first screen does not wait for it

    _, number, *rest = leading.where.split()
    mark = Bad(probability_words(leading.probability), at_start="start" in rest)
    runs = survey.index.runs_of(result.circuit_id)
    return {survey.index.end_of(run): mark for run in runs if str(run.number) == number}


def _computed(view: CircuitView) -> Mapping[str, Figure]:
    """Of the round that is shown, else at design load."""
    if view.expected or view.result is None:
        return view.expected
    return {point.point: point.design for point in view.result.points if point.design is not None}


def _volts(view: CircuitView) -> dict[str, tuple[float, ...]]:
    volts: dict[str, tuple[float, ...]] = {}
    for reading in view.readings:
        if reading.quantity == "voltage" and reading.leg in ("", "both"):
            volts[reading.at] = (*volts.get(reading.at, ()), reading.value)
    return volts


def _verdict(result: CircuitResult, width: int) -> list[Line]:
    words = drop_words(result)
    bar = piece(
        text_bar(words.bar, 24 if width > 100 else 16), "act" if words.bar is not None and words.bar.past else "bar"
    )
    state = f"computed {words.computed or 'not known'}"
    if (drop := result.drop) is not None:
        amps = show(drop.current.value, drop.current.unit, digits=3)
        state += f", {drop.start} to {drop.end}, {amps}, round {drop.round}"
    elif result.design_drop is not None:
        state += " at design load"
    lines: list[Line] = [()]
    lines.append(cut((piece(" "), bar, piece(f"  {words.of_allowed}", "strong"), piece(f"  {state}", "quiet")), width))
    lines += wrapped(result.why or STATUS_MEANING[result.status], width - 1, 3)
    if (following := result.next_reading) is not None:
        said = next_reading_words(following)
        lines += wrapped(f"{said}: {following.why}" if following.why else said, width - 1, 9, "loud", "   next")
        lines += wrapped(following.caution, width - 1, 9, "caution") if following.caution else []
    return lines
