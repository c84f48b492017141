"""
What the diagnosis is given of one circuit: rows of readings over branches, as a structure and numbers.

The structure (``Signature``) is hashable, so that circuits of equal shape can be taken together; the numbers
stand in the order that it fixes. A *row* is one linear fact: a sum of what meters showed against a sum of
drops along a path. A *state* is a round; a dead test has none. A *branch* is the device or a run. A *source* is
one thing about the currents that errs on its own: the gain of a clamp, the counts of a reading, a tap.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple
from weakref import WeakValueDictionary

from rules.record import Figure, Reading

DEAD = -1
"""State of a dead test, which needs no current."""

LEGS = ("positive", "negative")
ENDS = ("start", "end")
TERMINATIONS = tuple(f"{end} {leg}" for end in ENDS for leg in LEGS)
"""The four terminations of a run, as the format names them behind ``run 2``."""


class Row(NamedTuple):
    """One linear fact."""

    state: int
    part: str
    """``both``, a leg, or one termination such as ``end positive``."""
    path: tuple[tuple[int, int], ...]
    """Branch and sign, in the sense of the current."""
    shown: tuple[tuple[int, int], ...]
    """Observation and sign."""


class CurrentReading(NamedTuple):
    """Which sources belong to one current reading."""

    own: int
    gain: int


@dataclass(frozen=True, slots=True, weakref_slot=True)
class Signature:
    """The structure of a problem: circuits that share it go through the same arrays."""

    branches: tuple[str, ...]
    """``run``, or ``device`` with its leg: ``device both``."""
    rows: tuple[Row, ...]
    gain_of: tuple[int, ...]
    """Which gain each observation shares with others."""
    gains: int
    states: int
    slots: tuple[tuple[int, int], ...]
    """State and branch of each current."""
    errors: tuple[tuple[int, int], ...]
    """Slot and source of each way in which a current may err."""
    sources: int
    current_readings: tuple[CurrentReading, ...]
    swaps: tuple[tuple[int, int], ...]
    """Observations that may have been entered at each other's points."""
    common: int = 0
    """How many columns of doubt other circuits have taught (``Common``); each counts as a source."""


def one(signature: Signature) -> Signature:
    """The one object for all equal signatures, so that circuits are grouped without comparing structures again."""
    return _KNOWN.setdefault(signature, signature)


_KNOWN: WeakValueDictionary[Signature, Signature] = WeakValueDictionary()


@dataclass(frozen=True, slots=True)
class Observation:
    """What one meter showed at one place in one round: the mean of its readings there."""

    quantity: str
    at: str
    to: str
    leg: str
    round: str
    readings: tuple[Reading, ...]

    @property
    def words(self) -> str:
        """``voltage at p1, round 2``."""
        place = f"from {self.at} to {self.to}" if self.to else f"at {self.at}"
        leg = f", {self.leg} leg" if self.leg in LEGS else ""
        return f"{self.quantity} {place}{leg}, round {self.round}"


class Branch(NamedTuple):
    """The device or a run in numbers, as recorded; the positive leg stands before the negative."""

    positive_ohm: float = 0.0
    negative_ohm: float = 0.0
    """Of a leg's conductor, or of the device's pole. [ohm]"""
    positive_slope_ohm_per_k: float = 0.0
    negative_slope_ohm_per_k: float = 0.0
    positive_joint_ohm: float = 0.0
    negative_joint_ohm: float = 0.0
    """Mean of each of a leg's two healthy terminations. [ohm]"""
    positive_joint_variance: float = 0.0
    negative_joint_variance: float = 0.0
    """Of each. [ohm²]"""
    length_u: float = 0.0
    """Relative."""
    temperature_u_k: float = 0.0
    extra_scale: float = 1.0
    """What the range of a bad connection's resistance is multiplied with."""
    hot_ohm: float = 0.0
    """Extra resistance whose heat at design current passes the profile's limit; 0 where not known. [ohm]"""


@dataclass(frozen=True, slots=True)
class Common:
    """
    What other circuits have taught about errors that this one shares with them, through a meter or a habit.

    The figures are means; each column moves all of them together by one standard uncertainty, so that errors of
    which only the sum is known stay tied.
    """

    gain: tuple[float, ...]
    """Of each gain: shown over true, less one."""
    amps: tuple[float, ...]
    """Of each slot: true less read. [A]"""
    ohm: tuple[float, ...]
    """Of each branch: resistance of its conductors over the recorded one, less one."""
    gain_columns: tuple[tuple[float, ...], ...]
    amps_columns: tuple[tuple[float, ...], ...]
    ohm_columns: tuple[tuple[float, ...], ...]
    lasting: tuple[Figure, ...]
    """Of each branch: the part of ``ohm`` that is not its temperature while it was read."""
    relative: Figure
    """What all of it adds to the computed drops, on average."""


@dataclass(frozen=True, slots=True)
class Problem:
    """One circuit as the diagnosis takes it."""

    signature: Signature
    names: tuple[str, ...]
    """Of the branches: ``device``, ``run 2``."""
    run_ids: tuple[str, ...]
    """Of the branches; empty for the device."""
    ends: tuple[str, ...]
    """The points at which the branches arrive; ``way`` for the device, empty for a run that closes a mesh."""
    branches: tuple[Branch, ...]
    """In the order of the signature; those that no row reaches are there too: what is wrong in them stays open."""
    alternatives: tuple[tuple[float, ...], ...]
    """Of each branch: resistance of other conductors over the recorded (``rules.diagnosis.conductors``), each in the
    positive leg, then in the negative; 0 where there is none."""
    value: tuple[float, ...]
    """Of each observation. [V, or ohm for a dead test]"""
    variance: tuple[float, ...]
    """Of what each observation does not share: counts, display, wander."""
    gain_u: tuple[float, ...]
    """Relative, of each gain."""
    amps: tuple[float, ...]
    """In each slot. [A]"""
    error_a: tuple[float, ...]
    """Standard uncertainty, signed, of each entry of ``signature.errors``. [A]"""
    reading_a: tuple[float, ...]
    """Each current reading. [A]"""
    reading_u: tuple[float, ...]
    """Its own standard uncertainty. [A]"""
    reading_gain_u: tuple[float, ...]
    """Relative standard uncertainty of its meter's gain."""
    nominal_v: float
    observations: tuple[Observation, ...]
    current_readings: tuple[Observation, ...]
    rounds: tuple[str, ...]
    """Name of each state."""
    wander: tuple[float, ...] = ()
    """Of each observation: the part of ``variance`` that repeated readings show, widened for their number."""
    wander_freedom: int = 0
    """Degrees of freedom of what they show; 0 where nothing was repeated."""
    common: Common | None = None
    """``None`` where nothing was learned: all other figures are as read and recorded either way."""

    @property
    def used(self) -> frozenset[str]:
        """Ids of the readings that enter a row; those of currents left out."""
        numbers = {number for row in self.signature.rows for number, _ in row.shown}
        return frozenset(reading.id for number in numbers for reading in self.observations[number].readings)
