"""
Problems of equal shape as stacked arrays, and the Gaussian that the record predicts for their rows.

Written throughout: b problems, n rows, e elements, s sources of current doubt, f hypotheses about the conductors.
A row's drop is bilinear, current times resistance, so its doubt has two halves: currents times the doubt of
resistances, and the doubt of currents times resistances; to them come the gains and counts of the readings.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from itertools import chain
from operator import attrgetter

import numpy as np

from rules.diagnosis.problem import Branch, Problem
from rules.diagnosis.shape import Floats, Shape, of_runs
from rules.limits import Limits


@dataclass(frozen=True, slots=True, eq=False)
class Block:
    """Stacked problems."""

    shape: Shape
    limits: Limits
    shown: Floats
    """(b, n): what the meters say of each row. [V, or ohm in a dead test]"""
    value: Floats
    """(b, O): each observation."""
    variance: Floats
    """(b, O)"""
    gain_u: Floats
    """(b, gains)"""
    gain_fixed: Floats
    """(b, gains, n): doubt of rows whose observations have several gains, under each."""
    amps: Floats
    """(b, slots)"""
    amps_u: Floats
    """(b, slots)"""
    carried: Floats
    """(b, 1 + s, n, e): what one ohm adds to each row, then to its doubt through each source. [A]"""
    conductor: Floats
    """(b, e of conductors), as recorded. [ohm]"""
    conductor_slope: Floats
    """(b, e of conductors): what one standard uncertainty of the temperature adds. [ohm]"""
    others: Floats
    """(b, e of terminations and poles): healthy. [ohm]"""
    others_u: Floats
    """(b, e of terminations and poles): standard uncertainty, each on its own. [ohm]"""
    length_u: Floats
    """(b, branches)"""
    alternatives: Floats
    """(b, alternatives, e of conductors): resistance with another conductor. [ohm]"""
    possible: Floats
    """(b, alternatives): 1 where every run on a row's path has it."""
    extra_scale: Floats
    """(b, branches)"""
    hot_ohm: Floats
    """(b, branches)"""
    nominal_v: Floats
    """(b,)"""
    reading_a: Floats
    """(b, current readings)"""
    reading_u: Floats
    """(b, current readings)"""
    reading_gain_u: Floats
    """(b, current readings)"""
    counts: Floats
    """(b, n, n): covariance of what each observation has of its own."""
    own: Floats
    """(b, n, n): with terminations and device, at the currents read."""
    common_rows: Floats
    """(b, c, n): relative doubt of each row's readings through each column of ``Common``, the last c sources."""
    common_fixed: Floats
    """(b, c, n): the same of rows whose observations have several gains, as it is."""
    common_ohm: Floats
    """(b, c, e of conductors): relative doubt of conductors through each column."""

    def __len__(self) -> int:
        return len(self.shown)


