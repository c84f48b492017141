"""
Which readings speak for a cause and which against it: what each adds to its evidence beside that of a rival.

Rows of one place stand together, all rounds of them. What such a group says is the mean of what it says alone and of
what it adds to all others, so that neither a reading that repeats another nor one that is read first counts for all.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from rules.assessment import Place
from rules.diagnosis.block import Model, model_of, taken
from rules.diagnosis.conductor_causes import ratios_of
from rules.diagnosis.conductors import ALTERNATIVES
from rules.diagnosis.diagnose import TOLD, where_words
from rules.diagnosis.diagnose import offset_words as semiconductor_words
from rules.diagnosis.doubtful import CURRENT_READING, ONE_READING, REVERSED, SEVERAL, SWAPPED, several_off
from rules.diagnosis.extra import moved_everywhere
from rules.diagnosis.fact_words import Fact, against_words, conductor_words, group_words, line_words
from rules.diagnosis.gaussian import log_density
from rules.diagnosis.hypotheses import AS_RECORDED, BAD_CONNECTION, DOUBTFUL, SEMICONDUCTOR, Hypothesis
from rules.diagnosis.judge import Judged, grouped, judge_block
from rules.diagnosis.pairs import TWO_PLACES
from rules.diagnosis.problem import TERMINATIONS, Problem
from rules.diagnosis.shape import Floats, Integers, Shape, shape_of
from rules.limits import Limits

SPEAKS = 1.0
"""What a fact adds to the log evidence from which it is told. [nat]"""
TORN = 10.0
"""A fact that speaks for a rival as well is told for the cause only if it speaks so many times more for it."""
MOST = 3
"""Facts for a cause, and against it."""
NOT_RULED_OUT = 0.05
"""Probability of both from which it is told that no reading tells two causes apart."""
HIDDEN = 3.0
"""Standard uncertainties of a stretch's drop below which nothing is said of its conductors."""
MOST_CAUSES = 6
"""Causes that are explained, the most probable first."""


def explained(
    problems: Sequence[Problem], causes: Sequence[tuple[Place, ...]], limits: Limits
) -> list[tuple[Place, ...]]:
    """
    The rows of causes with the facts that speak for and against each.

    Parameters
    ----------
    problems : sequence of Problem
        As they were diagnosed.
    causes : sequence of tuple of Place
        What ``diagnose`` says of each.

    Returns
    -------
    list of tuple of Place
        In the order of the problems; rows below ``TOLD`` as they were.
    """
    found: dict[int, tuple[Place, ...]] = {}
    for batch in grouped(problems):
        some = [problems[number] for number in batch]
        judged = judge_block(shape_of(some[0].signature), some, limits)
        said = _explained(judged, some, [causes[number] for number in batch])
        found |= dict(zip(batch, said, strict=True))
    return [found[number] for number in range(len(problems))]


def _explained(
    judged: Judged, problems: Sequence[Problem], causes: Sequence[tuple[Place, ...]]
) -> list[tuple[Place, ...]]:
    shape = judged.block.shape
    told: list[dict[int, int]] = []
    for number, (problem, rows) in enumerate(zip(problems, causes, strict=True)):
        probable = [n for n, row in enumerate(rows) if row.probability >= TOLD][:MOST_CAUSES]
        found = {n: _hypothesis(judged, number, problem, rows[n]) for n in probable}
        told.append({n: hypothesis for n, hypothesis in found.items() if hypothesis is not None})
    which = np.zeros((len(problems), 1 + max(map(len, told))), dtype=np.int64)  # as recorded is the first hypothesis
    for number, of_one in enumerate(told):
        which[number, 1 : 1 + len(of_one)] = list(of_one.values())
    groups = groups_of(shape)
    pictures = pictured(judged, which)
    said_by = spoken(pictures, groups)
    out = []
    for number, (problem, of_one) in enumerate(zip(problems, told, strict=True)):
        kept, said = [causes[number][n] for n in of_one], list(causes[number])
        for place, n in enumerate(of_one):
            said[n] = _told(judged, number, problem, kept, place, which[number], pictures, said_by[number], groups)
        out.append(tuple(said))
    return out


def _hypothesis(judged: Judged, number: int, problem: Problem, place: Place) -> int | None:
    """
    The hypothesis of a row of causes, of several ways the most probable.

    ``None`` for a place that the readings do not know: the row was judged before something was read or recorded.
    """
    shape, names = judged.block.shape, judged.hypotheses.names
    if place.joints:
        return next((n for n, name in enumerate(names) if name.what == TWO_PLACES), None)
    members = judged.of_cause(place.cause)
    if place.cause == BAD_CONNECTION:
        words = [where_words(shape, n, problem.names) for n in range(len(shape.places))]
    elif place.cause == SEMICONDUCTOR:
        words = [semiconductor_words(shape, n, problem.names) for n in range(len(shape.offsets))]
    else:
        return members[int(judged.posterior[number, members].argmax())]
    return members[words.index(place.where)] if place.where in words else None


