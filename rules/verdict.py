"""What a diagnosis allows one to say: which fault it claims, whether it settles a circuit, whether it is sound."""

from __future__ import annotations

import math
from dataclasses import dataclass

from rules.assessment import Drop, Place
from rules.case import CircuitCase
from rules.diagnosis.doubtful import RATIOS
from rules.diagnosis.hypotheses import (
    AS_RECORDED,
    BAD_CONNECTION,
    DOUBTFUL,
    LONGER,
    OTHER_METAL,
    SEMICONDUCTOR,
    SMALLER,
)
from rules.limits import Limits
from rules.record import Figure
from rules.terminals import low_source_of
from rules.units import show

FAMILIES = ((BAD_CONNECTION,), (SEMICONDUCTOR,), (SMALLER, OTHER_METAL, LONGER))
"""Causes that readings often cannot tell from each other: a ratio of 1.6 is a size, a metal or a length."""

CONDUCTORS = FAMILIES[-1]
"""Of these a claim is that the conductors are not as recorded."""
TOLD = 0.01
"""Probability from which a cause is mentioned."""
NOT_RULED_OUT = 0.05
"""Probability from which a fault stands against another that is claimed."""
MOST_SAID = 3
"""Causes that a sentence holds."""


@dataclass(frozen=True, slots=True)
class Claim:
    """The fault that readings claim."""

    cause: str
    """The most probable of its family."""
    places: tuple[Place, ...]
    """Rows of the cause, most probable first: as many as it takes to hold most of its probability."""
    probability: float
    """Of the cause, all its places together."""
    others: tuple[Place, ...]
    """The rest of the family, as far as it matters."""
    against: tuple[Place, ...]
    """Faults of other families that are not ruled out."""

    @property
    def place(self) -> Place:
        return self.places[0]

    @property
    def joints(self) -> tuple[Place, ...]:
        """Every single place in which a connection may be bad."""
        return tuple(joint for place in self.places for joint in place.joints or (place,))

    @property
    def where(self) -> str:
        """The places, empty for what holds for the whole circuit."""
        return " or ".join(place.where for place in self.places if place.where)


def fault_probability(causes: tuple[Place, ...]) -> float:
    """Probability that something is wrong with the circuit, not with its record or a reading."""
    return sum(place.probability for place in causes if place.cause not in (AS_RECORDED, DOUBTFUL))


def claimed(causes: tuple[Place, ...], limits: Limits) -> Claim | None:
    """
    The cause that the readings claim, ``None`` where they claim none.

    A fault is claimed at the profile's ``decision.fault_at``. Of the family that has the profile's
    ``decision.cause_at`` of its probability the most probable cause is named.
    """
    fault = fault_probability(causes)
    if fault < limits["decision.fault_at"]:
        return None
    sums: dict[str, float] = {}
    for place in causes:
        sums[place.cause] = sums.get(place.cause, 0.0) + place.probability
    family = max(FAMILIES, key=lambda members: sum(sums.get(name, 0.0) for name in members))
    if sum(sums.get(name, 0.0) for name in family) < limits["decision.cause_at"] * fault:
        return None
    cause = max(family, key=lambda name: sums.get(name, 0.0))
    rows, held = [], 0.0
    for place in causes:
        if place.cause == cause and held < limits["decision.place_at"] * sums[cause]:
            rows.append(place)
            held += place.probability
    others = (place for place in causes if place.cause in family and place.cause != cause and place.probability >= TOLD)
    against = (
        place
        for place in causes
        if place.cause not in (*family, AS_RECORDED, DOUBTFUL) and place.probability >= NOT_RULED_OUT
    )
    return Claim(cause, tuple(rows), sums[cause], tuple(others), tuple(against))


def doubtful(causes: tuple[Place, ...]) -> Place | None:
    """The row of a doubtful reading or record where that is more probable than not."""
    return next((place for place in causes if place.cause == DOUBTFUL and place.probability > 0.5), None)


def is_by_a_factor(slip: Place) -> bool:
    """Whether a doubtful reading is off by a factor, its sign left out."""
    return any(f"({words})" in slip.what for ratio, words in RATIOS.items() if ratio > 0)


