"""
Current-carrying capacity of the runs of a record: which table, which column, which corrections.

The limits profile chooses the table; insulation, method and number of grouped circuits of the run and the ambient of the site
choose the rest. What the record does not say is taken as the profile has it (the lowest) and named in
``Capacity.assumed``, so that a rule can tell a figure of the record from a cautious guess.
"""

from __future__ import annotations

import re
from dataclasses import replace
from functools import lru_cache

from rules.calc.ampacity import Capacity, iec_capacity, nec_capacity
from rules.errors import MissingData
from rules.limits import Limits
from rules.record import Run, Site
from rules.tables.ampacity import IEC, NEC, nec_column_c
from rules.tables.conductors import area_mm2

_IEC_METHOD = re.compile(r"(?:reference )?(?:method )?([a-g]) ?([12]?)", re.IGNORECASE)
_NEC_METHODS = ("raceway", "conduit", "cable", "earth", "direct buried")
"""Words for what Table 310.16 is for."""
_NOT_310_16 = ("F", "G")
"""Reference methods of IEC that are single conductors in free air, which Table 310.16 is not for."""

_MOST_KEPT = 4096
"""Capacities kept: the runs of a large site are alike in a few hundred ways, and a look-up takes ten times as long."""


def capacity_of(run: Run, site: Site, limits: Limits, rated_current_a: float | None = None) -> Capacity:
    """
    Capacity of a run as installed: of both its legs the smaller.

    Parameters
    ----------
    run : Run
        With its size; all else may be missing.
    site : Site
        Its ambient temperature counts.
    limits : Limits
        Group ``capacity`` chooses the table and what stands in for what is not recorded.
    rated_current_a : float, optional
        Of the circuit's protective device; it chooses the column of the terminations in NFPA 70. [A]

    Returns
    -------
    Capacity
        ``assumed`` names what the record does not say.

    Raises
    ------
    MissingData
        If the size is not known, or no table has the case; the text says which.
    UnknownSize
        If no table of conductors has the size.

    Notes
    -----
    A shared or structural return is not looked at: it carries what other circuits add.

    Examples
    --------
    >>> from rules import limits
    >>> site = Site(name="hut", ambient_temperature_c=38.0)
    >>> run = Run(id="r", circuit_id="c", number=1, size="4 mm2", insulation="XLPE", method="C", grouped=2)
    >>> capacity = capacity_of(run, site, limits.of(site))
    >>> capacity.column, capacity.ambient_factor, round(capacity.ampacity_a, 2), capacity.assumed
    ('XLPE, method C', 0.91, 32.76, ())
    """
    if not run.size:
        raise MissingData(f"the size of {run.name} is not known")
    legs = [(run.size, run.material_or_default)]
    own_return = (run.return_size_or_default, run.return_material_or_default)
    if run.return_or_default == "own" and own_return not in legs:
        legs.append(own_return)
    found = [_of_leg(size, material, run, site, limits, rated_current_a) for size, material in legs]
    capacity = min(found, key=lambda each: each.ampacity_a)
    return replace(capacity, assumed=(*capacity.assumed, *_assumed(run, site, limits)))


def _of_leg(size: str, material: str, run: Run, site: Site, limits: Limits, rated_current_a: float | None) -> Capacity:
    area_mm2(size)  # refuses a size that no table has, with its neighbours
    table = limits.word("capacity.table")
    if table == "by size":
        table = "iec" if size.endswith(" mm2") else "nec"
    insulation = _insulation(run, limits)
    alike = (_ambient_c(site, limits), run.grouped or 1, run.parallel_or_default)
    if table == "iec":
        method = _iec_method(run) or limits.word("capacity.assumed_method")
        capacity = _iec(size, material, insulation, method, *alike)
        return capacity if run.method else replace(capacity, assumed=(f"installation method {method}",))
    _check_nec_method(run)
    column_c = int(limits.word("capacity.nec_column_of_pvc")) if insulation == "PVC" else nec_column_c(insulation)
    word = limits.word("capacity.nec_terminals")
    terminals_c = None if word == "by device rating" else int(word)
    capacity = _nec(size, material, column_c, *alike, rated_current_a, terminals_c, table == "nec before 2011")
    if rated_current_a is not None or terminals_c is not None or capacity.terminal_c is None:
        return capacity
    return replace(capacity, assumed=(f"terminals of {capacity.terminal_c} °C, by the size",))


@lru_cache(maxsize=_MOST_KEPT)
def _iec(
    size: str, material: str, insulation: str, method: str, ambient_c: float, circuits: int, parallel: int
) -> Capacity:
    return iec_capacity(size, material, insulation, method, ambient_c=ambient_c, circuits=circuits, parallel=parallel)


@lru_cache(maxsize=_MOST_KEPT)
def _nec(
    size: str,
    material: str,
    column_c: int,
    ambient_c: float,
    circuits: int,
    parallel: int,
    rated_current_a: float | None,
    terminals_c: int | None,
    before_2011: bool,
) -> Capacity:
    return nec_capacity(
        size, material, column_c,
        ambient_c=ambient_c, circuits=circuits, parallel=parallel,
        rated_current_a=rated_current_a, terminals_c=terminals_c, before_2011=before_2011,
    )  # fmt: skip


def _insulation(run: Run, limits: Limits) -> str:
    recorded = run.insulation not in ("", "unknown")
    return run.insulation if recorded else limits.word("capacity.assumed_insulation")


def _ambient_c(site: Site, limits: Limits) -> float:
    known = site.ambient_temperature_c
    return limits["ambient.assumed_c"] if known is None else known


def _assumed(run: Run, site: Site, limits: Limits) -> tuple[str, ...]:
    """What holds for both legs and stands in for what is not recorded."""
    return tuple(
        text
        for text, recorded in (
            (f"{_insulation(run, limits)} insulation", run.insulation not in ("", "unknown")),
            ("no other loaded circuit beside it", run.grouped is not None),
            (f"ambient {_ambient_c(site, limits):g} °C", site.ambient_temperature_c is not None),
        )
        if not recorded
    )


def _iec_method(run: Run) -> str:
    """The reference method that a run's ``method`` names; empty where it is empty."""
    if not run.method:
        return ""
    found = _IEC_METHOD.fullmatch(run.method.strip())
    if found is None:
        raise MissingData(f"{run.name} has the method {run.method!r}, which is no reference method of {IEC}")
    return (found[1] + found[2]).upper()


def _check_nec_method(run: Run) -> None:
    """Refuse a method that Table 310.16 is not for; empty means a raceway or cable."""
    method = run.method.strip()
    letter = _IEC_METHOD.fullmatch(method)
    fits = letter[1].upper() not in _NOT_310_16 if letter else method.casefold() in ("", *_NEC_METHODS)
    if not fits:
        raise MissingData(f"{run.name} has the method {method!r}; {NEC} is for raceway, cable or earth")
