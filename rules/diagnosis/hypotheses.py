"""Hypotheses with their weights and evidences: what every part of the diagnosis gives, and how parts join."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.shape import Floats

AS_RECORDED = "as recorded"
BAD_CONNECTION = "bad connection"
SMALLER = "smaller conductor"
OTHER_METAL = "other metal"
LONGER = "longer route"
SEMICONDUCTOR = "series semiconductor"
DOUBTFUL = "reading or record doubtful"

CAUSES = (AS_RECORDED, BAD_CONNECTION, SMALLER, OTHER_METAL, LONGER, SEMICONDUCTOR, DOUBTFUL)


@dataclass(frozen=True, slots=True)
class Hypothesis:
    """One way in which the readings may have come about."""

    cause: str
    what: str = ""
    """Which of the cause's ways: ``one size smaller``, ``one reading``."""
    which: tuple[int, ...] = ()
    """Of several alike: the place, the observations."""


@dataclass(frozen=True, slots=True, eq=False)
class Hypotheses:
    """Some hypotheses about a block of problems: b problems, h hypotheses."""

    names: tuple[Hypothesis, ...]
    share: Floats
    """(b, h): of the cause's weight; 0 where it cannot be."""
    log_evidence: Floats
    """(b, h)"""


def joined(parts: Sequence[Hypotheses]) -> Hypotheses:
    """All of them side by side."""
    return Hypotheses(
        tuple(name for part in parts for name in part.names),
        np.concatenate([np.broadcast_to(part.share, part.log_evidence.shape) for part in parts], axis=1),
        np.concatenate([part.log_evidence for part in parts], axis=1),
    )


def normalised(shares: Floats) -> Floats:
    """Shares (b, h) that sum to one in each row, or to nothing where there is none."""
    total = shares.sum(axis=1, keepdims=True)
    even: Floats = np.divide(shares, total, out=np.zeros_like(shares), where=total > 0)
    return even
