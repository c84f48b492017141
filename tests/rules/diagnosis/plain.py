"""
The diagnosis of one circuit as a plain loop over causes and sizes: slow, short, and to be read beside the method.

It goes from the rounds of a case to log evidences without any of ``rules.diagnosis``: each hypothesis gets
its mean and its whole covariance, one column for each doubt, and each integral is a sum over nodes.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from rules.calc.doubt import Shown
from rules.case import CircuitCase
from rules.rounds import current_at
from rules.tables.conductors import alpha_20c, area_mm2, ladder, resistance_20c_ohm_per_m

Floats = NDArray[np.float64]
Element = tuple[str, str]
"""The point at which a run arrives, and a leg (its conductor) or a termination such as ``end positive``."""
LEGS = ("positive", "negative")
CORNERS = [(end, leg) for end in ("start", "end") for leg in LEGS]


@dataclass
class Row:
    """One linear fact: readings with signs on the left, elements with signs on the right, in one round."""

    shown: list[tuple[Shown, float]]
    passes: dict[Element, float]
    round: int


class Plain:
    """A circuit's rows: for each doubt a column over them, made anew for each hypothesis."""

    def __init__(self, case: CircuitCase, instead: Mapping[int, float] | None = None) -> None:
        """``instead`` gives other values to some current readings, by the id of what they show."""
        self.case, self.limits, self.instead = case, case.limits, instead or {}
        self.points = list(case.tree.ends)
        self.rows = [row for number in range(len(case.rounds)) for row in self._rows(number)]
        self.elements = [key for point in self.points for key in both_legs(point)]
        self.shown = np.array([sum(s.value * w for s, w in row.shown) for row in self.rows])
        figures = {p: case.tree.figures[case.tree.ends[p].id] for p in self.points}
        legs = [figures[p].legs[LEGS.index(what.split()[-1])] for p, what in self.elements]
        self.is_conductor = np.array([what in LEGS for _, what in self.elements])
        self.conductor = np.where(self.is_conductor, [leg.conductor_ohm for leg in legs], 0.0)
        warmed = [
            leg.slope_ohm_per_k * figures[p].temperature_u_k for (p, _), leg in zip(self.elements, legs, strict=True)
        ]
        self.slope = np.where(self.is_conductor, warmed, 0.0)
        self.joints = np.where(self.is_conductor, 0.0, [leg.joint_ohm for leg in legs])
        self.joints_u = np.where(self.is_conductor, 0.0, [leg.joint_variance**0.5 for leg in legs])
        self.length_u = np.array([figures[p].length_u for p, _ in self.elements])
        self.of_run = [np.array([p == point for p, _ in self.elements], dtype=float) for point in self.points]
        self._currents()
        self._meters()

    def _rows(self, number: int) -> list[Row]:
        """Drops between neighbouring read points, joints and drops with a long lead of one round."""
        tree, this = self.case.tree, self.case.rounds[number]
        rows = []
        read = [p for p in ("way", *self.points) if p in this.volts]
        for point in read[1:]:
            path = [point]
            while (above := tree.ends[path[-1]].from_point) not in read:
                path.append(above)
            shown = [(t.shown, t.weight) for t in this.volts[above]]
            shown += [(t.shown, -t.weight) for t in this.volts[point]]
            rows.append(Row(shown, {key: 1.0 for p in path for key in both_legs(p)}, number))
        arriving = {f"run {run.number}": point for point, run in tree.ends.items()}
        for reading in this.readings:
            if reading.quantity == "joint":
                name, end = reading.at.rsplit(" ", 1)
                rows.append(
                    Row([(this.shown[reading.id], 1.0)], {(arriving[name], f"{end} {reading.leg}"): 1.0}, number)
                )
            elif reading.quantity == "drop":
                legs = LEGS if reading.leg in ("", "both") else (reading.leg,)
                passed = [key for p in tree.path(reading.at, reading.to) for key in both_legs(p)]
                kept = {key: 1.0 for key in passed if key[1].split()[-1] in legs}
                rows.append(Row([(this.shown[reading.id], 1.0)], kept, number))
        return rows

    def _through(self, amps: Callable[[int, str], float]) -> Floats:
        """(rows, elements): drop that one ohm in each element makes in each row."""
        return np.array(
            [[row.passes.get(key, 0.0) * amps(row.round, key[0]) for key in self.elements] for row in self.rows]
        )

    def _currents(self) -> None:
        """What each element carries in each row, and what it would carry more through each doubt of a current."""
        currents = [
            {p: current_at(p, this, self.case.tree, self.limits) for p in self.points} for this in self.case.rounds
        ]

        def value(shown: Shown) -> float:
            return self.instead.get(id(shown), shown.value)

        self.amps = self._through(lambda n, p: sum(t.weight * value(t.shown) for t in currents[n][p].terms))
        terms = [t for of_round in currents for c in of_round.values() for t in c.terms]

        def of_gain(key: str, u: float) -> Callable[[int, str], float]:
            return lambda n, p: (
                u * sum(t.weight * value(t.shown) for t in currents[n][p].terms if t.shown.gain_key == key)
            )

        def of_counts(shown: Shown) -> Callable[[int, str], float]:
            u = shown.own_variance**0.5
            return lambda n, p: u * sum(t.weight for t in currents[n][p].terms if t.shown is shown)

        def of_tap(tap: str) -> Callable[[int, str], float]:
            return lambda n, p: sum(u for name, u in currents[n][p].shares if name == tap)

        doubts = [of_gain(key, u) for key, u in {t.shown.gain_key: t.shown.gain_u for t in terms}.items()]
        doubts += [of_counts(shown) for shown in {id(t.shown): t.shown for t in terms}.values()]
        doubts += [of_tap(tap) for tap in {tap for row in currents for c in row.values() for tap, _ in c.shares}]
        self.doubtful_amps = [self._through(doubt) for doubt in doubts]
        self.currents_read = list({id(t.shown): t.shown for t in terms}.values())

    def _meters(self) -> None:
        """Which rows each voltmeter's gain acts on, and each reading's own doubt."""
        gains = {s.gain_key: s.gain_u for row in self.rows for s, _ in row.shown}
        self.gains = [
            (u, np.array([float(row.shown[0][0].gain_key == key) for row in self.rows])) for key, u in gains.items()
        ]
        readings = {id(s): s for row in self.rows for s, _ in row.shown}.values()
        self.counts = [
            shown.own_variance**0.5 * np.array([sum(w for s, w in row.shown if s is shown) for row in self.rows])
            for shown in readings
        ]
        first = {(self.points[0], leg) for leg in LEGS}
        self.sees_offset = np.array([float(first <= row.passes.keys()) for row in self.rows])

    def gaussian(
        self, factor: Floats | float = 1.0, bad: Element | None = None, ohm: float = 0.0, offset: float = 0.0
    ) -> tuple[Floats, Floats]:
        """Mean and covariance of the rows under one hypothesis of known size: one column for each doubt."""
        conductor = self.conductor * factor
        whole = conductor + self.joints
        if bad is not None:
            whole[self.elements.index(bad)] += ohm
        mean = self.amps @ whole + offset * self.sees_offset
        columns = [
            self.amps @ (self.slope * factor),
            self.amps @ (self.limits["resistance_doubt.relative"] * conductor),
        ]
        columns += [self.amps @ (run * self.length_u * conductor) for run in self.of_run]
        columns += [u * rows * mean for u, rows in self.gains]
        columns += [amps @ whole for amps in self.doubtful_amps]
        columns += self.counts
        doubts = np.column_stack([*columns, self.amps * self.joints_u])
        return mean, doubts @ doubts.T

    def log_density(
        self, factor: Floats | float = 1.0, bad: Element | None = None, ohm: float = 0.0, offset: float = 0.0
    ) -> float:
        """Log density of everything read, under one hypothesis of known size."""
        mean, covariance = self.gaussian(factor, bad, ohm, offset)
        residual = self.shown - mean
        _, log_determinant = np.linalg.slogdet(covariance)
        quadratic = residual @ np.linalg.solve(covariance, residual)
        return float(-0.5 * (quadratic + log_determinant + len(residual) * math.log(2 * math.pi)))

    def evidences(self) -> dict[tuple[str, str], float]:
        """Log evidence by cause and by what or where; terminations that no row separates stand once, as the run."""
        limits = self.limits
        found = {("as recorded", ""): self.log_density()}
        low, high = math.log(limits["bad_connection.low_ohm"]), math.log(limits["bad_connection.high_ohm"])
        for point, run in self.case.tree.ends.items():
            scale = math.log(math.sqrt(10 / area_mm2(run.size)))
            for place, what in self.places(point).items():
                found["bad connection", f"{run.name} {what}".strip()] = log_mean(
                    self._along(place), low + scale, high + scale
                )
        for steps in (1, 2):
            found["smaller conductor", str(steps)] = self.log_density(self.sizes(-steps))
        for metal in ("copper-clad aluminium", "aluminium"):
            found["other metal", metal] = self.log_density(self._metal(metal))
        found["longer route", "2"] = self.log_density(2.0)
        found["longer route", "3.28"] = self.log_density(1 / 0.3048)
        found["longer route", "range"] = log_mean(
            lambda f: self.log_density(f), limits["longer_route.low_factor"], limits["longer_route.high_factor"]
        )
        found["series semiconductor", ""] = log_mean(
            lambda v: self.log_density(offset=v),
            limits["series_semiconductor.low_v"],
            limits["series_semiconductor.high_v"],
        )
        return found

    def _along(self, place: Element) -> Callable[[float], float]:
        """Log density along the logarithm of an extra resistance at one place."""
        return lambda u: self.log_density(bad=place, ohm=math.exp(u))

    def places(self, point: str) -> dict[Element, str]:
        """Terminations of a run with their names; the first alone, without one, where no row tells them apart."""
        corners = [(point, f"{end} {leg}") for end, leg in CORNERS]
        enters = [tuple(row.passes.get(corner, 0.0) for row in self.rows) for corner in corners]
        if len(set(enters)) == 1:
            return {corners[0]: ""}
        return {corner: corner[1] for corner in corners}

    def posterior(self, more: Mapping[tuple[str, str], tuple[float, float]] | None = None) -> dict[str, float]:
        """Probability of each cause; ``more`` adds causes with a share and a log evidence (``plain_slips``)."""
        prior = self.limits.prior
        shares = {"as recorded": 1.0, "smaller conductor": 1 / 2, "longer route": 1 / 3, "series semiconductor": 1.0}
        joint: dict[tuple[str, str], float] = {}
        for (cause, what), evidence in self.evidences().items():
            if cause == "other metal":
                share = self.limits["other_metal." + what.replace(" ", "_").replace("-", "_")]
            elif cause == "bad connection":
                share = (1.0 if what.count(" ") == 1 else 1 / 4) / len(self.points)
            else:
                share = shares[cause]
            joint[cause, what] = math.log(prior[cause] * share) + evidence if prior[cause] else -math.inf
        for (cause, what), (share, evidence) in (more or {}).items():
            joint[cause, what] = math.log(prior[cause] * share) + evidence
        best = max(joint.values())
        total = sum(math.exp(value - best) for value in joint.values())
        causes = dict.fromkeys((cause for cause, _ in joint), 0.0)
        for (cause, _), value in joint.items():
            causes[cause] += math.exp(value - best) / total
        return causes

    def sizes(self, steps: int) -> Floats:
        """Factor of each element where every run is some sizes smaller (below 0) or larger."""
        factors = {}
        for point, run in self.case.tree.ends.items():
            smaller = [size for size in ladder(run.size) if area_mm2(size) < area_mm2(run.size)]
            larger = [size for size in ladder(run.size) if area_mm2(size) > area_mm2(run.size)]
            other = smaller[steps] if steps < 0 else larger[steps - 1]
            kind = (run.material_or_default, run.stranding_or_default)
            factors[point] = resistance_20c_ohm_per_m(other, *kind) / resistance_20c_ohm_per_m(run.size, *kind)
        return np.array([factors[point] for point, _ in self.elements])

    def _metal(self, metal: str) -> Floats:
        """Factor of each element where every run is of another metal."""
        factors = {}
        for point, run in self.case.tree.ends.items():
            warmer = self.case.tree.figures[run.id].temperature_c - 20
            other, own = (
                resistance_20c_ohm_per_m(run.size, m, run.stranding_or_default) * (1 + alpha_20c(m) * warmer)
                for m in (metal, run.material_or_default)
            )
            factors[point] = other / own
        return np.array([factors[point] for point, _ in self.elements])


def both_legs(point: str) -> list[Element]:
    """The conductors and terminations of the run that arrives at a point."""
    return [(point, leg) for leg in LEGS] + [(point, f"{end} {leg}") for end, leg in CORNERS]


def log_mean(log_density: Callable[[float], float], low: float, high: float) -> float:
    """Log of the mean of a density over a range: looked for in three steps, then summed over 24 nodes."""
    left, right = low, high
    for _ in range(3):
        grid = np.linspace(left, right, 24)
        values = np.array([log_density(float(u)) for u in grid])
        kept = np.flatnonzero(values >= values.max() - 18)
        left, right = grid[max(kept[0] - 1, 0)], grid[min(kept[-1] + 1, 23)]
    nodes, weights = np.polynomial.legendre.leggauss(24)
    values = np.array([log_density(float(left + (right - left) * (x + 1) / 2)) for x in nodes])
    best = values.max()
    total = float(np.exp(values - best) @ weights) / 2 * (right - left)
    return float(best) + math.log(total / (high - low))
