"""
The doubt budget of a drop: measured against computed, and what each doubt adds to the doubt of the excess.

Everything comes from one computation, so that the named figures add in quadrature to the excess's ``u``.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from rules.assessment import Doubt
from rules.calc.doubt import Weighted, parts
from rules.limits import Limits
from rules.record import Figure
from rules.runs import Carrying, RunFigures, record_parts

RECORD_GROUPS = {
    "length": "length_doubt",
    "temperature": "temperature_doubt",
    "resistance per metre": "resistance_doubt",
    "terminations": "termination",
    "device": "device_doubt",
    "load share": "load_share",
    "source wander": "source",
}
"""Which group of the limits profile states each doubt; the meters' own come from the record of instruments."""
POOR_METER = "poor_meter"
"""Group of the profile that speaks for a meter that is not recorded."""


@dataclass(frozen=True, slots=True)
class Current:
    """The current in one branch of a round: readings with weights, and what unread taps add."""

    terms: tuple[Weighted, ...]
    shares: tuple[tuple[str, float], ...] = ()
    """By tap between the branch that was read and this one: standard uncertainty of this current, signed. [A]"""

    @property
    def value_a(self) -> float:
        return sum(term.weight * term.shown.value for term in self.terms)


@dataclass(frozen=True, slots=True)
class Carried:
    """One stretch of a path, a run or the device, and the current in it."""

    ohm: float
    current: Current
    run: RunFigures | None
    """``None`` for the device."""


@dataclass(frozen=True, slots=True)
class Difference:
    """A measured drop against the computed one."""

    measured: Figure
    computed: Figure
    excess: Figure
    budget: tuple[Doubt, ...]
    """Largest first; their squares add to that of the excess's ``u``."""


def _stated_by(terms: Iterable[Weighted]) -> tuple[str, bool]:
    """Group of the profile that states the doubt of readings' meters, empty where none does, and whether instruments do too."""
    poor = {term.shown.is_poor for term in terms}
    return (POOR_METER, False in poor) if True in poor else ("", False)


def difference(measured: Sequence[Weighted], path: Sequence[Carried], limits: Limits) -> Difference:
    """
    Measured less computed drop with its doubt budget.

    Parameters
    ----------
    measured : sequence of Weighted
        Voltage readings whose weighted sum is the drop. [V]
    path : sequence of Carried
        What lies between the two points.

    Notes
    -----
    The gain of a meter acts on the sum of its readings alone, the clamp's on the computed drop; each
    tap errs on its own. JCGM 100:2008, 5.2.

    Examples
    --------
    >>> from rules.calc.doubt import Shown
    >>> from rules.limits import of
    >>> from rules.record import Site
    >>> volts = [Weighted(1, Shown(24.0, "M", 0.003, 0.01)), Weighted(-1, Shown(23.0, "M", 0.003, 0.01))]
    >>> amps = Current((Weighted(1, Shown(8.0, "K", 0.006, 0.01)),))
    >>> found = difference(volts, [Carried(0.1, amps, None)], of(Site(name="x")))
    >>> [f"{doubt.name} {doubt.u_v:.4f}" for doubt in found.budget[:2]]
    ['device 0.2400', 'meter counts 0.0141']
    >>> round(sum(doubt.u_v**2 for doubt in found.budget) ** 0.5, 6) == round(found.excess.u, 6)
    True
    """
    value = device = 0.0
    carrying: list[Carrying] = []
    terms: list[Weighted] = []
    shares: dict[str, float] = defaultdict(float)
    for stretch in path:
        amps = stretch.current.value_a
        value += stretch.ohm * amps
        if stretch.run is None:
            device += (limits["device_doubt.relative"] * stretch.ohm * amps) ** 2
        else:
            carrying.append(Carrying(stretch.run, amps))
        terms += [Weighted(stretch.ohm * term.weight, term.shown) for term in stretch.current.terms]
        for tap, u in stretch.current.shares:
            shares[tap] += stretch.ohm * u
    volts, currents = parts(measured), parts(terms)
    record = record_parts(carrying, limits)
    record["device"] = device
    record["load share"] = sum(u**2 for u in shares.values())
    readings = {
        "meter gain": volts.gain_variance,
        "meter counts": volts.counts_variance,
        "source wander": volts.wander_variance,
        "current gain": currents.gain_variance,
        "current counts": currents.counts_variance + currents.wander_variance,
    }
    all_ = record | readings
    meters = {name: _stated_by(terms if name.startswith("current") else measured) for name in readings}
    meters["source wander"] = ("source", False)
    budget = [
        Doubt(name, math.sqrt(v), *meters.get(name, (RECORD_GROUPS.get(name, ""), False)))
        for name, v in all_.items()
        if v > 0
    ]
    return Difference(
        measured=Figure(volts.value, "V", math.sqrt(volts.variance)),
        computed=Figure(value, "V", math.sqrt(sum(record.values()) + currents.variance)),
        excess=Figure(volts.value - value, "V", math.sqrt(sum(all_.values()))),
        budget=tuple(sorted(budget, key=lambda doubt: -doubt.u_v)),
    )
