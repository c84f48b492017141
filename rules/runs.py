"""Resistances of all runs of a site with their doubts, computed in columns."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from rules.calc.conductor import conductor_resistance_ohm, termination_ohm
from rules.limits import Limits
from rules.record import Run, Site
from rules.tables.conductors import alpha_20c, area_mm2, is_known, resistance_20c_ohm_per_m

GAP_LENGTH = "the length of {} is not known"
GAP_SIZE = "the size of {} is not known"
GAP_SHARED = "{} shares its return with other circuits, which this version does not compute"
GAP_STRUCTURE = "{} returns through the structure, whose resistance is not known"
TERMINATIONS_A_LEG = 2


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
    """One run: both legs together, at its recorded temperature."""

    conductor_ohm: float
    conductor_hot_ohm: float
    """At the profile's hot temperature, or the recorded one if that is higher."""
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
    """The outgoing leg, then the return; none where it cannot be computed."""

    @property
    def loop_ohm(self) -> float:
        return self.conductor_ohm + self.joints_ohm

    @property
    def loop_hot_ohm(self) -> float:
        return self.conductor_hot_ohm + self.joints_ohm

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


def recorded_temperature_c(run: Run, site: Site, limits: Limits) -> float:
    """The conductor's temperature as recorded, else the site's ambient, else the profile's. [degC]"""
    if run.conductor_temperature_c is not None:
        return run.conductor_temperature_c
    if site.ambient_temperature_c is not None:
        return site.ambient_temperature_c
    return limits["ambient.assumed_c"]


def gap_of(run: Run) -> str:
    """Why a run's resistance cannot be computed; empty where it can."""
    if run.one_way_length_m is None:
        return GAP_LENGTH.format(run.name)
    if not is_known(run.size):
        return GAP_SIZE.format(run.name)
    if run.return_or_default == "structure":
        return GAP_STRUCTURE.format(run.name)
    if run.return_or_default != "own":
        return GAP_SHARED.format(run.name)
    return ""


def figures(runs: Sequence[Run], site: Site, limits: Limits) -> dict[str, RunFigures]:
    """
    Resistance and doubts of runs, by their id.

    Notes
    -----
    ``R = Σ legs r20 (1 + α20 (T − 20 °C)) L / parallel + joints``, four healthy terminations a run, two a leg,
    each counted with the mean of its log-normal and not divided by ``parallel``.
    A temperature that was typed without saying how it was obtained counts as assumed.
    """
    gaps = [gap_of(run) for run in runs]
    whole = [run for run, gap in zip(runs, gaps, strict=True) if not gap]
    length = np.array([run.one_way_length_m or 0.0 for run in whole])
    temperature = np.array([recorded_temperature_c(run, site, limits) for run in whole])
    hot = np.maximum(temperature, limits["temperature.hot_c"])
    parallel = np.array([float(run.parallel_or_default) for run in whole])
    conductor_hot = np.zeros(len(whole))
    legs: list[list[LegFigures]] = []
    for sizes in (
        [(run.size, run.material_or_default, run.stranding_or_default) for run in whole],
        [(run.return_size_or_default, run.return_material_or_default, run.stranding_or_default) for run in whole],
    ):
        r20 = np.array([resistance_20c_ohm_per_m(*size) for size in sizes])
        alpha = np.array([alpha_20c(material) for _, material, _ in sizes])
        area = np.array([area_mm2(size) for size, _, _ in sizes])
        conductor_hot += conductor_resistance_ohm(length, r20, alpha, hot, parallel)
        of_leg = (
            conductor_resistance_ohm(length, r20, alpha, temperature, parallel),
            length * r20 * alpha / parallel,
            *termination_ohm(area, limits["termination.median_ohm"], limits["termination.geometric_sd"]),
        )
        legs.append([LegFigures(*leg) for leg in zip(*(np.asarray(column).tolist() for column in of_leg), strict=True)])
    length_doubt, temperature_doubt = limits.values("length_doubt"), limits.values("temperature_doubt")
    done: dict[str, RunFigures] = {}
    for run, out, back, hot_ohm, degrees in zip(
        whole, *legs, conductor_hot.tolist(), temperature.tolist(), strict=True
    ):
        by = run.temperature_by if run.conductor_temperature_c is not None and run.temperature_by else "assumed"
        done[run.id] = RunFigures(
            conductor_ohm=out.conductor_ohm + back.conductor_ohm,
            conductor_hot_ohm=hot_ohm,
            slope_ohm_per_k=out.slope_ohm_per_k + back.slope_ohm_per_k,
            joints_ohm=TERMINATIONS_A_LEG * (out.joint_ohm + back.joint_ohm),
            joints_variance=TERMINATIONS_A_LEG * (out.joint_variance + back.joint_variance),
            temperature_c=degrees,
            temperature_u_k=temperature_doubt[by],
            length_u=length_doubt[run.length_by_or_default],
            legs=(out, back),
        )
    for run, gap in zip(runs, gaps, strict=True):
        if gap:
            done[run.id] = RunFigures(0.0, 0.0, 0.0, 0.0, 0.0, recorded_temperature_c(run, site, limits), 0.0, 0.0, gap)
    return done


@dataclass(frozen=True, slots=True)
class Carrying:
    """A run and the current in it."""

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