def groups_of(shape: Shape) -> list[list[int]]:
    """Rows by what they are about: a stretch and a leg of it, live or dead, in whatever round."""
    found: dict[tuple[object, ...], list[int]] = {}
    earlier: Counter[object] = Counter()
    for number, row in enumerate(shape.signature.rows):
        key: tuple[object, ...] = (row.path, row.part, row.state < 0)
        if not row.path:  # two meters at one point: the same two, the same of several such points
            meters = tuple(shape.signature.gain_of[observation] for observation, _ in row.shown)
            earlier[row.state, meters] += 1
            key = (*key, meters, earlier[row.state, meters])
        found.setdefault(key, []).append(number)
    return list(found.values())


@dataclass(frozen=True, slots=True, eq=False)
class Pictures:
    """What each hypothesis makes of the rows, at its best size: b problems, k hypotheses."""

    residual: Floats
    """(b, k, n): measured less expected. [V or ohm]"""
    covariance: Floats
    """(b, k, n, n)"""
    conductor: Floats
    """(b, k, n): what the conductors alone lose. [V or ohm]"""


def pictured(judged: Judged, which: Integers) -> Pictures:
    """The Gaussians of some hypotheses (b, k) of each problem."""
    size, count = which.shape
    rows: NDArray[Any] = np.repeat(np.arange(size), count)
    block, chosen, shape = taken(judged.block, rows), which.ravel(), judged.block.shape
    ratio, others, carried = np.ones_like(block.conductor), block.others.copy(), block.carried.copy()
    direction, moving = moved_everywhere(block)
    medians = judged.density.cumulative().quantiles(0.5)[0]
    added, columns = np.zeros_like(block.shown), np.zeros((len(rows), *moving.shape[2:]))
    read, wide = np.zeros_like(block.shown), np.zeros_like(block.shown)
    for hypothesis in np.unique(chosen).tolist():
        name = judged.hypotheses.names[hypothesis]
        here = np.flatnonzero(chosen == hypothesis)
        of = rows[here]
        conductor = hypothesis - 1 - medians.shape[1]
        if name.what == TWO_PLACES:
            for side in range(2):
                element = shape.place_element[judged.pairs.places[of, side]] - shape.conductors.stop
                others[here, element] += judged.pairs.ohm[of, side]
        elif name.cause == BAD_CONNECTION:
            element = int(shape.place_element[name.which[0]]) - shape.conductors.stop
            others[here, element] += np.exp(medians[of, name.which[0]])
        elif name.cause == SEMICONDUCTOR:
            place = len(shape.places) + name.which[0]
            added[here] = medians[of, place, None] * direction[here, place]
            columns[here] = medians[of, place, None, None] * moving[here, place]
        elif 0 <= conductor < len(ALTERNATIVES):
            ratio[here] = ratios_of(block)[here, conductor]
        elif 0 <= conductor < len(judged.conductors.hypotheses.names):
            ratio[here] = judged.conductors.factor[of, conductor][:, shape.element_branch[shape.conductors]]
        elif name.what == ONE_READING:
            off = judged.slips.off[of, int(shape.read.searchsorted(name.which[0]))]
            read[here] = off[:, None] * shape.difference[:, name.which[0]]
        elif name.what == CURRENT_READING:
            off = judged.slips.off[of, len(shape.read) + name.which[0]]
            own = shape.signature.current_readings[name.which[0]].own
            one = block.carried[here, 1 + own] / block.reading_u[here, name.which[0], None, None]
            carried[here, 0] += off[:, None, None] * one
        elif name.what == SWAPPED:
            first, second = name.which
            apart = block.value[here, second] - block.value[here, first]
            read[here] = apart[:, None] * (shape.difference[:, first] - shape.difference[:, second])
        elif name.what == REVERSED:
            live = shape.row_state != shape.signature.states
            read[here] = np.where(live, -2 * block.shown[here], 0.0)
        elif name.what == SEVERAL:
            wide[here] = several_off(block)[here] ** 2
    model = model_of(
        replace(block, others=others),
        (block.conductor * ratio)[:, None],
        (block.conductor_slope * ratio)[:, None],
        carried,
    )
    residual = block.shown + read - model.whole_mean[:, 0] - added
    covariance = _covariance(model, columns) + wide[:, :, None] * np.eye(shape.rows)
    return Pictures(
        residual.reshape(size, count, -1),
        covariance.reshape(size, count, shape.rows, shape.rows),
        model.conductor_mean[:, 0].reshape(size, count, -1),
    )


