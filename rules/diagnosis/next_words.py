"""A next reading in words that a surveyor can act on: what it tells from what."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from rules.case import CircuitCase
from rules.diagnosis.bounds import OPERATES, operates_a_switch, rounded_down
from rules.diagnosis.candidates import JOINT, LEG, POINT
from rules.diagnosis.hypotheses import (
    AS_RECORDED,
    BAD_CONNECTION,
    DOUBTFUL,
    LONGER,
    OTHER_METAL,
    SEMICONDUCTOR,
    SMALLER,
)
from rules.diagnosis.options import ADDED, DEAD_TEST, FINER, LENGTH, LESS, MORE, TEMPERATURE, Way
from rules.diagnosis.problem import Observation
from rules.units import show

CAUSE_WORDS = {
    AS_RECORDED: "a circuit as recorded",
    BAD_CONNECTION: "a bad connection",
    SEMICONDUCTOR: "a semiconductor",
    SMALLER: "a smaller conductor",
    OTHER_METAL: "another metal",
    LONGER: "a longer route",
    DOUBTFUL: "a doubtful reading or record",
}
"""Causes as a sentence names them."""
OTHERWISE = {
    LENGTH: "the doubt of the length hides the rest",
    TEMPERATURE: "the doubt of the temperature hides the rest",
}
"""What a reading is for that tells no two causes apart by itself."""
DEAD_METER = "with a four-wire micro-ohmmeter, for others show nothing below about 10 mΩ"
"""What a joint is read with when dead."""
BESIDE_WORDS = {
    FINER: "; the meter at hand is too coarse for it",
    DEAD_TEST: f"; live, no current that may flow is enough: {DEAD_METER}",
    LESS: "; a second round at less current, at which a semiconductor loses as much",
    MORE: "; at more current than today",
    ADDED: "; with a load of your own",
}
"""What is to be known of how a reading is taken."""


@dataclass(frozen=True, slots=True)
class Said:
    """A cause in one place, beside the reading that is to tell it from another."""

    cause: str
    branch: str = ""
    """``run 2``; empty for the whole circuit."""
    touched: bool = False
    """It lies in what is read across."""


def why_words(way: Way, at: Observation | None, pair: Sequence[Said], halves: bool, slip: Observation | None) -> str:
    """
    What a reading tells, as one sentence part.

    Parameters
    ----------
    at : Observation or None
        The single reading; ``None`` for a round, a length, a temperature.
    pair : sequence of Said
        The two causes that it tells apart, the more probable first; empty where there is one alone.
    halves : bool
        It parts many suspected places about evenly.
    slip : Observation or None
        The reading that is doubtful, where one is.

    Examples
    --------
    >>> at = Observation("joint", "run 2 end", "", "positive", "", ())
    >>> pair = [Said("longer route"), Said("bad connection", "run 2", True)]
    >>> why_words(Way("joint", "as it is", 5), at, pair, False, None)
    'tells a bad connection there from a longer route'
    """
    if slip is not None:
        return f"the {slip.words} does not fit"
    ordered = sorted(pair, key=lambda said: not said.touched)
    told = " from ".join(_words(said, way, at, ordered[0]) for said in ordered)
    told = f"tells {told}" if told else OTHERWISE.get(way.kind, "tells most for its effort")
    if halves:
        told = (
            f"measure the middle first: {told}"
            if way.kind == POINT
            else f"{told}, and halves the suspected joints, quicker than one end after another"
        )
    return told + BESIDE_WORDS.get(way.how, "")


def bound_words(case: CircuitCase, most_a: float, why: str, flows_a: float) -> list[str]:
    """
    What bounds a current that is asked for, each as a sentence part; empty where nothing does.

    Parameters
    ----------
    most_a : float
        That may flow; infinite where no bound is known. [A]
    why : str
        What more would do.
    flows_a : float
        What flows by itself: read, or at design. [A]
    """
    words = [f"at the supervision current only; more {OPERATES}"] if operates_a_switch(case) else []
    if math.isinf(most_a):
        return words
    if why != OPERATES:
        words.append(f"more than {show(most_a, 'A')} {why}")
    if rounded_down(flows_a) > most_a:
        words.append("with load taken off")
    return words


def _words(said: Said, way: Way, at: Observation | None, first: Said) -> str:
    """One of two causes."""
    if at is None or not said.branch:
        return CAUSE_WORDS[said.cause] + (f" in {said.branch}" if said.branch else "")
    name = CAUSE_WORDS[said.cause]
    if said.touched:
        return name + {JOINT: " there", LEG: " in this leg", POINT: f" before {at.to}"}[way.kind]
    if first is not said and first.cause == said.cause:
        name = "one"
    if way.kind == LEG:
        return f"{name} in the other leg" if said.branch == first.branch else f"{name} in {said.branch}"
    if way.kind == POINT:
        return f"{name} behind {at.to}"
    return f"{name} elsewhere in {said.branch}" if said.branch == first.branch else f"{name} in {said.branch}"