def stacked(shape: Shape, problems: Sequence[Problem], limits: Limits) -> Block:
    """Stack problems of one shape."""

    size, branches = len(problems), len(shape.signature.branches)
    value, variance, gain_u, amps, error, *of_currents = _flat(problems)
    reading_a, reading_u, reading_gain_u = of_currents
    columns = shape.signature.common
    common = [problem.common for problem in problems if problem.common is not None]

    def of_common(name: str) -> Floats:
        return np.array([getattr(one, name) for one in common], dtype=float)

    if columns:
        value = value / (1 + of_common("gain")[:, list(shape.signature.gain_of)])
        amps = amps + of_common("amps")
    carried = np.zeros((size, 1 + shape.signature.sources, shape.signature.states + 1, branches))
    carried[:, 0, shape.signature.states] = 1.0  # a dead test: the drop over one ampere
    carried[:, 0, shape.slot_state, shape.slot_branch] = amps
    errors = (1 + shape.error_source, shape.slot_state[shape.error_slot], shape.slot_branch[shape.error_slot])
    carried[:, *errors] = error
    if columns:
        ways = (slice(1 + shape.signature.sources - columns, None), shape.slot_state, shape.slot_branch)
        carried[:, *ways] = of_common("amps_columns")
    carried = carried[:, :, shape.row_state][:, :, :, shape.element_branch] * shape.coefficient
    amps_u = np.zeros_like(amps)
    for entry, slot in enumerate(shape.error_slot):
        amps_u[:, slot] += error[:, entry] ** 2
    numbers, alternatives = _of_branches(problems)
    at = {name: place for place, name in enumerate(Branch._fields)}

    def of_branches(name: str) -> Floats:
        return numbers[:, :, at[name]]

    def of_legs(name: str) -> Floats:
        """(b, 2 branches), positive leg before negative."""
        first = at["positive_" + name]
        return numbers[:, :, first : first + 2].reshape(size, -1)

    ohm = of_legs("ohm")
    slope = of_legs("slope_ohm_per_k") * np.repeat(of_branches("temperature_u_k"), 2, axis=1)
    if columns:
        factor = np.repeat(1 + of_common("ohm"), 2, axis=1)
        ohm, slope = ohm * factor, slope * factor
    other = alternatives.reshape(size, branches, -1, 2).transpose(0, 2, 1, 3).reshape(size, -1, 2 * branches)
    poles = ohm @ shape.pole_of.T
    terminations_u = np.sqrt(of_legs("joint_variance") @ shape.termination_of.T)
    others_u = np.concatenate([terminations_u, limits["device_doubt.relative"] * poles], axis=1)
    counts = (shape.difference * variance[:, None]) @ shape.difference.T
    own = counts + _others_covariance(shape, carried, others_u)
    runs = shape.reached & np.array([kind == "run" for kind in shape.signature.branches], dtype=bool)
    fixed = np.zeros((size, shape.signature.gains, shape.rows))
    if shape.gain_parts is not None:
        fixed = gain_u[:, :, None] * np.einsum("gno,bo->bgn", shape.gain_parts, value)
    conductors = shape.element_branch[shape.conductors]
    common_rows, common_fixed = np.zeros((2, size, columns, shape.rows))
    common_ohm = np.zeros((size, columns, len(conductors)))
    if columns:
        gains = of_common("gain_columns")
        common_rows = gains @ shape.gain_rows
        common_ohm = (of_common("ohm_columns") / (1 + of_common("ohm"))[:, None])[:, :, conductors]
        if shape.gain_parts is not None:
            common_fixed = gains @ np.einsum("gno,bo->bgn", shape.gain_parts, value)
    return Block(
        shape=shape,
        limits=limits,
        shown=value @ shape.difference.T,
        value=value,
        variance=variance,
        gain_u=gain_u,
        gain_fixed=fixed,
        amps=amps,
        amps_u=np.sqrt(amps_u),
        carried=carried,
        conductor=ohm @ shape.conductor_of.T,
        conductor_slope=slope @ shape.conductor_of.T,
        others=np.concatenate([of_legs("joint_ohm") @ shape.termination_of.T, poles], axis=1),
        others_u=others_u,
        length_u=of_branches("length_u"),
        alternatives=(other * ohm[:, None]) @ shape.conductor_of.T,
        possible=np.where(runs.any(), (other.reshape(size, -1, branches, 2)[:, :, runs] > 0).all(axis=(2, 3)), 0.0),
        extra_scale=of_branches("extra_scale"),
        hot_ohm=of_branches("hot_ohm"),
        nominal_v=np.array([problem.nominal_v for problem in problems], dtype=float),
        reading_a=reading_a,
        reading_u=reading_u,
        reading_gain_u=reading_gain_u,
        counts=counts,
        own=own,
        common_rows=common_rows,
        common_fixed=common_fixed,
        common_ohm=common_ohm,
    )


_FLAT = attrgetter("value", "variance", "gain_u", "amps", "error_a", "reading_a", "reading_u", "reading_gain_u")
_BY_BRANCH = attrgetter("branches", "alternatives")


def _flat(problems: Sequence[Problem]) -> list[Floats]:
    """The fields of ``_FLAT``, each (b, …): read one by one, which is quicker than tuple by tuple."""
    every = np.fromiter(chain.from_iterable(chain.from_iterable(map(_FLAT, problems))), dtype=float)
    widths = [len(field) for field in _FLAT(problems[0])]
    return np.split(every.reshape(len(problems), -1), np.cumsum(widths)[:-1], axis=1)


def _of_branches(problems: Sequence[Problem]) -> list[Floats]:
    """The fields of ``_BY_BRANCH``, each (b, branches, …)."""
    by_branch = chain.from_iterable(chain.from_iterable(map(_BY_BRANCH, problems)))
    every = np.fromiter(chain.from_iterable(by_branch), dtype=float).reshape(len(problems), -1)
    first, second = _BY_BRANCH(problems[0])
    split = len(first) * len(first[0])
    return [
        every[:, :split].reshape(len(problems), len(first), -1),
        every[:, split:].reshape(len(problems), len(second), -1),
    ]


def _others_covariance(shape: Shape, carried: Floats, others_u: Floats) -> Floats:
    """(b, n, n): from terminations and the device's poles, each on its own: healthy poles of one breaker differ."""
    apart = carried[:, 0, :, shape.conductors.stop :] * others_u[:, None]
    found: Floats = apart @ np.swapaxes(apart, 1, 2)
    return found


