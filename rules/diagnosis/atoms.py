"""
What a circuit's readings leave open, as weighted atoms.

An atom is one hypothesis at one size: a bad connection in one place with one extra resistance, a conductor at one
factor, a slip. Its weight comes from the posterior of the readings (``judge``). Places that no reading separates yet
stand apart here where an imagined reading would separate them.

Written throughout: b problems, a atoms, g groups, f hypotheses about the conductors.
"""

from __future__ import annotations

from dataclasses import dataclass
from statistics import NormalDist
from typing import NamedTuple

import numpy as np

from rules.diagnosis.block import Block
from rules.diagnosis.conductor_causes import SINGLE_FACTORS, ratios_of
from rules.diagnosis.conductors import ALTERNATIVES
from rules.diagnosis.hypotheses import (
    AS_RECORDED,
    BAD_CONNECTION,
    CAUSES,
    DOUBTFUL,
    LONGER,
    OTHER_METAL,
    SEMICONDUCTOR,
    SMALLER,
)
from rules.diagnosis.judge import Judged
from rules.diagnosis.quadrature import UNIT_STEPS
from rules.diagnosis.shape import Floats, Integers, Shape

MOST_SIZES, FEWEST_SIZES = 6, 2
"""Sizes of a bad connection that stand for its posterior, each for an equal share of it: fewer where places are many."""
ATOMS = 128
"""About so many atoms are aimed at; a long circuit has more."""
NEGLIGIBLE = 1e-7
"""Weight of an atom below which it is left out."""
TAIL = 0.01
"""Share of a posterior's ends that bounds the outermost of them."""
FACTORS = np.array([NormalDist().inv_cdf(share) for share in (1 / 8, 3 / 8, 5 / 8, 7 / 8)])
"""Where the factors that stand for a range of them lie, in its standard deviations."""
SMOOTHED = 0.4
"""Standard deviation that each of several atoms gets for what lies between it and its neighbours, over their distance:
with less a fine reading would tell places apart by the teeth of a comb that is not there."""
OF_LENGTH = ("length_as_loop", "metres_for_feet")
"""Doubtful records that a tape tells."""
LARGER = ALTERNATIVES[4:]
"""Doubtful records that a look at the conductor tells."""


class Group(NamedTuple):
    """What is said apart: a cause, with its place in the shape of the imagined readings (-1: the whole circuit)."""

    cause: str
    place: int = -1


@dataclass(frozen=True, slots=True, eq=False)
class Atoms:
    """The heaviest atoms of each problem of a batch."""

    groups: tuple[Group, ...]
    shares: Floats
    """(b, g): probability of each group, with all its atoms."""
    weight: Floats
    """(b, a): sums to one."""
    group: Integers
    """(b, a)"""
    conductor: Integers
    """(b, a): which of the hypotheses about the conductors holds."""
    extra: Integers
    """(b, a): place of a bad connection, then of a semiconductor; 0 where there is none."""
    size: Floats
    """(b, a): of the extra; 0 where there is none. [ohm or V]"""
    smoothed: Floats
    """(b, a): standard deviation about the size, or about the factor where there is no extra."""
    slip: Integers
    """(b, a): which slip, -1 for none."""
    wrong_length: Floats
    """(b,): probability that a tape would show another length than the recorded one."""
    wrong_conductor: Floats
    """(b,): probability that the cable is of another size or metal than recorded."""
    ratios: Floats
    """(b, f, e of conductors): resistance over the recorded one under each hypothesis about the conductors."""

    @property
    def member(self) -> Floats:
        """(b, a, g): 1 where an atom belongs to a group."""
        found: Floats = (self.group[..., None] == np.arange(len(self.groups))).astype(float)
        return found


