"""
What circuits share that may err alike over all of them: a meter, its zero, a way to obtain lengths or
temperatures, a cable.

Each is a ``Habit``. A problem is tied to a habit where its rows move with it: ``Tie`` says through which figure
and how strongly.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from typing import NamedTuple

from rules.columns import METER_QUANTITY
from rules.diagnosis.problem import Problem
from rules.index import Index
from rules.limits import Limits
from rules.record import Reading, Run
from rules.units import show_size

VOLTAGE, CURRENT, ZERO, RESISTANCE = "voltage", "current", "zero", "resistance"
TEMPERATURE, LENGTH, CABLE = "temperature", "length", "cable"
KINDS = (VOLTAGE, CURRENT, ZERO, RESISTANCE, TEMPERATURE, LENGTH, CABLE)
UNITS = dict.fromkeys(KINDS, "1") | {ZERO: "A", TEMPERATURE: "K"}
"""What a habit's size is counted in: relative, ampere or kelvin."""
PROBE, ASSUMED = "probe", "assumed"


class Habit(NamedTuple):
    """
    One thing that may err alike in all circuits that share it.

    Its size is what it adds to a computed drop: a voltmeter that shows 3 % too much, a clamp that shows 3 % too
    little, lengths that are 3 % longer than recorded have the size 0.03; a clamp that shows 0.1 A too little with
    nothing in its jaws 0.1 A; conductors 5 K warmer than recorded 5 K.
    """

    kind: str
    of: str
    """Tag of the instrument, how a length or temperature was obtained, or the cable."""
    visit: str = ""
    """Of an instrument."""

    @property
    def words(self) -> str:
        """
        What it is.

        >>> Habit("current", "CL-1", "2026").words, Habit("length", "paced").words
        ('clamp CL-1', 'paced lengths')
        """
        return WORDS.get(self.kind, "{}").format(WAYS.get((self.kind, self.of), show_size(self.of)))


WORDS = {
    VOLTAGE: "voltmeter {}",
    CURRENT: "clamp {}",
    ZERO: "zero of clamp {}",
    RESISTANCE: "ohmmeter {}",
    CABLE: "cable {}",
}
WAYS = {
    (LENGTH, "marks"): "lengths by the cable's marks",
    (LENGTH, "tape"): "taped lengths",
    (LENGTH, "tdr"): "lengths by pulse",
    (LENGTH, "paced"): "paced lengths",
    (LENGTH, "drawing"): "lengths from drawings",
    (LENGTH, "guess"): "guessed lengths",
    (TEMPERATURE, "probe"): "probed conductor temperatures",
    (TEMPERATURE, "air"): "conductor temperatures from the air",
    (TEMPERATURE, "assumed"): "assumed conductor temperatures",
}


def order(habit: Habit) -> tuple[int, Habit]:
    """Sorts habits by kind, then by name."""
    return KINDS.index(habit.kind), habit


class Tie(NamedTuple):
    """One way in which a problem's rows move with a habit."""

    figure: str
    """``gain``, ``current`` (a reading, in ampere), ``ohm`` or ``kelvin`` (of a branch's conductors)."""
    number: int
    habit: Habit
    weight: float
    """How much of the figure one unit of the habit is."""


@dataclass(frozen=True, slots=True)
class Expected:
    """What is expected of a habit before anything is read."""

    probability: float
    """That it errs."""
    spread: float
    """Standard deviation of its size where it does, in its unit."""


def ties_of(problem: Problem, runs: Mapping[str, Run], readings: Iterable[Reading], index: Index) -> tuple[Tie, ...]:
    """
    Everything that a problem shares, or could share, with others.

    Parameters
    ----------
    runs : mapping
        The circuit's runs, by id.
    readings : iterable of Reading
        Of the circuit's visit: a conductor's temperature that was read stands in for the recorded one.

    Returns
    -------
    tuple of Tie
        None for a meter that is not recorded: who knows which readings it took.
    """
    ties: list[Tie] = []
    reached = {branch for row in problem.signature.rows for branch, _ in row.path}
    used = {observation for row in problem.signature.rows for observation, _ in row.shown}
    of_gain: dict[int, Reading] = {}
    for number in sorted(used):
        of_gain.setdefault(problem.signature.gain_of[number], problem.observations[number].readings[0])
    for gain, reading in of_gain.items():
        quantity = METER_QUANTITY[reading.quantity]
        if _is_recorded(reading.instrument, quantity, index):
            kind = RESISTANCE if quantity == "resistance" else VOLTAGE
            ties.append(Tie("gain", gain, Habit(kind, reading.instrument, reading.visit_or_default), 1.0))
    for number, (said, amps) in enumerate(zip(problem.current_readings, problem.reading_a, strict=True)):
        reading = said.readings[0]
        if _is_recorded(reading.instrument, "current", index):
            ties.append(Tie("current", number, Habit(CURRENT, reading.instrument, reading.visit_or_default), amps))
            ties.append(Tie("current", number, Habit(ZERO, reading.instrument, reading.visit_or_default), 1.0))
    probed = {row.at for row in readings if row.quantity == "temperature" and not row.is_unloaded}
    for branch, run_id in enumerate(problem.run_ids):
        if run_id and branch in reached:
            run = runs[run_id]
            ties.append(Tie("ohm", branch, Habit(LENGTH, run.length_by_or_default), 1.0))
            ties.append(Tie("ohm", branch, Habit(CABLE, _cable(run)), 1.0))
            by = PROBE if run.name in probed else _temperature_by(run)
            ties.append(Tie("kelvin", branch, Habit(TEMPERATURE, by), 1.0))
    return tuple(ties)


def shared(ties: Iterable[Sequence[Tie]], least: float) -> Counter[Habit]:
    """Habits that at least so many circuits share, with the number of circuits."""
    counts = Counter(habit for of_one in ties for habit in {tie.habit for tie in of_one})
    return Counter({habit: count for habit, count in counts.items() if count >= least})


def expected(habit: Habit, limits: Limits) -> Expected:
    """
    Prior of a habit by the limits profile.

    A way to obtain lengths or temperatures errs in proportion to the doubt that the profile gives it.
    """
    if habit.kind in (LENGTH, TEMPERATURE):
        spread = limits[f"habit.{habit.kind}_times"] * limits[f"{habit.kind}_doubt.{habit.of}"]
    else:
        spread = limits[f"habit.{habit.kind}_{'a' if habit.kind == ZERO else 'relative'}"]
    return Expected(limits[f"habit.{habit.kind}_probability"], spread)


def _is_recorded(instrument: str, quantity: str, index: Index) -> bool:
    return any(row.quantity == quantity for row in index.ranges_of(instrument))


def _temperature_by(run: Run) -> str:
    return run.temperature_by if run.conductor_temperature_c is not None and run.temperature_by else ASSUMED


def _cable(run: Run) -> str:
    """Size, metal and stranding of both legs."""
    out = (run.size, run.material_or_default, run.stranding_or_default)
    back = (run.return_size_or_default, run.return_material_or_default, run.stranding_or_default)
    words = " ".join(out)
    return words if out == back else f"{words} with {' '.join(back[:2])}"
