"""
Explanations of what an assessment says of causes: only for what is asked for, since few of many circuits are looked at.

``assess(…, explain=True)`` asks for all circuits, as the JSON and the reports do.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from rules.assessment import Assessment, CircuitResult, Place
from rules.context import Context
from rules.diagnosis.explanation import explained
from rules.diagnosis.problem import Problem
from rules.measured import measured_of, posed_by, ties_by
from rules.record import Circuit, Reading


def with_facts(context: Context, results: Sequence[CircuitResult]) -> list[CircuitResult]:
    """Results of circuits whose causes say what speaks for and against each; the context is that which they were judged in."""
    posed: dict[int, Problem] = {}
    for number, result in enumerate(results):
        circuit = context.index.circuits.get(result.circuit_id)
        problem = _posed(context, circuit, None) if result.causes and circuit is not None else None
        if problem is not None:
            posed[number] = problem
    causes = explained(list(posed.values()), [results[number].causes for number in posed], context.limits)
    out = list(results)
    for number, rows in zip(posed, causes, strict=True):
        out[number] = replace(results[number], causes=rows)
    return out


def assessment_with_facts(context: Context, assessment: Assessment) -> Assessment:
    """A whole assessment with what speaks for and against each cause."""
    return replace(assessment, circuits=tuple(with_facts(context, assessment.circuits)))


def causes_with_facts(
    context: Context, circuit: Circuit, causes: tuple[Place, ...], readings: Sequence[Reading] | None = None
) -> tuple[Place, ...]:
    """
    The causes of one circuit with what speaks for and against each.

    Parameters
    ----------
    readings : sequence of Reading, optional
        Readings of one visit that stand in for the recorded ones, as they did when the circuit was judged.
    """
    problem = _posed(context, circuit, readings) if causes else None
    return explained([problem], [causes], context.limits)[0] if problem is not None else causes


def _posed(context: Context, circuit: Circuit, readings: Sequence[Reading] | None) -> Problem | None:
    """What was diagnosed, with what other circuits teach."""
    known = context.measured.get(circuit.id) if readings is None else None
    measured = measured_of(context, circuit, readings) if known is None else known
    problem = posed_by(context, measured)
    return None if problem is None else context.taught.told(circuit.id, problem, ties_by(context, measured, problem))
