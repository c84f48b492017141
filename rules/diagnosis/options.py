"""
What each thing that could be done next is worth: expected fall in entropy, minutes, and the level of current.

The single readings that look most promising are tried in several ways: at the load of the day, at more current, with a
finer meter, and as a dead test. Everything is an array over a batch, so that a whole site takes seconds.

Written throughout: b problems, o options, c candidates of one row.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from rules.calc.doubt import each_u
from rules.diagnosis.atoms import Atoms
from rules.diagnosis.block import Block
from rules.diagnosis.bounds import operates_a_switch
from rules.diagnosis.candidates import JOINT, LEG, POINT, SINGLE, Posed, kind_of
from rules.diagnosis.hypotheses import BAD_CONNECTION, SEMICONDUCTOR
from rules.diagnosis.information import entropy, fall_by_one, fall_by_several
from rules.diagnosis.outlook import Outlook
from rules.diagnosis.shape import Floats, Integers, Shape
from rules.limits import Limits

LENGTH, TEMPERATURE, ROUND, LOOK = "length", "temperature", "round", "look"
"""Kinds of what may be done beside the single readings; a look is for what no reading tells."""
AS_IT_IS, MORE, LESS = "as it is", "more current", "less current"
ADDED, FINER, DEAD_TEST = "added load", "finer meter", "dead test"
"""How a reading is taken: at the load of the day, at the recorded loads or part of them, with a load of one's own."""
BESIDE = {
    MORE: "other_current",
    LESS: "other_current",
    ADDED: "added_load",
    FINER: "finer_meter",
    DEAD_TEST: "dead_test",
}
"""What comes to the minutes of a reading, by how it is taken."""
HOWS = {
    JOINT: (AS_IT_IS, MORE, ADDED, FINER, DEAD_TEST),
    LEG: (AS_IT_IS, MORE, ADDED, FINER),
    POINT: (AS_IT_IS, MORE, ADDED),
    ROUND: (AS_IT_IS, LESS, MORE, ADDED),
}
"""How each kind may be taken; any other as it is."""
TRIED = {JOINT: 8, LEG: 6, POINT: 4, LENGTH: 2, TEMPERATURE: 1}
"""How many of a kind are looked at, the most promising first."""
MOST_LEVEL = 3.0
"""More than so many times the current of the day is not thought of."""
WORTH_SETTING = 1.2
"""From so many times the current of the day on another current is worth setting."""


DIGITS = 9
"""Digits behind the point of a fall. [nat]"""


@dataclass(frozen=True, slots=True)
class Way:
    """A kind of candidate and how it is taken: the same for all circuits of a batch."""

    kind: str
    how: str
    minutes: float

    @property
    def takes_current(self) -> bool:
        """It is read while current flows."""
        return self.kind not in (LENGTH, TEMPERATURE) and self.how != DEAD_TEST


@dataclass(frozen=True, slots=True, eq=False)
class Options:
    """What could be done next."""

    ways: tuple[Way, ...]
    column: Integers
    """(b, o): place in the outlook's candidates of one row, -1 for a round."""
    level: Floats
    """(b, o): currents over those of the round with the most."""
    counts: Floats
    """(b, o): of the meter, and 0 for a round. [V²]"""
    fall: Floats
    """(b, o): expected; 0 where it cannot be done. [nat]"""
    can_be_done: NDArray[np.bool_]
    """(b, o)"""

    @property
    def score(self) -> Floats:
        """(b, o): what each is worth a minute. [nat/min]"""
        worth: Floats = self.fall / np.array([way.minutes for way in self.ways])
        return worth


@dataclass(frozen=True, slots=True, eq=False)
class Tried:
    """The candidates of one row that are looked at, the most promising of each kind."""

    kinds: tuple[str, ...]
    """(c,)"""
    candidate: Integers
    """(b, c): which of all: the single readings, then lengths, then the temperature."""
    amps: Floats
    """(b, c): current at which each is imagined; 0 for lengths and the temperature. [A]"""
    is_open: NDArray[np.bool_]
    """(b, c): it is not done already."""


