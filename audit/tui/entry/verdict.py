"""What a circuit would be said to be with what is being typed; nothing of it is saved."""

from __future__ import annotations

from dataclasses import replace

from audit.tui.drawing.page import CircuitView
from audit.tui.entry.typing import Typing
from rules.assess import assess_circuit
from rules.case import case_of
from rules.context import Context
from rules.expected import expected_voltages
from rules.explain import causes_with_facts


def provisional(context: Context, typing: Typing) -> CircuitView | None:
    """
    Judge a circuit with what is being typed.

    Returns
    -------
    CircuitView or None
        ``None`` where the circuit is not in the context yet, or nothing is typed or read.
    """
    circuit = context.index.circuits.get(typing.circuit_id)
    if circuit is None or not typing.of_visit:
        return None
    result = assess_circuit(context, circuit, typing.of_visit)
    result = replace(result, causes=causes_with_facts(context, circuit, result.causes, typing.of_visit))
    case = case_of(context, circuit, typing.of_visit)
    of_round = [reading for reading in typing.of_visit if reading.round == typing.round]
    return CircuitView(circuit, result, typing.round, of_round, expected_voltages(case, typing.round), is_typing=True)