def unsettled(case: CircuitCase) -> str:
    """Why the readings do not settle a circuit; empty where they do, by a fault that they claim or by none."""
    if not case.visit:
        return (case.circuit.not_tested and f"not tested: {case.circuit.not_tested}") or "nothing was read"
    if case.diagnosis is None:
        if case.drop is not None and any(run.id in case.tree.shared for run in case.runs):
            return "a drop over a shared return is compared with the record, but its causes are not weighed"
        return case.drop_gap or "the readings say nothing about a run"
    causes = case.diagnosis.causes
    if claimed(causes, case.limits) is not None or _as_recorded(causes) >= case.limits["decision.sound_at"]:
        return ""
    if (slip := doubtful(causes)) is not None:
        what = (
            f"{slip.what} ({probability_words(slip.probability)})" if slip.what else probability_words(slip.probability)
        )
        return f"a reading or the record is wrong: {what}"
    said = [cause_words(place) for place in causes[:MOST_SAID] if place.probability >= TOLD]
    return f"not settled: {', '.join(said)}"


def unsound(case: CircuitCase) -> str:
    """What stands against calling a circuit sound although its readings agree with the record; empty where nothing does."""
    if case.diagnosis is None or _as_recorded(case.diagnosis.causes) < case.limits["decision.sound_at"]:
        return "the readings do not support the record"
    low = low_source_of(case.context, case.circuit.id)
    if low is not None:
        return f"its source was read below its lowest: {show(low.voltage.value, 'V', low.voltage.u)} by the {low.place}"
    share, limit_w = case.limits["decision.sound_heat_share"], case.limits["heat.limit_w"]
    for place in case.diagnosis.causes:
        if place.heat is not None and place.heat >= share:
            return (
                f"a bad connection in {place.where} of more than {show(limit_w, 'W')} at design current is not ruled out: "
                f"probability {probability_words(place.heat)}"
            )
    for point in case.loads:
        lowest, worst = point.load.lowest_voltage_v, case.worst.get(point.load.point)
        if lowest is not None and worst is not None and worst.value < lowest:
            return (
                f"{point.load.tag} would get {show(worst.value, 'V', worst.u)} with the source at its lowest, "
                f"below its lowest {show(lowest, 'V')}"
            )
    return ""


def agrees(case: CircuitCase) -> str:
    """Why a circuit is sound."""
    causes = case.diagnosis.causes if case.diagnosis is not None else ()
    alike = f"; {common_words(case.common)}" if case.common is not None else ""
    return f"the readings agree with the record: probability {probability_words(_as_recorded(causes))}{alike}"


def common_words(common: Figure) -> str:
    """
    An error that circuits share, as it is carried in one of them.

    >>> common_words(Figure(-0.062, "1", 0.005))
    'judged with the 6.2 ± 0.5 % less that circuits which share its meters and habits lose alike (HB01)'
    """
    return (
        f"judged with the {show(abs(common.value), '1', common.u)} {'more' if common.value > 0 else 'less'} "
        "that circuits which share its meters and habits lose alike (HB01)"
    )


def beyond_common(drop: Drop, common: Figure | None) -> Figure:
    """Excess of a drop over what is computed with the error that circuits share; the excess as it is where there is none."""
    if common is None:
        return drop.excess
    return Figure(
        drop.excess.value - common.value * drop.computed.value,
        "V",
        math.hypot(drop.excess.u or 0.0, (common.u or 0.0) * drop.computed.value),
    )


def cause_words(place: Place) -> str:
    """
    A row of causes in words.

    >>> cause_words(Place("bad connection", "run 2", 0.83)), cause_words(Place("as recorded", "", 0.9991))
    ('bad connection in run 2 (0.83)', 'as recorded (above 0.99)')
    """
    where = f" in {place.where}" if place.where else ""
    what = f": {place.what}" if place.what else ""
    return f"{place.cause}{where} ({probability_words(place.probability)}{what})"


def probability_words(probability: float) -> str:
    """
    Two digits, and never a certainty.

    >>> probability_words(0.834), probability_words(0.999), probability_words(0.0001)
    ('0.83', 'above 0.99', 'below 0.01')
    """
    if probability > 0.99:
        return "above 0.99"
    return "below 0.01" if probability < 0.01 else f"{probability:.2f}"


def _as_recorded(causes: tuple[Place, ...]) -> float:
    return sum(place.probability for place in causes if place.cause == AS_RECORDED)
