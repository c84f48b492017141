"""
Sums that must come out, against networks solved by NumPy's linear algebra.

What a meter within its specification shows of a network that obeys Ohm and Kirchhoff gives no finding but by chance; one
reading that is off by far more than its doubt gives one.
"""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess
from rules.record import Site

SUMS = {"RD08", "RD09", "RD11"}
ACCURACY, COUNTS, RESOLUTION = 0.5, 2, 0.001
CLAMP, CLAMP_COUNTS, CLAMP_RESOLUTION = 1.0, 3, 0.01
POINTS = ("way", "p1", "p2", "p3")


def solved(chance: np.random.Generator) -> dict[str, Any]:
    """
    Node voltages of a fork: way to p1, then to p2 and to p3, each leg a resistor, loads at p2 and p3.

    Six unknown nodes: the two poles of p1, p2 and p3; the poles of way stand at ± half of 24 V about earth.
    """
    legs = chance.uniform(0.02, 0.3, (3, 2))
    loads = chance.uniform(6.0, 30.0, 2)
    conductance, injected = np.zeros((6, 6)), np.zeros(6)
    ends = ((None, 0), (0, 1), (0, 2))
    for run, (start, end) in enumerate(ends):
        for pole in range(2):
            g, far = 1 / legs[run, pole], 2 * end + pole
            conductance[far, far] += g
            if start is None:
                injected[far] += g * (12.0 if pole == 0 else -12.0)
            else:
                near = 2 * start + pole
                conductance[near, near] += g
                conductance[near, far] -= g
                conductance[far, near] -= g
    for place, ohm in zip((1, 2), loads, strict=True):
        a, b = 2 * place, 2 * place + 1
        conductance[a, a] += 1 / ohm
        conductance[b, b] += 1 / ohm
        conductance[a, b] -= 1 / ohm
        conductance[b, a] -= 1 / ohm
    nodes = np.linalg.solve(conductance, injected)
    poles = {"way": (12.0, -12.0)} | {f"p{n + 1}": (nodes[2 * n], nodes[2 * n + 1]) for n in range(3)}
    amps = [
        (poles[a][0] - poles[b][0]) / legs[run, 0]
        for run, (a, b) in enumerate((("way", "p1"), ("p1", "p2"), ("p1", "p3")))
    ]
    return {"poles": poles, "amps": amps}


def survey(chance: np.random.Generator, slip: str = "") -> Site:
    """The network as one voltmeter and one clamp show it; with a slip, one reading is off by a tenth of its value."""
    truth = solved(chance)
    gains = chance.uniform(-1, 1, 2) * (ACCURACY / 100, CLAMP / 100)

    def volts(value: float) -> float:
        shown = value * (1 + gains[0]) + chance.uniform(-1, 1) * COUNTS * RESOLUTION
        return float(round(shown / RESOLUTION) * RESOLUTION)

    def amperes(value: float) -> float:
        shown = value * (1 + gains[1]) + chance.uniform(-1, 1) * CLAMP_COUNTS * CLAMP_RESOLUTION
        return float(round(shown / CLAMP_RESOLUTION) * CLAMP_RESOLUTION)

    rows: list[tuple[str, str, str, str, float]] = []
    for point in POINTS:
        plus, minus = truth["poles"][point]
        rows.append(("voltage", point, "", "both", volts(plus - minus)))
        rows.append(("voltage", point, "", "positive", volts(plus)))
        rows.append(("voltage", point, "", "negative", volts(minus)))
    for start, end in (("way", "p1"), ("p1", "p2"), ("p1", "p3"), ("way", "p2")):
        for leg, pole, sense in (("positive", 0, 1), ("negative", 1, -1)):
            rows.append(
                ("drop", start, end, leg, volts(sense * (truth["poles"][start][pole] - truth["poles"][end][pole])))
            )
    rows += [("current", f"run {n + 1}", "", "", amperes(value)) for n, value in enumerate(truth["amps"])]
    readings = [
        {"circuit": "C1", "round": "1", "quantity": quantity, "at": at, "to": to, "leg": leg,
         "value": f"{value * (1.1 if slip == f'{quantity} {at} {leg}'.strip() else 1.0):.6f}",
         "instrument": "K1" if quantity == "current" else "M1"}
        for quantity, at, to, leg, value in rows
    ]  # fmt: skip
    return site_of(
        {
            "sources": [{"source": "PSU", "kind": "power supply", "nominal": "24", "earthing": "mid earthed"}],
            "circuits": [{"circuit": "C1", "fed_from": "PSU", "device": "none"}],
            "runs": [
                {"circuit": "C1", "run": str(n + 1), "from": start, "to": end, "length": "20", "size": "2.5 mm2"}
                for n, (start, end) in enumerate((("way", "p1"), ("p1", "p2"), ("p1", "p3")))
            ],
            "loads": [{"circuit": "C1", "point": point, "load": point, "current": "4"} for point in ("p2", "p3")],
            "instruments": [
                {"instrument": "M1", "quantity": "voltage", "accuracy": str(ACCURACY), "counts": str(COUNTS),
                 "resolution": str(RESOLUTION)},
                {"instrument": "K1", "quantity": "current", "accuracy": str(CLAMP), "counts": str(CLAMP_COUNTS),
                 "resolution": str(CLAMP_RESOLUTION)},
            ],
            "readings": readings,
        },
        {"name": "fork", "nominal": "24 V"},
    )  # fmt: skip


def found(site: Site) -> list[tuple[str, str]]:
    findings = assess(site, limits.of(site)).findings
    return [(finding.rule, finding.where) for finding in findings if finding.rule in SUMS]


def test_meters_within_their_specification_close_but_by_chance() -> None:
    """Each sum is judged at 0.99; counts are rectangular, so that their sums lie outside less often than a Gaussian's."""
    chance = np.random.default_rng(7)
    sites, sums = 60, 4 + 1 + 4  # four pairs of points for RD08, p1 for RD09, four points for RD11
    wrong = sum(len(found(survey(chance))) for _ in range(sites))
    assert wrong <= 0.01 * sites * sums + 3 * (0.01 * sites * sums) ** 0.5


@pytest.mark.parametrize(
    ("slip", "expected"),
    [
        ("drop p1 positive", ("RD08", "p1 to p2, round 1")),
        ("current run 1", ("RD09", "p1, round 1")),
        ("voltage p2 negative", ("RD11", "p2, round 1")),
        ("voltage p3 both", ("RD11", "p3, round 1")),
    ],
)
def test_one_reading_that_is_off_by_a_tenth_is_found(slip: str, expected: tuple[str, str]) -> None:
    for seed in range(6):
        assert expected in found(survey(np.random.default_rng(seed), slip)), seed
