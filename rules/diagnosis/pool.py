"""
What each circuit says of the habits that it shares, as a small Gaussian, and all of them as arrays.

With everything else as recorded a circuit's rows move in a straight line with the sizes of its habits, so that
its log density is a quadratic of them. Against it stands what all other causes explain, which hardly depends on
habits: a circuit with a fault of its own then says nothing about what it shares.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.block import model_of, stacked
from rules.diagnosis.diagnose import LEAST, Diagnosis
from rules.diagnosis.gaussian import LOG_2PI, cholesky, forward, log_determinant
from rules.diagnosis.habits import Habit, Tie
from rules.diagnosis.healthy import healthy
from rules.diagnosis.hypotheses import AS_RECORDED
from rules.diagnosis.judge import grouped
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import Floats, Integers, shape_of
from rules.limits import Limits


@dataclass(frozen=True, slots=True)
class Member:
    """One circuit of a pool: its problem, what ties it to habits, and its diagnosis as if it shared nothing."""

    problem: Problem
    ties: tuple[Tie, ...]
    """To the pool's habits alone."""
    diagnosis: Diagnosis


@dataclass(frozen=True, slots=True, eq=False)
class Pool:
    """m circuits over E habits; each circuit has at most k. Slots that a circuit does not use name the habit E."""

    habits: tuple[Habit, ...]
    within: Floats
    """(E,): standard uncertainty by specification, of a meter's gain; 0 of what has none."""
    index: Integers
    """(m, k)"""
    pull: Floats
    """(m, k): slope of the log density at size zero."""
    curve: Floats
    """(m, k, k): its curvature, negative."""
    recorded: Floats
    """(m,): log of prior times density with every size zero."""
    otherwise: Floats
    """(m,): log of prior times evidence of all other causes."""
    relative: Floats
    """(m, k): what one unit of a habit adds to the circuit's computed drops, relative."""
    weight: Floats
    """(m,): what the circuit's drops tell of a factor on all of them."""

    def __len__(self) -> int:
        return len(self.index)


def pooled(members: Sequence[Member], habits: Sequence[Habit], limits: Limits) -> Pool:
    """
    The evidence of circuits about habits.

    Parameters
    ----------
    members : sequence of Member
        In an order that does not depend on that of the record's rows.
    habits : sequence of Habit
        All that occur in the members' ties.
    """
    place = {habit: number for number, habit in enumerate(habits)}
    own = [sorted({place[tie.habit] for tie in member.ties}) for member in members]
    most, count = max((len(numbers) for numbers in own), default=0), len(members)
    index = np.full((count, most), len(habits), dtype=np.int64)
    within = np.zeros(len(habits))
    for number, (member, numbers) in enumerate(zip(members, own, strict=True)):
        index[number, : len(numbers)] = numbers
        for tie in member.ties:
            within[place[tie.habit]] = max(within[place[tie.habit]], specified_u(member.problem, tie))
    pull, curve, relative = np.zeros((count, most)), np.zeros((count, most, most)), np.zeros((count, most))
    density, weight = np.zeros(count), np.zeros(count)
    for batch in grouped([member.problem for member in members]):
        some = [members[number] for number in batch]
        slots = [{place_: slot for slot, place_ in enumerate(own[number])} for number in batch]
        moves = _moves(some, [[slot[place[tie.habit]] for tie in m.ties] for m, slot in zip(some, slots, strict=True)])
        gram, log_scale = _gram(some, moves, most, limits)
        density[batch] = log_scale - 0.5 * gram[:, 0, 0]
        weight[batch] = gram[:, 1, 1]
        relative[batch] = gram[:, 1, 2:] / np.maximum(gram[:, 1, 1], 1e-300)[:, None]
        pull[batch], curve[batch] = gram[:, 0, 2:], gram[:, 2:, 2:]
    others = np.array([_otherwise(member.diagnosis) for member in members])
    prior = math.log(max(limits.prior.get(AS_RECORDED, 0.0), 1e-300))
    return Pool(tuple(habits), within, index, pull, curve, prior + density, others, relative, weight)


