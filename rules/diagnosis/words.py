"""Which way of a cause explains the readings best, in words: a size, a length, or which slip of which reading."""

from __future__ import annotations

from rules.diagnosis.doubtful import CURRENT_READING, NEAR, ONE_READING, RATIOS, SWAPPED
from rules.diagnosis.judge import Judged
from rules.diagnosis.problem import Observation, Problem
from rules.units import show

ABOUT_AS_MUCH = 0.3
"""Share of the best slip's probability from which another reading is named beside it."""
MOST_READINGS = 2
RECORD_WORDS = {
    "length_as_loop": "the length recorded as one way is that of the loop",
    "metres_for_feet": "the length recorded in metres is in feet",
    "parallel_path": "a parallel path carries part of the current",
    "clamp_reversed": "the clamp was held the other way round",
    "several_things": "no single cause explains the readings: several things are wrong",
}


def what_words(judged: Judged, number: int, which: int, problem: Problem) -> str:
    """The way of a hypothesis in words; empty where the cause has but one."""
    name = judged.hypotheses.names[which]
    if name.what in (ONE_READING, CURRENT_READING):
        return "; or ".join(_slipped(judged, number, other, problem) for other in _alike(judged, number, which))
    if name.what == SWAPPED:
        first, second = (problem.observations[place] for place in sorted(name.which))
        return f"the voltages at {first.at} and {second.at}, round {first.round}, stand at each other's points"
    return RECORD_WORDS.get(name.what, name.what)


def _alike(judged: Judged, number: int, which: int) -> list[int]:
    """The readings whose slip explains about as much as the best one's, which is first."""
    posterior = judged.posterior[number]
    others = [
        other
        for other, name in enumerate(judged.hypotheses.names)
        if name.what in (ONE_READING, CURRENT_READING)
        and other != which
        and posterior[other] > ABOUT_AS_MUCH * posterior[which]
    ]
    return [which, *others][:MOST_READINGS]


def _slipped(judged: Judged, number: int, which: int, problem: Problem) -> str:
    """One reading that does not fit."""
    name, read = judged.hypotheses.names[which], judged.block.shape.read
    (place,) = name.which
    if name.what == CURRENT_READING:
        off = float(judged.slips.off[number, len(read) + place])
        return slip_words(problem.current_readings[place], problem.reading_a[place], off)
    off = float(judged.slips.off[number, int(read.searchsorted(place))])
    return slip_words(problem.observations[place], problem.value[place], off)


def slip_words(said: Observation, entered: float, off: float) -> str:
    """
    A reading that does not fit, what was probably meant, and the slip that it looks like.

    >>> from rules.record import Reading
    >>> slip_words(Observation("voltage", "p1", "", "both", "1", (Reading(id="r", quantity="voltage"),)), 2.341, 21.07)
    'voltage at p1, round 1: 2.341 V was entered, about 23.4 V would fit (a decimal place)'
    """
    unit = said.readings[0].unit
    meant = entered + off
    slip = next(
        (words for ratio, words in RATIOS.items() if entered and abs(meant / entered / ratio - 1) < 2 * NEAR), ""
    )
    looks = f" ({slip})" if slip else ""
    return f"{said.words}: {show(entered, unit)} was entered, about {show(meant, unit, digits=3)} would fit{looks}"
