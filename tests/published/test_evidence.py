"""
The evidence of causes against scipy: Gaussians and integrals that are written out here for one run read in two rounds.

Nothing of the diagnosis is used for the expectation: mean and covariance are put down by hand from the figures of the
method (doubts as standard uncertainties), ``scipy.stats.multivariate_normal`` gives the densities and
``scipy.integrate.quad`` the integrals over a cause's size.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import cache
from typing import TypeAlias

import numpy as np
import pytest
import scipy.integrate
import scipy.stats

from audit.intake.folder import site_of
from rules import limits
from rules.assess import prepare
from rules.diagnosis.diagnose import diagnose
from rules.diagnosis.judge import judge_block
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import shape_of
from rules.measured import posed_by

Volts: TypeAlias = tuple[tuple[float, float], ...]

LENGTH_M, AREA_MM2 = 12.0, 4.0
OHM_PER_M = 4.61e-3
"""4 mm² copper, class 2, at 20 °C: IEC 60228:2004. [ohm/m]"""
SMALLER_OHM_PER_M = 7.41e-3
"""2.5 mm². [ohm/m]"""
ALPHA = 0.00393
AMPS = (8.0, 3.0)
VOLTS = ((24.000, 22.806), (24.300, 23.853))
"""At the two ends of the run, in each round; a third more than as recorded."""
NEARLY = ((24.000, 23.075), (24.300, 23.953))
"""A thirtieth more."""
METER = {"accuracy": 0.05, "counts": 1, "resolution": 0.001}
CLAMP = {"accuracy": 0.3, "counts": 1, "resolution": 0.01}
JOINTS, LOG_SD = 4, math.log(2)
JOINT_OHM = 0.15e-3 * math.sqrt(10 / AREA_MM2) * math.exp(LOG_SD**2 / 2)
"""Mean of one healthy termination. [ohm]"""

BAD = (math.log(3e-3 * math.sqrt(10 / AREA_MM2)), math.log(300e-3 * math.sqrt(10 / AREA_MM2)))
"""Logarithms of the least and the largest extra resistance."""


BREAKER = {"device": "breaker B", "device_rating": "16", "device_poles": "1"}
DEVICE_OHM = 0.6 * 3.5 / 16**2
"""One of its poles: typically 0.6 of the 3.5 W that its standard allows. [ohm]"""


def gain_u(meter: dict[str, float]) -> float:
    return meter["accuracy"] / 100 / math.sqrt(3)


def counts_u(meter: dict[str, float]) -> float:
    return meter["resolution"] * math.sqrt(meter["counts"] ** 2 / 3 + 1 / 12)


def log_density(
    factor: float = 1.0, extra_ohm: float = 0.0, offset_v: float = 0.0, volts: Volts = VOLTS, device_ohm: float = 0.0
) -> float:
    """
    Of both drops, with the conductors at a factor, an extra resistance in a joint, a voltage in a semiconductor.

    ``device_ohm`` lies before the run, its doubt 30 %.
    """
    amps = np.array(AMPS)
    conductor = 2 * LENGTH_M * OHM_PER_M * factor
    whole = device_ohm + conductor + JOINTS * JOINT_OHM + extra_ohm
    mean = amps * whole + offset_v
    covariance = 2 * counts_u(METER) ** 2 * np.eye(2)  # two voltages each, by counts of their own
    covariance += np.diag((counts_u(CLAMP) * whole) ** 2 * np.ones(2))
    shared = [
        gain_u(METER) * mean,
        gain_u(CLAMP) * amps * whole,
        0.005 * amps * conductor,  # a length by the cable's marks
        2.0 * ALPHA * amps * conductor,  # a temperature by probe, 20 °C
        0.02 * amps * conductor,  # resistance per metre
        0.3 * amps * device_ohm,
    ]
    shared += JOINTS * [amps * JOINT_OHM * math.sqrt(math.exp(LOG_SD**2) - 1)]
    for column in shared:
        covariance += np.outer(column, column)
    read = np.array([start - end for start, end in volts])
    return float(scipy.stats.multivariate_normal(mean, covariance).logpdf(read))


def log_mean(of: Callable[[float], float], low: float, high: float) -> float:
    """Log of the mean density over an even coordinate, by adaptive quadrature told where the peak is."""
    grid = np.linspace(low, high, 401)
    values = [of(float(at)) for at in grid]
    best, peak = max(values), float(grid[int(np.argmax(values))])
    total, _ = scipy.integrate.quad(
        lambda at: math.exp(of(at) - best), low, high, points=[peak], limit=400, epsabs=0, epsrel=1e-7
    )
    return best + math.log(total / (high - low))


@cache
def posed(volts_read: Volts, device: bool = False) -> tuple[Problem, limits.Limits]:
    """What the diagnosis is given."""
    rows = []
    for number, (pair, ampere) in enumerate(zip(volts_read, AMPS, strict=True), 1):
        for at, volts in zip(("bus" if device else "way", "p1"), pair, strict=True):
            rows.append(("voltage", at, f"{volts:.3f}", "M1", number))
        rows.append(("current", "run 1", f"{ampere:.2f}", "K1", number))
    tables = {
        "sources": [{"source": "PSU", "kind": "power supply", "nominal": "24"}],
        "circuits": [{"circuit": "C1", "fed_from": "PSU"} | (BREAKER if device else {"device": "none"})],
        "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": str(LENGTH_M), "size": "4 mm2",
                  "length_by": "marks", "temperature": "20", "temperature_by": "probe"}],
        "loads": [{"circuit": "C1", "point": "p1", "load": "far", "current": "8"}],
        "instruments": [
            {"instrument": tag, "quantity": quantity} | {name: str(figure) for name, figure in meter.items()}
            for tag, quantity, meter in (("M1", "voltage", METER), ("K1", "current", CLAMP))
        ],
        "readings": [
            {"circuit": "C1", "round": str(round_), "quantity": quantity, "at": at, "value": value, "instrument": tag}
            for quantity, at, value, tag, round_ in rows
        ],
    }  # fmt: skip
    site = site_of(tables, {"name": "one run", "ambient": "20 degC"})
    context = prepare(site, limits.of(site))
    problem = posed_by(context, context.measured[site.circuits[0].id])
    assert problem is not None
    return problem, context.limits


@cache
def found() -> dict[tuple[str, str], float]:
    """Log evidence of each hypothesis as the diagnosis has it."""
    problem, in_force = posed(VOLTS)
    judged = judge_block(shape_of(problem.signature), [problem], in_force)
    evidence = judged.hypotheses.log_evidence[0].tolist()
    return {(name.cause, name.what): value for name, value in zip(judged.hypotheses.names, evidence, strict=True)}


@pytest.mark.parametrize(
    ("cause", "what", "factor"),
    [
        ("as recorded", "", 1.0),
        ("smaller conductor", "one size smaller", SMALLER_OHM_PER_M / OHM_PER_M),
        ("longer route", "a loop entered as one way", 2.0),
        ("longer route", "feet entered as metres", 1 / 0.3048),
        ("reading or record doubtful", "length_as_loop", 0.5),
    ],
)
def test_single_factors_have_scipys_density(cause: str, what: str, factor: float) -> None:
    assert found()[cause, what] == pytest.approx(log_density(factor), abs=1e-6)


def test_a_bad_connection_is_scipys_integral_over_its_resistance() -> None:
    expected = log_mean(lambda u: log_density(extra_ohm=math.exp(u)), *BAD)
    assert found()["bad connection", ""] == pytest.approx(expected, abs=1e-4)


def test_a_semiconductor_is_scipys_integral_over_its_voltage() -> None:
    expected = log_mean(lambda v: log_density(offset_v=v), 0.25, 0.9)
    assert found()["series semiconductor", ""] == pytest.approx(expected, abs=1e-4)


def test_a_longer_route_is_scipys_integral_over_its_factor() -> None:
    expected = log_mean(lambda f: log_density(factor=f), 1.3, 2.5)
    assert found()["longer route", "a longer way"] == pytest.approx(expected, abs=1e-4)


def test_the_doubt_of_a_device_is_in_the_density() -> None:
    """The same voltages read across the breaker as well."""
    problem, in_force = posed(NEARLY, device=True)
    judged = judge_block(shape_of(problem.signature), [problem], in_force)
    expected = log_density(volts=NEARLY, device_ohm=DEVICE_OHM)
    assert judged.hypotheses.log_evidence[0, 0] == pytest.approx(expected, abs=1e-6)
    assert expected != pytest.approx(log_density(volts=NEARLY), abs=1e-3)


def test_the_posterior_is_prior_times_evidence() -> None:
    """Of the two causes that matter here, by the method's own weights: 0.80 as recorded, 0.10 a bad connection."""
    problem, in_force = posed(NEARLY)
    (diagnosis,) = diagnose([problem], in_force)
    bad = log_mean(lambda u: log_density(extra_ohm=math.exp(u), volts=NEARLY), *BAD)
    expected = 0.10 / 0.80 * math.exp(bad - log_density(volts=NEARLY))
    assert 0.01 < expected < 100
    assert diagnosis.probability("bad connection") / diagnosis.probability("as recorded") == pytest.approx(
        expected, rel=1e-4
    )
