"""Resistances of all runs of a site and of the returns that they share, with their doubts, in columns."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from rules.calc.run import Leg, leg_of
from rules.limits import Limits
from rules.record import Run, Site
from rules.tables.conductors import alpha_20c, area_mm2, is_known, resistance_20c_ohm_per_m

GAP_LENGTH = "the length of {} is not known"
GAP_SIZE = "the size of {} is not known"
GAP_STRUCTURE = "{} returns through the structure, whose resistance is not known"
TERMINATIONS_A_LEG = 2
SHARED = "shared:"
"""What a run's ``return`` begins with where it is a shared conductor."""

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class LegFigures:
    """One leg of a run, at the run's recorded temperature."""

    conductor_ohm: float
    slope_ohm_per_k: float
    joint_ohm: float
    """Mean of each of its two healthy terminations."""
    joint_variance: float
    """Of each. [ohm²]"""


@dataclass(frozen=True, slots=True)
class RunFigures:
    """One run: all its own legs together, at its recorded temperature; a shared return is no leg of its own."""

    conductor_ohm: float
    conductor_hot_ohm: float
    """At the profile's hot temperature, or the recorded one if that is higher."""
    conductor_cold_ohm: float
    """At the profile's cold temperature, or the recorded one if that is lower."""
    slope_ohm_per_k: float
    """How much the conductors gain with each kelvin."""
    joints_ohm: float
    """Mean of its healthy terminations."""
    joints_variance: float
    """Variance of their sum. [ohm²]"""
    temperature_c: float
    temperature_u_k: float
    length_u: float
    """Relative."""
    gap: str = ""
    """Why it cannot be computed; empty where it can."""
    legs: tuple[LegFigures, ...] = ()
    """The outgoing leg, then the return unless it is shared; none where it cannot be computed."""

    @property
    def loop_ohm(self) -> float:
        return self.conductor_ohm + self.joints_ohm

    @property
    def loop_hot_ohm(self) -> float:
        return self.conductor_hot_ohm + self.joints_ohm

    @property
    def loop_cold_ohm(self) -> float:
        return self.conductor_cold_ohm + self.joints_ohm

    def at(self, temperature_c: float, temperature_u_k: float) -> RunFigures:
        """The same run with its conductors at another temperature."""
        warmer = temperature_c - self.temperature_c
        return replace(
            self,
            conductor_ohm=self.conductor_ohm + self.slope_ohm_per_k * warmer,
            temperature_c=temperature_c,
            temperature_u_k=temperature_u_k,
            legs=tuple(
                replace(leg, conductor_ohm=leg.conductor_ohm + leg.slope_ohm_per_k * warmer) for leg in self.legs
            ),
        )


@dataclass(frozen=True, slots=True)
class Legs:
    """Resistances of all own legs of runs by row of the record, 0 where there is none or it is not known. [ohm]"""

    out: Floats
    out_hot: Floats
    out_cold: Floats
    out_joints: Floats
    back: Floats
    back_hot: Floats
    back_cold: Floats
    back_joints: Floats