def tried_of(posed: Sequence[Posed], block: Block, atoms: Atoms) -> Tried:
    """What is looked at, by what it might tell."""
    kinds = [kind_of(posed[0].observation(row)) for row in posed[0].rows_of(SINGLE)]
    kinds += [LENGTH] * len(posed[0].imagined.names) + [TEMPERATURE]
    promise = _promise(posed, block, atoms, kinds).round(9)
    chosen: list[Integers] = []
    names: list[str] = []
    for kind, most in TRIED.items():
        of_kind = np.flatnonzero([name == kind for name in kinds])
        order = of_kind[np.argsort(-promise[:, of_kind], axis=1, kind="stable")][:, :most]
        chosen.append(order)
        names += [kind] * order.shape[1]
    candidate, number = np.concatenate(chosen, axis=1), np.arange(len(posed))[:, None]
    amps = _currents(posed, block.shape)
    return Tried(tuple(names), candidate, amps[number, candidate], promise[number, candidate] >= 0)


def options_of(
    posed: Sequence[Posed], tried: Tried, atoms: Atoms, outlook: Outlook, most_level: Floats, limits: Limits
) -> Options:
    """
    Everything that could be done next, for a batch.

    Parameters
    ----------
    tried : Tried
        The candidates of one row, in the order of the outlook.
    most_level : array (b,)
        By how much the currents of the round with the most current may be multiplied.
    """
    finer = each_u(limits["finer_meter.voltage_counts"], limits["finer_meter.voltage_resolution"]) ** 2
    dead = each_u(limits["finer_meter.resistance_counts"], limits["finer_meter.resistance_resolution"]) ** 2
    level = _levels(posed, most_level, limits)
    ways: list[Way] = []
    columns, levels, counts = [], [], []
    for column, kind in enumerate(tried.kinds):
        own = outlook.counts[:, column]
        for how in HOWS.get(kind, (AS_IT_IS,)):
            reached = level.get(how, level[AS_IT_IS])
            variance = {FINER: np.minimum(finer, own), DEAD_TEST: dead * (reached * tried.amps[:, column]) ** 2}
            ways.append(Way(kind, how, minutes_of(kind, how, limits)))
            columns.append(column)
            levels.append(np.where(tried.is_open[:, column], reached, np.nan))
            counts.append(variance.get(how, own))
    column_of = np.broadcast_to(np.array(columns), (len(posed), len(columns)))
    reached, counted = np.array(levels).T, np.array(counts).T
    fall = _fall_by_one(atoms, outlook, np.array(columns), reached, counted)
    # a length that proves wrong is put right in the record, and all is settled; else the tape leaves a smaller doubt
    lengths = np.array([way.kind == LENGTH for way in ways])
    wrong = atoms.wrong_length[:, None]
    fall = np.where(lengths, wrong * entropy(atoms.shares)[:, None] + (1 - wrong) * fall, fall)
    if outlook.again_mean.shape[-1]:
        ways += [Way(ROUND, how, minutes_of(ROUND, how, limits)) for how in HOWS[ROUND]]
        of_rounds = np.stack([level[how] for how in HOWS[ROUND]], axis=1)
        nothing = np.zeros(of_rounds.shape)
        column_of = np.concatenate([column_of, nothing.astype(np.int64) - 1], axis=1)
        reached, counted = np.concatenate([reached, of_rounds], axis=1), np.concatenate([counted, nothing], axis=1)
        fall = np.concatenate([fall, _fall_by_round(atoms, outlook, of_rounds)], axis=1)
    done = np.isfinite(reached)
    # the same to the last digit, whatever else goes through the arrays
    fall = np.where(done, fall, 0.0).round(DIGITS)
    return Options(tuple(ways), column_of, np.nan_to_num(reached), counted, fall, done)


def minutes_of(kind: str, how: str, limits: Limits) -> float:
    """Minutes of one reading, by the profile."""
    minutes = limits["next_reading.way_minutes"] + limits[f"next_reading.{kind}_minutes"]
    return minutes + (limits[f"next_reading.{BESIDE[how]}_minutes"] if how in BESIDE else 0.0)


