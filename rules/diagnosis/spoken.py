"""A choice as the next reading of an assessment, in the format's words."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from rules.assessment import NextReading
from rules.diagnosis.candidates import AGAIN, LEG, POINT, SINGLE, Posed
from rules.diagnosis.choice import SINGLES, Batch, Choice, doubtful_reading, touched
from rules.diagnosis.hypotheses import BAD_CONNECTION
from rules.diagnosis.information import LEAST, entropy
from rules.diagnosis.next_cautions import caution_words
from rules.diagnosis.next_words import BESIDE_WORDS, Said, bound_words, why_words
from rules.diagnosis.options import DEAD_TEST, FINER, LENGTH, LOOK, ROUND, TEMPERATURE
from rules.diagnosis.rows import DEVICE
from rules.record import Figure

EVENLY = (0.3, 0.7)
"""Between these shares of what is suspected a reading halves it."""
WHOLE = 0.99
"""A branch with this share of the most current carries all of it."""
SUSPECTS = 3
"""So many suspected places are not halved, but looked at."""


class _Asked(NamedTuple):
    """What to read where, in the format's words."""

    what: str
    quantity: str = ""
    at: str = ""
    to: str = ""
    leg: str = ""
    besides: str = ""
    """What else the reading needs."""


def spoken(batch: Batch, number: int, choice: Choice) -> NextReading:
    """A choice in the format's words."""
    asked = _asked(batch, number, choice)
    if choice.way.kind == LOOK:
        probable = batch.atoms.wrong_conductor[number] >= batch.limits["next_reading.look_at"]
        why = (
            "another size or metal is probable" if probable else "no reading tells size, metal and length apart further"
        )
    else:
        at = batch.posed[number].observation(choice.row) if choice.way.kind in SINGLES else None
        pair = [_place(batch, number, choice, group) for group in choice.pair or ()]
        why = why_words(choice.way, at, pair, _halves(batch, number, choice), doubtful_reading(batch, number, choice))
    caution = caution_words(batch.posed[number].case, choice.way)
    if choice.named >= 0:
        caution = f"{caution} {batch.posed[number].named[choice.named].caution}"
        why = batch.posed[number].named[choice.named].why + BESIDE_WORDS.get(choice.way.how, "")
    current_a = choice.current_a
    bounded = bool(current_a) and math.isfinite(choice.most_a)
    return NextReading(
        what=asked.what,
        quantity=asked.quantity,
        at=asked.at,
        to=asked.to,
        leg=asked.leg,
        current_at_least=Figure(current_a, "A") if current_a else None,
        why="; ".join(part for part in (why, asked.besides, *_current_words(batch.posed[number], choice)) if part),
        caution=caution,
        current_at_most=Figure(choice.most_a, "A") if bounded else None,
        minutes=choice.way.minutes,
        # the last digits depend on what else was computed in the same batch
        fall_nats=round(float(batch.options.fall[number, choice.option]), 9) if choice.option >= 0 else None,
    )


def _current_words(posed: Posed, choice: Choice) -> list[str]:
    """Which current is meant, where branches differ, and what bounds it."""
    if not choice.current_a:
        return []
    amps, end = posed.amps, posed.imagined.ends[choice.branch]
    here = abs(amps[choice.branch])
    parted = here < WHOLE * max(map(abs, amps.values())) or sum(run.from_point == "way" for run in posed.case.runs) > 1
    words = [f"the current is that in {posed.imagined.names[choice.branch]}"] if parted else []
    flows_a = max(here, posed.case.tree.design_current_a.get(end) or 0.0)
    return words + bound_words(posed.case, choice.most_a, choice.most_why, flows_a)


def _asked(batch: Batch, number: int, choice: Choice) -> _Asked:
    posed, way = batch.posed[number], choice.way
    if way.kind in SINGLES:
        said = posed.observation(choice.row)
        what = way.how if way.how in (FINER, DEAD_TEST) else "reading"
        if way.kind == POINT:
            besides = f"together with {said.at} and the current, in one round"
            return _Asked(what, "voltage", said.to, besides=besides)
        return _Asked(what, "resistance" if way.how == DEAD_TEST else said.quantity, said.at, said.to, said.leg)
    if way.kind == ROUND:
        doubtful = doubtful_reading(batch, number, choice)
        if doubtful is None:
            return _Asked("round", *_round_places(posed))
        besides = "read it again with the points beside it, as a round of its own"
        return _Asked("reading", doubtful.quantity, doubtful.at, doubtful.to, doubtful.leg, besides)
    if way.kind == LENGTH:
        return _Asked("length", at=posed.imagined.names[choice.row - len(posed.rows_of(SINGLE))])
    branches = posed.imagined.branches
    if way.kind == TEMPERATURE and posed.probed is not None:
        return _Asked("temperature", "temperature", posed.imagined.names[posed.probed[0]])
    ohms = [0.0 if n == DEVICE else b.positive_ohm for n, b in zip(posed.imagined.names, branches, strict=True)]
    besides = "read the print on the sheath and look at the strands"
    return _Asked("reading", at=posed.imagined.names[ohms.index(max(ohms))], besides=besides)


def _round_places(posed: Posed) -> tuple[str, str, str]:
    """Quantity, first and last point of the round with the most current; its first reading where it has no voltages."""
    said = [each for each in posed.imagined.observations if each.round == AGAIN]
    order = ["bus", "way", *posed.case.tree.ends]
    points = sorted({each.at for each in said if each.quantity == "voltage" and each.at in order}, key=order.index)
    return ("voltage", points[0], points[-1]) if len(points) > 1 else (said[0].quantity, said[0].at, said[0].to)


def _place(batch: Batch, number: int, choice: Choice, group: int) -> Said:
    """A group beside a reading."""
    cause, place = batch.atoms.groups[group]
    if place < 0:
        return Said(cause)
    branch = batch.shape.places[place].branch if cause == BAD_CONNECTION else batch.shape.offset_branch(place)
    return Said(cause, batch.posed[number].imagined.names[branch], touched(batch, choice.way, choice.row)[group])


def _halves(batch: Batch, number: int, choice: Choice) -> bool:
    """A reading that parts many suspected places of a bad connection about evenly."""
    shares = batch.atoms.shares[number]
    bad = np.array([group.cause == BAD_CONNECTION for group in batch.atoms.groups])
    whole = float(shares[bad].sum())
    inside = np.array(touched(batch, choice.way, choice.row)) & bad
    suspects = float(np.exp(entropy(shares[bad] / max(whole, LEAST))))  # as many as equal ones would be
    evenly = EVENLY[0] * whole <= float(shares[inside].sum()) <= EVENLY[1] * whole
    return whole > 0.5 and suspects > SUSPECTS and evenly and choice.way.kind in (LEG, POINT)