@dataclass(frozen=True, slots=True, eq=False)
class Model:
    """
    What the rows should be, split by the conductors' resistance: b problems, f hypotheses, n rows.

    With all conductors at ``factor`` times the given resistance the mean is ``mean + factor conductor_mean``,
    the columns of shared doubts ``shared + factor conductor_shared`` and the rest of the covariance
    ``own + factor² conductor_own``.
    """

    mean: Floats
    conductor_mean: Floats
    """(b, f, n)"""
    shared: Floats
    conductor_shared: Floats
    """(b, f, n, gains + s): one column for each gain and each source of current doubt."""
    own: Floats
    conductor_own: Floats
    """(b, f, n, n)"""
    conductor_columns: Floats
    """(b, f, n, branches + 2): the length of each branch, temperature, resistance per metre; ``conductor_own`` is their
    square."""

    @property
    def whole_mean(self) -> Floats:
        """At factor one (b, f, n)."""
        return self.mean + self.conductor_mean

    @property
    def whole_shared(self) -> Floats:
        """At factor one (b, f, n, gains + s)."""
        return self.shared + self.conductor_shared

    @property
    def whole_own(self) -> Floats:
        """At factor one, without shared doubts (b, f, n, n)."""
        return self.own + self.conductor_own

    @property
    def covariance(self) -> Floats:
        """At factor one (b, f, n, n)."""
        shared = self.whole_shared
        return self.whole_own + shared @ np.swapaxes(shared, -1, -2)


def model_of(block: Block, conductor: Floats, slope: Floats, carried: Floats | None = None) -> Model:
    """
    The Gaussian of the rows under hypotheses about the conductors.

    Parameters
    ----------
    conductor, slope : array (b, f, e of conductors)
        Resistance, and what one standard uncertainty of the temperature adds. [ohm]
    carried : array (b, 1 + s, n, e), optional
        Other currents than those read.
    """
    shape, own = block.shape, block.own
    if carried is None:
        carried = block.carried
    else:
        own = block.counts + _others_covariance(shape, carried, block.others_u)
    size, planes, rows, _ = carried.shape
    split = shape.conductors.stop
    of_others = (carried[..., split:] @ block.others[:, None, :, None])[:, None, ..., 0]
    flat = carried[..., :split].reshape(size, planes * rows, split)
    of_conductors = (conductor @ np.swapaxes(flat, 1, 2)).reshape(size, -1, planes, rows)
    amps = carried[:, None, 0, :, :split]
    if shape.signature.common:
        of_others, of_conductors = _with_common(block, of_others, of_conductors, conductor, amps)
    of_elements = amps * conductor[:, :, None]
    lengths = of_runs(shape, of_elements) * block.length_u[:, None, None]
    alike = [(amps @ slope[..., None])[..., 0], block.limits["resistance_doubt.relative"] * of_conductors[:, :, 0]]
    columns = np.concatenate([lengths, np.stack(alike, axis=-1)], axis=-1)
    gain = block.gain_u[:, None, :, None] * shape.gain_rows
    return Model(
        mean=of_others[:, :, 0],
        conductor_mean=of_conductors[:, :, 0],
        shared=_columns(gain * of_others[:, :, :1] + block.gain_fixed[:, None], of_others[:, :, 1:]),
        conductor_shared=_columns(gain * of_conductors[:, :, :1], of_conductors[:, :, 1:]),
        own=own[:, None],
        conductor_own=columns @ np.swapaxes(columns, -1, -2),
        conductor_columns=columns,
    )


def _with_common(
    block: Block, of_others: Floats, of_conductors: Floats, conductor: Floats, amps: Floats
) -> tuple[Floats, Floats]:
    """Both with what a column of ``Common`` does through readings and conductors, beside what it does through currents."""
    last = slice(-block.shape.signature.common, None)
    of_others, of_conductors = of_others.copy(), of_conductors.copy()
    of_others[:, :, last] += block.common_rows[:, None] * of_others[:, :, :1] + block.common_fixed[:, None]
    doubtful = (conductor[:, :, None] * block.common_ohm[:, None]) @ np.swapaxes(amps, -1, -2)
    of_conductors[:, :, last] += block.common_rows[:, None] * of_conductors[:, :, :1] + doubtful
    return of_others, of_conductors


def _columns(*rows: Floats) -> Floats:
    """(b, f, n, k) of rows (b, f, k, n)."""
    return np.swapaxes(np.concatenate(rows, axis=2), -1, -2)


def taken(block: Block, rows: Floats) -> Block:
    """Some of a block's problems."""
    arrays = {name: getattr(block, name)[rows] for name in _ARRAYS}
    return replace(block, **arrays)


_ARRAYS = tuple(entry.name for entry in fields(Block) if entry.name not in ("shape", "limits"))