def atoms_of(judged: Judged, block: Block, negligible: float = NEGLIGIBLE) -> Atoms:
    """
    The atoms of a judged batch.

    Parameters
    ----------
    judged : Judged
        By what was read.
    block : Block
        The same problems with the imagined readings.
    negligible : float
        Weight of an atom below which it is left out.
    """
    groups = _groups(block.shape)
    ratios, conductors = _conductors(judged, block)
    parts = [_extras(judged, block.shape), conductors, _slips(judged)]
    of_group = {group: number for number, group in enumerate(groups)}
    group = np.concatenate([[of_group[name] for name in part.groups] for part in parts])
    size = len(block)

    def column(name: str) -> Floats:
        found = [part.columns.get(name, np.full((1, 1), _PLAIN[name])) for part in parts]
        wide = [np.broadcast_to(f, (size, len(p.groups))) for f, p in zip(found, parts, strict=True)]
        return np.concatenate(wide, axis=1)

    weight = column("weight")
    most = max(ATOMS, 2 * FEWEST_SIZES * len(block.shape.places))
    matters = int((weight > negligible).sum(axis=1).max(initial=1))
    kept = np.argsort(-weight.round(12), axis=1, kind="stable")[:, : min(most, matters)]
    heaviest = {name: np.take_along_axis(column(name), kept, axis=1) for name in _PLAIN}
    chosen = heaviest["weight"]
    whole = {name: heaviest[name].astype(np.int64) for name in ("conductor", "extra", "slip")}
    return Atoms(
        groups=groups,
        shares=weight / weight.sum(axis=1, keepdims=True) @ (group[:, None] == np.arange(len(groups))).astype(float),
        weight=chosen / chosen.sum(axis=1, keepdims=True),
        group=group[kept],
        size=heaviest["size"],
        smoothed=heaviest["smoothed"],
        wrong_length=_probability(judged, (LONGER,), OF_LENGTH),
        wrong_conductor=_probability(judged, (SMALLER, OTHER_METAL), LARGER),
        ratios=ratios,
        **whole,
    )


def _groups(shape: Shape) -> tuple[Group, ...]:
    """The groups of a shape: bad connections and semiconductors stand apart by place."""
    groups = [Group(AS_RECORDED)]
    groups += [Group(BAD_CONNECTION, number) for number in range(len(shape.places))]
    groups += [Group(SEMICONDUCTOR, number) for number in range(len(shape.offsets))]
    return (*groups, *(Group(cause) for cause in CAUSES if cause not in (AS_RECORDED, BAD_CONNECTION, SEMICONDUCTOR)))


_PLAIN = {"weight": 0.0, "conductor": 0.0, "extra": 0.0, "size": 0.0, "smoothed": 0.0, "slip": -1.0}
"""What an atom has where its hypothesis says nothing of it."""


class _Part(NamedTuple):
    """Some atoms before the heaviest are chosen."""

    groups: tuple[Group, ...]
    columns: dict[str, Floats]
    """By the names of ``_PLAIN``: arrays that broadcast to (b, atoms)."""


