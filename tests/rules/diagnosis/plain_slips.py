"""
Slips of readings and doubtful records, one by one: the part of the plain loop about "reading or record doubtful".

Each slip is written out: the readings as they were meant, the whole covariance, and the density of what was
entered. For circuits whose voltages and currents were read at every point, as in the blind trial.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import partial
from types import ModuleType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from rules.calc.doubt import Shown

Floats = NDArray[np.float64]
DOUBTFUL = "reading or record doubtful"
RATIOS = (10.0, 0.1, 100.0, 0.01, 1000.0, 0.001, -1.0)
NEAR = 0.02


def log_gaussian(residual: Floats, covariance: Floats) -> float:
    _, log_determinant = np.linalg.slogdet(covariance)
    quadratic = residual @ np.linalg.solve(covariance, residual)
    return float(-0.5 * (quadratic + log_determinant + len(residual) * math.log(2 * math.pi)))


def slips(loop: Any, plain: ModuleType) -> dict[tuple[str, str], tuple[float, float]]:
    """Share of the cause's weight and log evidence of every way in which a reading or the record may be doubtful."""
    limits = loop.limits
    found: dict[str, tuple[float, float]] = {}
    for name, factor in (("length_as_loop", 0.5), ("metres_for_feet", 0.3048)):
        found[name] = (limits["doubtful." + name], loop.log_density(factor))
    sizes = {}
    for steps in (1, 2):
        try:
            sizes[steps] = loop.log_density(loop.sizes(steps))
        except IndexError:  # no size is left on the ladder
            break
    for steps, evidence in sizes.items():
        found[f"{steps} larger"] = (limits["doubtful.larger_conductor"] / len(sizes), evidence)
    low, high = limits["slip.parallel_low"], limits["slip.parallel_high"]
    found["parallel_path"] = (limits["doubtful.parallel_path"], plain.log_mean(loop.log_density, low, high))
    found |= _one_reading(loop, plain) | _several_readings(loop, plain)
    total = sum(share for share, _ in found.values())
    return {(DOUBTFUL, name): (share / total, evidence) for name, (share, evidence) in found.items()}


def normal(x: float, centre: float, width: float) -> float:
    return math.exp(-0.5 * ((x - centre) / width) ** 2) / (width * math.sqrt(2 * math.pi))


def entered_density(entered: float, off: float, variance: float, typed: float) -> float:
    """Density of what was entered for a voltage: half Cauchy, half about known slips, widened by the doubt of what was meant."""
    meant = entered + off
    about = [normal(entered, meant / c, math.hypot(NEAR * meant / c, math.sqrt(variance) / c)) for c in RATIOS]
    return 0.5 / (math.pi * typed * (1 + (off / typed) ** 2)) + 0.5 * sum(about) / len(RATIOS)


def meant_density(entered: float, off: float, variance: float, typed: float) -> float:
    """Density of what was meant by a current, which nothing predicts but what was entered."""
    meant = entered + off
    about = [normal(meant, entered * c, math.hypot(NEAR * entered * c, math.sqrt(variance))) for c in RATIOS]
    return 0.5 / (math.pi * typed * (1 + (off / typed) ** 2)) + 0.5 * sum(about) / len(RATIOS)


def _one(
    residual: Floats, covariance: Floats, direction: Floats, density: Callable[[float, float], float]
) -> tuple[float, float]:
    """Log evidence of a slip along a direction, summed over its size, and its best size; ``density``: of size, variance."""
    solved = np.linalg.solve(covariance, direction)
    square = float(direction @ solved)
    off = float(residual @ solved) / square
    # the residual without the slip, and the width of the Gaussian over its size
    base = log_gaussian(residual - off * direction, covariance) + 0.5 * math.log(2 * math.pi / square)
    return base + math.log(density(off, 1 / square)), off


def _entered(entered: float, typed: float, off: float, variance: float) -> float:
    return entered_density(entered, off, variance, typed)


def _meant(entered: float, typed: float, off: float, variance: float) -> float:
    return meant_density(entered, off, variance, typed)


def _one_reading(loop: Any, plain: ModuleType) -> dict[str, tuple[float, float]]:
    """One voltage or one current."""
    limits = loop.limits
    mean, covariance = loop.gaussian()
    residual = loop.shown - mean
    readings: list[Shown] = list({id(s): s for row in loop.rows for s, _ in row.shown}.values())
    count = len(readings) + len(loop.currents_read)
    share = limits["doubtful.one_reading"] / count
    found: dict[str, tuple[float, float]] = {}
    for number, shown in enumerate(readings):
        direction = -np.array([sum(w for s, w in row.shown if s is shown) for row in loop.rows])
        typed = limits["slip.voltage_share"] * loop.case.nominal_v
        found[f"voltage {number}"] = (
            share,
            _one(residual, covariance, direction, partial(_entered, shown.value, typed))[0],
        )
    typed = limits["slip.current_share"] * max(abs(shown.value) for shown in loop.currents_read)
    offs: list[float] = []
    for number, shown in enumerate(loop.currents_read):
        evidence, off = _one(residual, covariance, _per_ampere(loop, plain, shown), partial(_meant, shown.value, typed))
        found[f"current {number}"] = (share, evidence)
        offs.append(off)
    # the current that explains most is judged with the doubt that its corrected value brings
    best = max(range(len(offs)), key=lambda n: found[f"current {n}"][1])
    shown, off = loop.currents_read[best], offs[best]
    other = plain.Plain(loop.case, {id(shown): shown.value + off})
    mean, covariance = other.gaussian()
    direction = _per_ampere(loop, plain, shown)
    solved = np.linalg.solve(covariance, direction)
    square, left = float(direction @ solved), loop.shown - mean
    further = float(left @ solved) / square
    base = log_gaussian(left - further * direction, covariance) + 0.5 * math.log(2 * math.pi / square)
    density = meant_density(shown.value, off + further, 1 / square, typed)
    found[f"current {best}"] = (share, base + math.log(density))
    return found


def _per_ampere(loop: Any, plain: ModuleType, shown: Shown) -> Floats:
    """What one ampere more in a current reading adds to each row: exact, since a drop is linear in it."""
    more = plain.Plain(loop.case, {id(shown): shown.value + 1.0})
    direction: Floats = more.gaussian()[0] - loop.gaussian()[0]
    return direction


def _several_readings(loop: Any, plain: ModuleType) -> dict[str, tuple[float, float]]:
    """Two points exchanged, the clamp turned round, several things at once."""
    limits = loop.limits
    mean, covariance = loop.gaussian()
    pairs = []
    for this in loop.case.rounds:
        volts = [terms[0].shown for terms in this.volts.values()]
        pairs += [(a, b) for n, b in enumerate(volts) for a in volts[:n]]
    found: dict[str, tuple[float, float]] = {}
    for number, (a, b) in enumerate(pairs):
        meant = {id(a): b.value, id(b): a.value}
        rows = [sum(w * meant.get(id(s), s.value) for s, w in row.shown) for row in loop.rows]
        evidence = log_gaussian(np.array(rows) - mean, covariance)
        found[f"swapped {number}"] = (limits["doubtful.swapped_points"] / len(pairs), evidence)
    turned = plain.Plain(loop.case, {id(shown): -shown.value for shown in loop.currents_read})
    found["reversed"] = (limits["doubtful.clamp_reversed"], turned.log_density())
    wide = covariance + np.eye(len(mean)) * (limits["slip.several_share"] * loop.case.nominal_v) ** 2
    found["several"] = (limits["doubtful.several_things"], log_gaussian(loop.shown - mean, wide))
    return found