class Figures(Mapping[str, RunFigures]):
    """
    Figures of every run by its id, held in columns; what one run needs is put together when it is asked for.

    Notes
    -----
    ``R = Σ legs r20 (1 + α20 (T − 20 °C)) L / parallel + joints``, two healthy terminations a leg, each counted
    with the mean of its log-normal and not divided by ``parallel``.
    A temperature that was typed without saying how it was obtained counts as assumed.
    """

    returns: dict[str, SharedReturn]
    """Shared returns by name."""

    def __init__(self, runs: Sequence[Run], site: Site, limits: Limits) -> None:
        self.runs = tuple(runs)
        self._site, self._limits = site, limits
        self.row = {run.id: row for row, run in enumerate(self.runs)}
        self.gaps = [gap_of(run) for run in self.runs]
        self.returns = {name: self._shared(name, members) for name, members in shared_runs(self.runs).items()}
        rows = [row for row, gap in enumerate(self.gaps) if not gap]
        out = [_outgoing(self.runs[row]) for row in rows]
        self._out = self._leg([self.runs[row] for row in rows], out).spread(rows, len(self.runs))
        rows = [row for row in rows if not has_no_own_return(self.runs[row])]
        back = [_own_return(self.runs[row]) for row in rows]
        # most returns are of what their runs are of: then both legs are one computation
        self._back = self._out
        if back != out:
            self._back = self._leg([self.runs[row] for row in rows], back).spread(rows, len(self.runs))
        self._made: dict[str, RunFigures] = {}

    def __len__(self) -> int:
        return len(self.row)

    def __iter__(self) -> Iterator[str]:
        return iter(self.row)

    def __getitem__(self, run_id: str) -> RunFigures:
        made = self._made.get(run_id)
        if made is None:
            row = self.row[run_id]
            run = self.runs[row]
            legs = [self._out] if has_no_own_return(run) else [self._out, self._back]
            made = self._made[run_id] = self._figures(run, [(leg, row) for leg in legs], self.gaps[row])
        return made

    @cached_property
    def legs(self) -> Legs:
        """All runs' legs, joints twice a leg."""
        out, back = self._out, self._back
        return Legs(
            out.conductor_ohm,
            out.hot_ohm,
            out.cold_ohm,
            TERMINATIONS_A_LEG * out.joint_ohm,
            back.conductor_ohm,
            back.hot_ohm,
            back.cold_ohm,
            TERMINATIONS_A_LEG * back.joint_ohm,
        )

    def _shared(self, name: str, members: tuple[Run, ...]) -> SharedReturn:
        first, longest = members[0], max(members, key=lambda run: run.one_way_length_m or 0.0)
        gap = next((gap for run in members if (gap := gap_of(run))), "")
        if gap:
            return SharedReturn(name, members, self._figures(longest, [], gap))
        size = next((run.return_size for run in members if run.return_size), first.size)
        material = next((run.return_material for run in members if run.return_material), first.material_or_default)
        leg = self._leg([replace(longest, parallel=1)], [(size, material, first.stranding_or_default)])
        return SharedReturn(name, members, self._figures(longest, [(leg, 0)], ""))

    def _leg(self, runs: Sequence[Run], made_of: Sequence[tuple[str, str, str]]) -> Leg:
        """One leg of some runs, each made of a size, a metal and a stranding."""
        limits = self._limits
        kinds = {kind: number for number, kind in enumerate(dict.fromkeys(made_of))}
        kind = np.array([kinds[one] for one in made_of], dtype=np.int64)
        return leg_of(
            np.array([run.one_way_length_m for run in runs], dtype=float),
            np.array([run.parallel_or_default for run in runs], dtype=float),
            np.array([recorded_temperature_c(run, self._site, limits) for run in runs]),
            limits["temperature.hot_c"],
            limits["cold.conductor_c"],
            np.array([resistance_20c_ohm_per_m(*one) for one in kinds])[kind],
            np.array([alpha_20c(material) for _, material, _ in kinds])[kind],
            np.array([area_mm2(size) for size, _, _ in kinds])[kind],
            limits["termination.median_ohm"],
            limits["termination.geometric_sd"],
        )

    def _figures(self, run: Run, legs: Sequence[tuple[Leg, int]], gap: str) -> RunFigures:
        degrees = recorded_temperature_c(run, self._site, self._limits)
        if gap:
            return RunFigures(0.0, 0.0, 0.0, 0.0, 0.0, 0.0, degrees, 0.0, 0.0, gap)
        by = run.temperature_by if run.conductor_temperature_c is not None and run.temperature_by else "assumed"
        own = tuple(
            LegFigures(
                float(leg.conductor_ohm[row]),
                float(leg.slope_ohm_per_k[row]),
                float(leg.joint_ohm[row]),
                float(leg.joint_variance[row]),
            )
            for leg, row in legs
        )
        return RunFigures(
            conductor_ohm=sum(leg.conductor_ohm for leg in own),
            conductor_hot_ohm=sum(float(leg.hot_ohm[row]) for leg, row in legs),
            conductor_cold_ohm=sum(float(leg.cold_ohm[row]) for leg, row in legs),
            slope_ohm_per_k=sum(leg.slope_ohm_per_k for leg in own),
            joints_ohm=TERMINATIONS_A_LEG * sum(leg.joint_ohm for leg in own),
            joints_variance=TERMINATIONS_A_LEG * sum(leg.joint_variance for leg in own),
            temperature_c=degrees,
            temperature_u_k=self._limits[f"temperature_doubt.{by}"],
            length_u=self._limits[f"length_doubt.{run.length_by_or_default}"],
            legs=own,
        )


