"""
Which habits err: sets of them, searched by their posterior.

From the empty set on, one habit is added, left out or exchanged at a time as long as that makes the set more
probable. Meters within their specification are a part of every set.
"""

from __future__ import annotations

from typing import TypeAlias

import numpy as np

from rules.diagnosis.habits import expected
from rules.diagnosis.pool import Pool
from rules.diagnosis.pool_fit import Fit, fitted, scanned
from rules.diagnosis.shape import Floats
from rules.limits import Limits

CANDIDATES = 12
"""Habits that are looked at closely for one place in a set, the most promising."""
HOPELESS = -7.0
"""Log of prior odds times gain below which a habit is not looked at closely."""
BETTER = 1e-6
"""Gain in log posterior for which the best set is left."""

Chosen: TypeAlias = frozenset[int]
"""Numbers of the pool's habits that err."""


class Search:
    """Sets of habits with their posterior, each fitted once."""

    def __init__(self, pool: Pool, limits: Limits) -> None:
        self.pool = pool
        priors = [expected(habit, limits) for habit in pool.habits]
        self.spread = np.array([prior.spread for prior in priors])
        chance = np.clip([prior.probability for prior in priors], 0.0, 1 - 1e-9)
        with np.errstate(divide="ignore"):
            self.odds = np.where(self.spread > 0, np.log(chance / (1 - chance)), -np.inf)
        self.fits: dict[Chosen, Fit] = {}
        self._near: dict[Chosen, tuple[list[int], Floats]] = {}

    def fit(self, chosen: Chosen, start: Floats | None = None) -> Fit:
        """A set's sizes and evidence."""
        if chosen not in self.fits:
            variance, some = self.pool.within**2, sorted(chosen)
            variance[some] += self.spread[some] ** 2
            self.fits[chosen] = fitted(self.pool, variance, np.zeros_like(variance) if start is None else start)
        return self.fits[chosen]

    def log_posterior(self, chosen: Chosen) -> float:
        """Log of a set's evidence times its prior over that of the empty set."""
        return self.fit(chosen).log_evidence + float(self.odds[sorted(chosen)].sum())

    def with_one_more(self, chosen: Chosen) -> list[Chosen]:
        """The set with each habit that promises something, the most promising first."""
        if chosen not in self._near:
            found = scanned(self.pool, self.fit(chosen).size, np.maximum(self.spread, 1e-12))
            score = self.odds + found.gain
            score[sorted(chosen)] = -np.inf
            order = np.argsort(-score, kind="stable")[:CANDIDATES].tolist()
            self._near[chosen] = [number for number in order if score[number] > HOPELESS], found.best
        numbers, best = self._near[chosen]
        for number in numbers:
            start = self.fit(chosen).size.copy()
            start[number] = best[number]
            self.fit(chosen | {number}, start)
        return [chosen | {number} for number in numbers]

    def best(self) -> Chosen:
        """The most probable set that no neighbour surpasses."""
        chosen: Chosen = frozenset()
        while True:
            near = self.with_one_more(chosen)
            for number in sorted(chosen):
                less = chosen - {number}
                self.fit(less, self.fit(chosen).size)
                near += [less, *self.with_one_more(less)]
            top = max(near, key=self.log_posterior, default=chosen)
            if self.log_posterior(top) < self.log_posterior(chosen) + BETTER:
                return chosen
            chosen = top

    def tied(self, chosen: Chosen, number: int) -> Floats:
        """(E,): how much the readings cannot tell each habit from one, from 0 to 1, with a set's sizes."""
        curve = self.fit(chosen).curve
        own = np.sqrt(np.maximum(np.diag(curve), 1e-300))
        together: Floats = np.abs(curve[number]) / (own * own[number])
        return together