def _extras(judged: Judged, shape: Shape) -> _Part:
    """Bad connections, then semiconductors: each place at several sizes."""
    before = judged.block.shape
    old_places = [
        next(
            n for n, p in enumerate(before.places) if p.branch == place.branch and set(place.members) <= set(p.members)
        )
        for place in shape.places
    ]
    old_offsets = [next(n for n, old in enumerate(before.offsets) if set(new) <= set(old)) for new in shape.offsets]
    # a place takes its share of what was not told apart until now
    split = [len(p.members) / len(before.places[n].members) for p, n in zip(shape.places, old_places, strict=True)]
    split += [len(o) / len(before.offsets[n]) for o, n in zip(shape.offsets, old_offsets, strict=True)]
    old = [*old_places, *(len(before.places) + n for n in old_offsets)]
    posterior = np.concatenate([judged.of_places, judged.posterior[:, judged.of_cause(SEMICONDUCTOR)]], axis=1)
    if judged.pairs.hypotheses.names:  # two bad places: half of them is at either
        np.add.at(posterior, (np.arange(len(posterior))[:, None], judged.pairs.places), judged.of_pair[:, None] / 2)
    weight = posterior[:, old] * np.array(split)
    sizes = max(FEWEST_SIZES, min(MOST_SIZES, ATOMS // max(1, len(shape.places))))
    coordinate, distance = _strata(judged, sizes)
    # the coordinate of a bad connection is the logarithm of its size, that of a semiconductor the size itself
    logarithmic = (np.arange(coordinate.shape[1]) < len(before.places))[:, None]
    size = np.where(logarithmic, np.exp(np.where(logarithmic, coordinate, 0.0)), coordinate)
    smoothed = SMOOTHED * distance * np.where(logarithmic, size, 1.0)
    names = [Group(BAD_CONNECTION, number) for number in range(len(shape.places))]
    names += [Group(SEMICONDUCTOR, number) for number in range(len(shape.offsets))]
    count = len(judged.block)
    return _Part(
        tuple(name for name in names for _ in range(sizes)),
        {
            "weight": np.repeat(weight / sizes, sizes, axis=1),
            "extra": np.repeat(np.arange(len(names)), sizes)[None].astype(float),
            "size": size[:, old].reshape(count, -1),
            "smoothed": smoothed[:, old].reshape(count, -1),
        },
    )


def _strata(judged: Judged, sizes: int) -> tuple[Floats, Floats]:
    """Coordinates in the middle of equal shares of each size's posterior, and how wide each share is (b, places, s)."""
    density = judged.density
    below = density.cumulative().below
    edges = np.clip(np.arange(sizes + 1) / sizes, TAIL, 1 - TAIL)
    wanted = np.sort(np.concatenate([edges, (np.arange(sizes) + 0.5) / sizes]))
    step = (below[..., None, :] <= wanted[:, None]).sum(axis=-1).clip(1, len(UNIT_STEPS) - 1)
    low, high = (np.take_along_axis(below, step - back, axis=-1) for back in (1, 0))
    part = np.clip((wanted - low) / np.maximum(high - low, 1e-12), 0.0, 1.0)
    place = density.low[..., None] + density.width[..., None] * (step - 1 + part) / (len(UNIT_STEPS) - 1)
    return place[..., 1::2], place[..., 2::2] - place[..., :-1:2]


def _conductors(judged: Judged, block: Block) -> tuple[Floats, _Part]:
    """
    Resistances over the recorded ones under each hypothesis about the conductors, and the atoms: first as recorded,
    then other sizes and metals, then lengths; a range of factors stands as several.
    """
    found, limits = judged.conductors, judged.block.limits
    names, before = found.hypotheses.names, judged.block.shape
    singles = len(names) - 2
    first = 1 + len(before.places) + len(before.offsets)
    posterior = judged.posterior[:, first : first + len(names)]
    mean, square = (moment[:, singles:, 0] for moment in (found.factor, found.factor_square))
    spread = np.sqrt(np.maximum(square - mean**2, 0.0))
    low = np.array([limits["longer_route.low_factor"], limits["slip.parallel_low"]])
    high = np.array([limits["longer_route.high_factor"], limits["slip.parallel_high"]])
    factors = np.clip(mean[..., None] + spread[..., None] * FACTORS, low[:, None], high[:, None])
    smoothed = SMOOTHED * np.gradient(factors, axis=-1)
    count, elements = block.conductor.shape
    alone = np.broadcast_to(SINGLE_FACTORS[:, None], (count, len(SINGLE_FACTORS), elements))
    ranges = np.broadcast_to(factors.reshape(count, -1)[..., None], (count, factors[0].size, elements))
    ratios = np.concatenate([np.ones((count, 1, elements)), ratios_of(block), alone, ranges], axis=1)
    several = np.repeat(posterior[:, singles:] / len(FACTORS), len(FACTORS), axis=1)
    causes = [AS_RECORDED, *(name.cause for name in names[:singles])]
    causes += [name.cause for name in names[singles:] for _ in FACTORS]
    nothing = np.zeros((count, 1 + singles))
    return ratios, _Part(
        tuple(Group(cause) for cause in causes),
        {
            "weight": np.concatenate([judged.posterior[:, :1], posterior[:, :singles], several], axis=1),
            "conductor": np.arange(len(causes), dtype=float)[None],
            "smoothed": np.concatenate([nothing, smoothed.reshape(count, -1)], axis=1),
        },
    )


def _slips(judged: Judged) -> _Part:
    """Every slip of a reading, in the order of ``judged.slips``."""
    count, last = len(judged.slips.hypotheses.names), len(judged.hypotheses.names) - len(judged.pairs.hypotheses.names)
    numbers = np.arange(count, dtype=float)[None]
    return _Part((Group(DOUBTFUL),) * count, {"weight": judged.posterior[:, last - count : last], "slip": numbers})


def _probability(judged: Judged, causes: tuple[str, ...], doubtful: tuple[str, ...]) -> Floats:
    """Of some causes, with some of the ways in which the record may be doubtful (b,)."""
    names = judged.hypotheses.names
    ours = [name.cause in causes or (name.cause == DOUBTFUL and name.what in doubtful) for name in names]
    found: Floats = judged.posterior[:, ours].sum(axis=1)
    return found