@dataclass(frozen=True, slots=True)
class SharedReturn:
    """One return conductor of several runs: as long as the longest of them and at its temperature."""

    name: str
    runs: tuple[Run, ...]
    figures: RunFigures
    """Of the one conductor with its two terminations."""


def figures(runs: Sequence[Run], site: Site, limits: Limits) -> Figures:
    """Resistances and doubts of runs, by their id, and of the returns that they share."""
    return Figures(runs, site, limits)


def shared_runs(runs: Sequence[Run]) -> dict[str, tuple[Run, ...]]:
    """The runs of each shared return, by its name."""
    groups: dict[str, list[Run]] = {}
    for run in runs:
        if run.return_conductor.startswith(SHARED):
            groups.setdefault(run.return_conductor.removeprefix(SHARED), []).append(run)
    return {name: tuple(members) for name, members in groups.items()}


def has_no_own_return(run: Run) -> bool:
    """Whether the way back is no conductor of the run's own."""
    return run.return_or_default != "own"


def recorded_temperature_c(run: Run, site: Site, limits: Limits) -> float:
    """The conductor's temperature as recorded, else the site's ambient, else the profile's. [degC]"""
    if run.conductor_temperature_c is not None:
        return run.conductor_temperature_c
    if site.ambient_temperature_c is not None:
        return site.ambient_temperature_c
    return limits["ambient.assumed_c"]


def gap_of(run: Run) -> str:
    """Why a run's own resistance cannot be computed; empty where it can."""
    if run.one_way_length_m is None or not run.one_way_length_m >= 0:
        return GAP_LENGTH.format(run.name)
    if not is_known(run.size):
        return GAP_SIZE.format(run.name)
    if run.return_size and not is_known(run.return_size):
        return GAP_SIZE.format(f"the return of {run.name}")
    if run.return_or_default == "structure":
        return GAP_STRUCTURE.format(run.name)
    return ""


def _outgoing(run: Run) -> tuple[str, str, str]:
    return run.size, run.material_or_default, run.stranding_or_default


def _own_return(run: Run) -> tuple[str, str, str]:
    return run.return_size_or_default, run.return_material_or_default, run.stranding_or_default


@dataclass(frozen=True, slots=True)
class Carrying:
    """A run, or a shared return, and the current in it."""

    run: RunFigures
    current_a: float


def record_parts(path: Sequence[Carrying], limits: Limits) -> dict[str, float]:
    """
    Variance of the drop over a path of one circuit that comes from the record, by what is doubtful. [V²]

    Each run errs in length on its own; temperature and resistance per metre err alike over a circuit;
    each termination errs on its own.
    """
    common_temperature = common_resistance = lengths = joints = 0.0
    for part in path:
        volts = part.run.conductor_ohm * part.current_a
        common_temperature += part.run.slope_ohm_per_k * part.run.temperature_u_k * part.current_a
        common_resistance += volts
        lengths += (part.run.length_u * volts) ** 2
        joints += part.run.joints_variance * part.current_a**2
    return {
        "length": lengths,
        "temperature": common_temperature**2,
        "resistance per metre": (limits["resistance_doubt.relative"] * common_resistance) ** 2,
        "terminations": joints,
    }


def record_variance(path: Sequence[Carrying], limits: Limits) -> float:
    """Variance of the drop over a path of one circuit that comes from the record. [V²]"""
    return sum(record_parts(path, limits).values())
