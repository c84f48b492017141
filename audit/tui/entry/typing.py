"""What is being typed on a circuit, before any of it is saved."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from rules.record import Reading


@dataclass(frozen=True, slots=True)
class Typing:
    """A circuit's readings as they would be."""

    circuit_id: str
    round: str
    of_visit: Sequence[Reading]
    """The visit's readings: what is typed among them, what it would replace left out."""