def _covariance(model: Model, columns: Floats) -> Floats:
    """Of the rows (m, n, n), with what an offset adds to shared doubts."""
    shared = model.whole_shared[:, 0] + np.swapaxes(columns, -1, -2)
    whole: Floats = model.whole_own[:, 0] + shared @ np.swapaxes(shared, -1, -2)
    return whole


def spoken(pictures: Pictures, groups: Sequence[Sequence[int]]) -> Floats:
    """
    (b, k, groups): what each group adds to the log evidence of each hypothesis.

    A healthy termination that is read by itself counts as Gaussian here.
    """
    whole = log_density(pictures.residual, pictures.covariance)
    found = np.zeros((*whole.shape, len(groups)))
    every = np.arange(pictures.residual.shape[-1])
    for number, rows in enumerate(groups):
        alone, others = (
            log_density(pictures.residual[..., part], pictures.covariance[..., part[:, None], part])
            for part in (np.array(rows), np.setdiff1d(every, rows))
        )
        found[..., number] = (alone + whole - others) / 2
    return found


def _told(
    judged: Judged,
    number: int,
    problem: Problem,
    rows: Sequence[Place],
    place: int,
    which: Integers,
    pictures: Pictures,
    said_by: Floats,
    groups: Sequence[Sequence[int]],
) -> Place:
    """One row of causes with its facts; ``said_by`` is (k, groups), as recorded first."""
    row, own = rows[place], 1 + place
    rivals = [n for n in range(len(rows)) if n != place]
    beside_recorded = said_by[own] - said_by[0]
    beside_rival = said_by[own] - said_by[1 + rivals[0]] if rivals else np.zeros(len(groups))
    recorded = row.cause == AS_RECORDED
    gained = beside_rival if recorded else np.maximum(beside_recorded, beside_rival)
    residual, covariance = pictures.residual[number], pictures.covariance[number]
    facts = [
        Fact(
            problem=problem,
            rows=tuple(of_group),
            read=judged.block.shown[number],
            computed=judged.block.shown[number] - residual[0],
            u=np.sqrt(np.diagonal(covariance[0])),
            expected=None if recorded else judged.block.shown[number] - residual[own],
        )
        for of_group in groups
    ]
    name = judged.hypotheses.names[int(which[own])]
    torn = (beside_rival < -SPEAKS) & (gained < TORN * -beside_rival)
    gained = np.where(torn, 0.0, gained)
    speaking = [n for n in np.argsort(-gained, kind="stable").tolist() if gained[n] > SPEAKS]
    if recorded and not speaking:  # what loses most and agrees speaks for the record, if nothing else does
        agree = [n for n in range(len(groups)) if facts[n].agrees]
        speaking = sorted(agree, key=lambda n: -facts[n].most)[:1]
    for_ = [group_words(facts[n]) for n in speaking]
    if row.cause in (BAD_CONNECTION, SEMICONDUCTOR) and speaking:
        for_[1:1] = [said for said in [line_words(facts[speaking[0]])] if said]
    if name in judged.conductors.hypotheses.names:
        for_ = [*_of_conductors(problem, name, groups, pictures, number, own), *for_]
    if row.cause == DOUBTFUL and row.what:
        for_ = [row.what, *for_]
    contrary = [n for n in np.argsort(beside_rival, kind="stable").tolist() if beside_rival[n] < -SPEAKS]
    against = [said for n in contrary if (said := against_words(facts[n]))]
    rival = rows[rivals[0]] if rivals else row
    alike = abs(float(beside_rival.sum())) < SPEAKS and min(row.probability, rival.probability) >= NOT_RULED_OUT
    if rivals and not contrary and alike:
        against = [f"no reading tells it from {rival.cause}{f' in {rival.where}' if rival.where else ''}"]
    return row._replace(speaks_for=tuple(for_[:MOST]), speaks_against=tuple(against[:MOST]))


def _of_conductors(
    problem: Problem,
    name: Hypothesis,
    groups: Sequence[Sequence[int]],
    pictures: Pictures,
    number: int,
    own: int,
) -> list[str]:
    """What the conductors of the stretches lose over what is computed; nothing where that is hidden by its doubt."""
    alone, residual = pictures.conductor[number, 0], pictures.residual[number, 0]
    doubt = np.sqrt(np.diagonal(pictures.covariance[number, 0]))
    rows = [max(of_group, key=lambda n: abs(alone[n])) for of_group in groups]
    rows = [n for n in rows if problem.signature.rows[n].part not in TERMINATIONS and abs(alone[n]) > HIDDEN * doubt[n]]
    if not rows:
        return []
    most = max(rows, key=lambda n: abs(alone[n]))
    factor = float(pictures.conductor[number, own, most] / alone[most])
    what = "this" if name.cause == DOUBTFUL else name.what
    return [conductor_words([float(1 + residual[n] / alone[n]) for n in rows], factor, what)]
