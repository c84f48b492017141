"""
Current-carrying capacity of a conductor as installed: a printed figure, corrected.

``iec_capacity`` follows IEC 60364-5-52 for two loaded conductors, ``nec_capacity`` NFPA 70 Table 310.16 with the rules that
go with it. Neither fills a gap: a case that no table has raises ``MissingData``, which says so.
"""

from __future__ import annotations

from dataclasses import dataclass

from rules.calc.guard import require
from rules.calc.service_temperature import service_temperature_c
from rules.tables import ampacity as tables

TERMINALS_STAND_C = 70.0
"""Conductor temperature up to which terminals need no question. [degC] IEC 60364-5-52 Table 52.1, note, from memory."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Capacity:
    """What a conductor, or several in parallel, may carry as installed, and how that comes about."""

    size: str
    material: str
    column: str
    """Where in the table: insulation and method, or the temperature of the column."""
    table: str
    """Name of the group of data, as ``ohmwalk tables`` prints it."""
    source: str
    edition: str
    status: str
    """Of the printed figure: verified, from-memory."""
    tabulated_a: float
    """One conductor alone at the reference ambient, as printed. [A]"""
    parallel: int
    ambient_c: float
    ambient_factor: float
    grouping_factor: float
    limit_c: float
    """Temperature of the conductor at its corrected capacity. [degC]"""
    terminal_a: float | None = None
    """What the terminations allow, all conductors together; ``None`` where no rule limits it. [A]"""
    terminal_c: int | None = None
    """Column that ``terminal_a`` is read in. [degC]"""
    largest_device_a: float | None = None
    """Largest overcurrent device by the small-conductor rule; ``None`` where it names none. [A]"""
    assumed: tuple[str, ...] = ()
    """What the record does not say and was taken instead."""
    notes: tuple[str, ...] = ()
    """What else has to be known with this figure."""

    @property
    def corrected_a(self) -> float:
        """All conductors together, as corrected for ambient and grouping, without terminations. [A]"""
        return self.at_reference_a * self.ambient_factor

    @property
    def at_reference_a(self) -> float:
        """The same at the reference ambient: what the temperature in service is reckoned from. [A]"""
        return self.tabulated_a * self.parallel * self.grouping_factor

    @property
    def ampacity_a(self) -> float:
        """What the conductors may carry as installed: the smaller of corrected and terminations. [A]"""
        return self.corrected_a if self.terminal_a is None else min(self.corrected_a, self.terminal_a)

    def temperature_c(self, current_a: float) -> float:
        """Temperature of the conductor in service at a steady current; see ``service_temperature_c``. [degC]"""
        return float(
            service_temperature_c(
                self.ambient_c, current_a, self.at_reference_a, self.limit_c, tables.REFERENCE_AMBIENT_C
            )
        )


def iec_capacity(
    size: str,
    material: str = "copper",
    insulation: str = "PVC",
    method: str = "C",
    *,
    ambient_c: float = tables.REFERENCE_AMBIENT_C,
    circuits: int = 1,
    parallel: int = 1,
) -> Capacity:
    """
    Capacity of one leg of a two-wire circuit by IEC 60364-5-52.

    Parameters
    ----------
    size, material, insulation, method : str
        As ``rules.tables.ampacity.iec_ampacity`` takes them.
    ambient_c : float
        Of the air around the cable. [°C]
    circuits : int
        Loaded circuits bunched together, this one counted as one.
    parallel : int
        Equal conductors side by side; those beside the first count as circuits more.

    Returns
    -------
    Capacity

    Raises
    ------
    MissingData
        If no table held here has the case.
    InvalidQuantity
        If a number of circuits or conductors is below 1.

    Notes
    -----
    Printed figure × ambient factor × grouping factor × number in parallel. The grouping factor is that of bunched cables
    throughout, which is the lowest; cables in a single layer have a higher one.

    References
    ----------
    IEC 60364-5-52:2009, Tables B.52.2 to B.52.17.

    Examples
    --------
    2.5 mm² PVC clipped to a wall, three circuits bunched in 40 °C:

    >>> capacity = iec_capacity("2.5 mm2", method="C", ambient_c=40.0, circuits=3)
    >>> capacity.tabulated_a, capacity.ambient_factor, capacity.grouping_factor, round(capacity.ampacity_a, 2)
    (27.0, 0.87, 0.7, 16.44)
    """
    _count(circuits, parallel)
    printed = tables.iec_ampacity(size, material, insulation, method)
    limit_c = tables.limit_c(insulation)
    together = circuits - 1 + parallel
    notes = []
    if limit_c > TERMINALS_STAND_C:
        notes.append(
            f"at full capacity the conductor has {limit_c:g} °C; ask whether its terminals stand more than "
            f"{TERMINALS_STAND_C:g} °C"
        )
    if together > 1:
        notes.append("the factor is that of bunched cables; those in a single layer may carry more")
    return Capacity(
        size=size,
        material=material,
        column=f"{insulation}, method {method}",
        table=printed.group.name,
        source=printed.group.source,
        edition=printed.group.edition,
        status=printed.group.status,
        tabulated_a=printed.value,
        parallel=parallel,
        ambient_c=ambient_c,
        ambient_factor=tables.iec_ambient_factor(insulation, ambient_c),
        grouping_factor=tables.iec_grouping_factor(together),
        limit_c=limit_c,
        notes=tuple(notes),
    )


def nec_capacity(
    size: str,
    material: str = "copper",
    column_c: int = 75,
    *,
    ambient_c: float = tables.REFERENCE_AMBIENT_C,
    circuits: int = 1,
    parallel: int = 1,
    rated_current_a: float | None = None,
    terminals_c: int | None = None,
    before_2011: bool = False,
) -> Capacity:
    """
    Capacity of one leg of a two-wire circuit by NFPA 70 Table 310.16.

    Parameters
    ----------
    size, material : str
        As ``rules.tables.ampacity.nec_ampacity`` takes them.
    column_c : int
        Temperature that the insulation stands: 60, 75 or 90. [°C]
    ambient_c : float
        Around the cable. [°C]
    circuits : int
        Loaded two-wire circuits in the same raceway or bundle, this one counted as one.
    parallel : int
        Equal conductors side by side, all in the same raceway or bundle.
    rated_current_a : float, optional
        Of the protective device: it chooses the column of the terminations; without it the size does. [A]
    terminals_c : int, optional
        Column of the terminations where the equipment is marked with it. [°C]
    before_2011 : bool
        By the table of the editions before 2011; corrections and other rules stay those from 2011 on.

    Returns
    -------
    Capacity

    Raises
    ------
    MissingData
        If the table has no such case.
    InvalidQuantity
        If a number of circuits or conductors is below 1.

    Notes
    -----
    Printed figure in the insulation's column × ambient factor × bundling factor × number in parallel, and no more than the
    uncorrected figure in the terminations' column. 18 and 16 AWG have no figure there, so that nothing limits them.

    References
    ----------
    NFPA 70 310.15(B), 310.15(C)(1), 110.14(C), 240.4(D).

    Examples
    --------
    10 AWG of 90 °C, two circuits in a raceway: 32 A, but the terminations allow 30 A and the rule a 30 A device.

    >>> capacity = nec_capacity("10 AWG", column_c=90, circuits=2)
    >>> capacity.corrected_a, capacity.terminal_a, capacity.ampacity_a, capacity.largest_device_a
    (32.0, 30.0, 30.0, 30.0)
    """
    _count(circuits, parallel)
    printed = tables.nec_ampacity(size, material, column_c, before_2011=before_2011)
    terminal_c = terminals_c or tables.nec_terminal_column_c(size, rated_current_a)
    terminal_a = _terminal_a(size, material, terminal_c, before_2011)
    device = tables.nec_largest_device_a(size, material)
    notes = [f"the small-conductor rule allows a device of {device.value:g} A at most"] if device else []
    if before_2011:
        notes.append("ambient and bundling factors are those from 2011 on")
    return Capacity(
        size=size,
        material=material,
        column=f"{column_c} °C",
        table=printed.group.name,
        source=printed.group.source,
        edition="before 2011" if before_2011 else printed.group.edition,
        status=printed.group.status,
        tabulated_a=printed.value,
        parallel=parallel,
        ambient_c=ambient_c,
        ambient_factor=tables.nec_ambient_factor(column_c, ambient_c),
        grouping_factor=tables.nec_bundle_factor(2 * (circuits - 1 + parallel)),
        limit_c=float(column_c),
        terminal_a=None if terminal_a is None else terminal_a * parallel,
        terminal_c=None if terminal_a is None else terminal_c,
        largest_device_a=None if device is None else device.value,
        notes=tuple(notes),
    )


def _terminal_a(size: str, material: str, column_c: int, before_2011: bool) -> float | None:
    """One conductor's figure in the terminations' column; ``None`` where the table leaves it blank. [A]"""
    if size in ("18 AWG", "16 AWG"):
        return None
    return tables.nec_ampacity(size, material, column_c, before_2011=before_2011).value


def _count(circuits: int, parallel: int) -> None:
    require(circuits, circuits >= 1, "the number of circuits together must be 1 or more", "")
    require(parallel, parallel >= 1, "the number of parallel conductors must be 1 or more", "")