def _levels(posed: Sequence[Posed], most_level: Floats, limits: Limits) -> dict[str, Floats]:
    """(b,) by how a reading is taken: level of current, not a number where it is not worth setting."""
    design = np.array([each.design_level for each in posed])
    most = np.minimum(most_level, MOST_LEVEL)
    # a coil is read with what supervises it: there is no other current to set
    most[[operates_a_switch(each.case) for each in posed]] = 1.0
    recorded = np.minimum(most, design)
    return {
        AS_IT_IS: np.minimum(most_level, 1.0),
        LESS: np.minimum(most_level, limits["next_reading.lower_share"]),
        MORE: np.where(recorded >= WORTH_SETTING, recorded, np.nan),
        ADDED: np.where(most >= WORTH_SETTING * np.maximum(design, 1.0), most, np.nan),
    }


def _promise(posed: Sequence[Posed], block: Block, atoms: Atoms, kinds: Sequence[str]) -> Floats:
    """
    (b, c): how much each candidate might tell, to choose those that are looked at; below 0 where it is done already.

    A joint by the probability that it is the bad one; a leg or a point by how evenly it parts what is suspected; a
    length by what its doubt weighs; a length that was taped and a temperature that was probed are left alone.
    """
    shape, limits = block.shape, block.limits
    rows = posed[0].rows_of(SINGLE)
    touched = np.zeros((len(atoms.groups), len(rows)))
    for number, group in enumerate(atoms.groups):
        if group.cause == BAD_CONNECTION:
            touched[number] = shape.coefficient[rows, shape.place_element[group.place]] != 0
        elif group.cause == SEMICONDUCTOR:
            touched[number] = shape.offset_rows[group.place, rows] != 0
    share = atoms.shares @ touched
    joints = np.array([kind == JOINT for kind in kinds[: len(rows)]], dtype=bool)
    ohm = block.conductor @ shape.run_of.T
    lengths = np.where(block.length_u > limits["length_doubt.tape"], ohm * block.length_u, -1.0)
    for number, each in enumerate(posed):
        for place, row in enumerate(rows) if each.named else ():
            if each.named_at(row) is not None:
                share[number, place] += 1.0  # it is looked at in any case
    warm = np.array([-1.0 if each.probed is None else 1.0 for each in posed])
    return np.concatenate([np.where(joints, share, share * (1 - share)), lengths, warm[:, None]], axis=1)


def _currents(posed: Sequence[Posed], shape: Shape) -> Floats:
    """(b, c): current at which each single reading is imagined; 0 for lengths and the temperature. [A]"""
    slot = {key: number for number, key in enumerate(shape.signature.slots)}
    rows = [shape.signature.rows[row] for row in posed[0].rows_of(SINGLE)]
    slots = [slot[row.state, row.path[0][0]] for row in rows]
    amps = np.array([each.imagined.amps for each in posed])[:, slots]
    return np.concatenate([np.abs(amps), np.zeros((len(posed), len(posed[0].imagined.names) + 1))], axis=1)


def _fall_by_one(atoms: Atoms, outlook: Outlook, column: Integers, level: Floats, counts: Floats) -> Floats:
    """(b, o): expected falls by single readings, 0 where the level is not a number."""
    fall, member = np.zeros(level.shape), atoms.member
    for number, levels in enumerate(level):
        done = np.isfinite(levels)
        grown, which = levels[done, None], column[done]
        mean, steady, variance, clamp = (
            array[number, which] for array in (outlook.mean, outlook.steady, outlook.variance, outlook.clamp)
        )
        spread = counts[number, done, None] + clamp + grown**2 * variance
        fall[number, done] = fall_by_one(atoms.weight[number], member[number], steady + grown * mean, spread)
    return fall


def _fall_by_round(atoms: Atoms, outlook: Outlook, level: Floats) -> Floats:
    """(b, o): expected falls by the round once more, 0 where the level is not a number."""
    fall, member = np.zeros(level.shape), atoms.member
    for number, option in np.argwhere(np.isfinite(level)).tolist():
        grown = level[number, option]
        mean = outlook.again_steady[number] + grown * outlook.again_mean[number]
        covariance = outlook.again_fixed[number] + grown**2 * outlook.again_covariance[number]
        fall[number, option] = fall_by_several(atoms.weight[number], member[number], mean, covariance)
    return fall