def specified_u(problem: Problem, tie: Tie) -> float:
    """Standard uncertainty by specification of the gain behind a tie; 0 where it is none's."""
    if tie.figure == "gain":
        return problem.gain_u[tie.number]
    if tie.figure == "current" and tie.habit.kind == "current":
        return problem.reading_gain_u[tie.number]
    return 0.0


def _otherwise(diagnosis: Diagnosis) -> float:
    """Log of the summed evidence, with priors, of everything but "as recorded"."""
    share = sum(place.probability for place in diagnosis.causes if place.cause != AS_RECORDED)
    return diagnosis.log_evidence + math.log(max(share, LEAST))


Move = tuple[str, int, int, float]
"""Figure and its number, slot of the habit, weight."""


def _moves(members: Sequence[Member], slots: Sequence[Sequence[int]]) -> list[list[Move]]:
    return [
        [(tie.figure, tie.number, slot, tie.weight) for tie, slot in zip(member.ties, of_one, strict=True)]
        for member, of_one in zip(members, slots, strict=True)
    ]


def _gram(
    members: Sequence[Member], moves: Sequence[Sequence[Move]], most: int, limits: Limits
) -> tuple[Floats, Floats]:
    """
    Inner products (b, 2 + k, 2 + k) of residual, mean and habits under the inverse covariance, and the density's scale.

    Gains that habits stand for are left out of the covariance: they err alike in all circuits.
    """
    shape = shape_of(members[0].problem.signature)
    signature = shape.signature
    block = stacked(shape, [member.problem for member in members], limits)
    model = model_of(block, block.conductor[:, None], block.conductor_slope[:, None])
    mean, shared = model.whole_mean[:, 0], model.whole_shared[:, 0].copy()
    figures = _figures(members, block.carried[:, 0, :, : shape.conductors.stop], block.conductor)
    gains = shape.gain_rows * mean[:, None]
    if shape.gain_parts is not None:
        gains = gains + np.einsum("gno,bo->bgn", shape.gain_parts, block.value)
    own = [read.own for read in signature.current_readings]
    amps = shared[:, :, [signature.gains + source for source in own]].transpose(0, 2, 1) / block.reading_u[..., None]
    of_figure = {**figures, "gain": gains, "current": amps}
    columns = np.zeros((len(members), most, shape.rows))
    for number, of_one in enumerate(moves):
        for figure, which, slot, weight in of_one:
            columns[number, slot] += weight * of_figure[figure][number, which]
            if figure == "gain":
                shared[number, :, which] = 0.0
            elif figure == "current":
                shared[number, :, signature.gains + signature.current_readings[which].gain] = 0.0
    covariance = model.whole_own[:, 0] + shared @ np.swapaxes(shared, -1, -2)
    right = np.concatenate([(block.shown - mean)[..., None], mean[..., None], np.swapaxes(columns, 1, 2)], axis=-1)
    lower = cholesky(covariance)
    white = forward(lower, right)
    scale = -0.5 * (log_determinant(lower) + shape.rows * LOG_2PI) + healthy(block).log_ratio.sum(axis=1)
    return np.swapaxes(white, -1, -2) @ white, scale


def _figures(members: Sequence[Member], amps: Floats, conductor: Floats) -> Mapping[str, Floats]:
    """Rows (b, branches, n) of the conductors of each branch, whole and by one kelvin more."""
    shape = shape_of(members[0].problem.signature)
    legs = np.array(
        [
            [(b.positive_slope_ohm_per_k, b.negative_slope_ohm_per_k) for b in member.problem.branches]
            for member in members
        ]
    ).reshape(len(members), -1)
    slope = legs @ shape.conductor_of.T
    return {
        "ohm": np.swapaxes((amps * conductor[:, None]) @ shape.run_of.T, 1, 2),
        "kelvin": np.swapaxes((amps * slope[:, None]) @ shape.run_of.T, 1, 2),
    }
