"""
What other circuits teach, carried into a circuit's problem.

Sizes of habits become means of what they act on (readings, currents, conductors), and their covariance becomes
columns that move all of these together.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from rules.diagnosis.habits import CURRENT, Tie
from rules.diagnosis.problem import Common, Problem, one
from rules.diagnosis.shape import Floats
from rules.record import Figure


def with_common(
    problem: Problem, ties: Sequence[Tie], slots: Sequence[int], mean: Floats, covariance: Floats
) -> Problem:
    """
    The problem with means and columns of doubt of its ties' habits.

    Parameters
    ----------
    slots : sequence of int
        Of each tie: which size it is.
    mean : array (k,)
        Sizes of the habits.
    covariance : array (k, k)
        Gains that the habits stand for lose their own doubt: it is a part of this.
    """
    value, vector = np.linalg.eigh(covariance)
    sizes = np.concatenate([mean[None], (vector * np.sqrt(np.maximum(value, 0.0))).T])
    signature = problem.signature
    gain = np.zeros((len(sizes), signature.gains))
    amps = np.zeros((len(sizes), len(signature.slots)))
    ohm, lasting = np.zeros((2, len(sizes), len(signature.branches)))
    gain_u, error_a, reading_gain_u = list(problem.gain_u), list(problem.error_a), list(problem.reading_gain_u)
    for tie, slot in zip(ties, slots, strict=True):
        moved = tie.weight * sizes[:, slot]
        if tie.figure == "gain":
            gain[:, tie.number] += moved
            gain_u[tie.number] = 0.0
        elif tie.figure == "current":
            read = signature.current_readings[tie.number]
            for entry, (place, source) in enumerate(signature.errors):
                if source == read.own:
                    amps[:, place] += moved * problem.error_a[entry] / problem.reading_u[tie.number]
                elif source == read.gain and tie.habit.kind == CURRENT:
                    error_a[entry] = 0.0
                    reading_gain_u[tie.number] = 0.0
        elif tie.figure == "ohm":
            ohm[:, tie.number] += moved
            lasting[:, tie.number] += moved
        else:
            ohm[:, tie.number] += moved * _per_kelvin(problem, tie.number)
    return replace(
        problem,
        signature=one(replace(signature, sources=signature.sources + len(mean), common=len(mean))),
        gain_u=tuple(gain_u),
        error_a=tuple(error_a),
        reading_gain_u=tuple(reading_gain_u),
        common=Common(
            gain=_floats(gain[0]),
            amps=_floats(amps[0]),
            ohm=_floats(ohm[0]),
            gain_columns=tuple(_floats(row) for row in gain[1:]),
            amps_columns=tuple(_floats(row) for row in amps[1:]),
            ohm_columns=tuple(_floats(row) for row in ohm[1:]),
            lasting=tuple(_figure(row) for row in lasting.T),
            relative=_figure(_relative(problem, gain, amps, ohm)),
        ),
    )


def _relative(problem: Problem, gain: Floats, amps: Floats, ohm: Floats) -> Floats:
    """
    What each row of changes adds to the computed drops of a circuit, over their sum.

    Parameters
    ----------
    gain : array (rows, gains)
    amps : array (rows, slots)
        [A]
    ohm : array (rows, branches)
        Relative, of the conductors.
    """
    branch = [branch for _, branch in problem.signature.slots]
    conductor = np.array([it.positive_ohm + it.negative_ohm for it in problem.branches])
    joints = 2 * np.array([it.positive_joint_ohm + it.negative_joint_ohm for it in problem.branches])
    read = np.array(problem.amps)
    whole = np.abs(read * (conductor + joints)[branch])
    moved = np.sign(read) * amps * (conductor + joints)[branch] + np.abs(read) * ohm[:, branch] * conductor[branch]
    used = sorted({problem.signature.gain_of[n] for row in problem.signature.rows for n, _ in row.shown})
    if not whole.sum() > 0:  # dead tests alone
        whole, moved = conductor, ohm * conductor
    relative: Floats = gain[:, used].mean(axis=1) + moved.sum(axis=1) / max(whole.sum(), 1e-300)
    return relative


def _figure(moved: Floats) -> Figure:
    """A mean, and behind it what each column adds to its doubt."""
    return Figure(float(moved[0]), "1", math.sqrt(float(moved[1:] @ moved[1:])))


def _floats(row: Floats) -> tuple[float, ...]:
    return tuple(row.tolist())


def _per_kelvin(problem: Problem, branch: int) -> float:
    """Relative rise of a branch's conductor resistance with each kelvin."""
    figures = problem.branches[branch]
    ohm = figures.positive_ohm + figures.negative_ohm
    return (figures.positive_slope_ohm_per_k + figures.negative_slope_ohm_per_k) / ohm if ohm else 0.0
