"""
Current-carrying capacity as printed, and the factors that correct it: look-ups, nothing computed.

``iec_…`` are of IEC 60364-5-52 for two loaded conductors, ``nec_…`` of NFPA 70 (NEC). Both are based on 30 °C ambient.
What a table has no figure for raises ``MissingData`` and says so: a capacity is never made up, nor taken
from the next size.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

from rules.errors import MissingData
from rules.tables.loader import Cell, Group, group

REFERENCE_AMBIENT_C = 30.0
"""Ambient temperature that every table of capacity here is based on. [degC]"""

IEC = "IEC 60364-5-52"
NEC = "NFPA 70 Table 310.16"

IEC_METHODS = ("A1", "A2", "B1", "B2", "C", "E")
"""Installation methods that a table is held for; ``rules.tables`` names them in ``ampacity_iec.toml``."""

NEC_COLUMNS_C = (60, 75, 90)
"""Temperatures that the insulation stands. [degC]"""

_METALS = {"copper": "copper", "tinned copper": "copper", "aluminium": "aluminium"}
_NEC_METALS = _METALS | {"copper-clad aluminium": "aluminium"}

_IEC_GROUPS = {
    ("copper", "PVC"): ("iec_pvc_copper", "iec_pvc_copper_e", "pvc_copper_below_1_5"),
    ("copper", "XLPE"): ("iec_xlpe_copper",),
    ("aluminium", "PVC"): ("iec_pvc_aluminium", "iec_pvc_aluminium_more"),
    ("aluminium", "XLPE"): ("iec_xlpe_aluminium",),
}

_NEC_GROUPS = {
    "copper": ("nec_310_16_copper", "nec_310_16_copper_large"),
    "aluminium": ("nec_310_16_aluminium", "nec_310_16_aluminium_large"),
}


@dataclass(frozen=True, slots=True)
class Printed:
    """A figure and the group of data that it stands in."""

    value: float
    group: Group


def limit_c(insulation: str) -> float:
    """
    Temperature that a conductor may have in its insulation, by IEC 60364-5-52. [degC]

    >>> limit_c("PVC"), limit_c("EPR")
    (70.0, 90.0)

    Raises ``MissingData`` for an insulation that the table lacks.
    """
    limit = _numbers(("insulation_limit",), "insulation", "limit_c").get(insulation)
    if limit is None:
        raise MissingData(f"no table has a conductor temperature for the insulation {insulation!r}")
    return limit.value


def iec_ampacity(size: str, material: str, insulation: str, method: str) -> Printed:
    """
    Capacity of one conductor of a two-wire circuit at 30 °C, alone, by IEC 60364-5-52. [A]

    Parameters
    ----------
    size : str
        Canonical size text; only metric sizes have a capacity here.
    material : str
        copper, tinned copper (as copper) or aluminium.
    insulation : str
        PVC, XLPE or EPR (as XLPE).
    method : str
        One of ``IEC_METHODS``.

    Raises
    ------
    MissingData
        If no table held here has the case.

    Examples
    --------
    >>> iec_ampacity("2.5 mm2", "copper", "PVC", "C").value
    27.0
    """
    number, _, unit = size.rpartition(" ")
    if unit != "mm2":
        raise MissingData(f"{IEC} has no capacity for {size}, only for metric sizes")
    metal = _METALS.get(material)
    groups = _IEC_GROUPS.get((metal or "", "XLPE" if insulation == "EPR" else insulation))
    if groups is None:
        raise MissingData(f"{IEC} has no capacity for {material} in {insulation} insulation")
    if method not in IEC_METHODS:
        raise MissingData(f"no table held here has method {method!r} of {IEC}; there are {', '.join(IEC_METHODS)}")
    found = _numbers(groups, "size_mm2", method).get(float(number))
    if found is None:
        raise MissingData(f"{IEC} has no capacity for {material} of {size} in {insulation} by method {method}")
    return found


def iec_ambient_factor(insulation: str, ambient_c: float) -> float:
    """
    Factor for the ambient air; between two rows of the table the hotter one counts.

    >>> iec_ambient_factor("PVC", 35.0), iec_ambient_factor("PVC", 35.1), iec_ambient_factor("XLPE", -5.0)
    (0.94, 0.87, 1.15)

    Raises ``MissingData`` where the ambient is too hot for the insulation.
    """
    column = "XLPE" if insulation == "EPR" else insulation
    factor = _at_least(ambient_c, _numbers(("iec_ambient",), "ambient_up_to_c", column))
    if factor is None:
        raise MissingData(f"{IEC} leaves {insulation}-insulated conductors no capacity at {ambient_c:g} °C ambient")
    return factor


def iec_grouping_factor(circuits: int) -> float:
    """
    Factor for loaded circuits bunched together; between two rows of the table the larger number counts.

    >>> iec_grouping_factor(1), iec_grouping_factor(3), iec_grouping_factor(10)
    (1.0, 0.7, 0.45)

    Raises ``MissingData`` where the table ends.
    """
    factor = _at_least(circuits, _numbers(("iec_grouping",), "circuits_up_to", "factor"))
    if factor is None:
        raise MissingData(f"{IEC} has no factor for {circuits} circuits together")
    return factor


def nec_ampacity(size: str, material: str, column_c: int, *, before_2011: bool = False) -> Printed:
    """
    Ampacity of one of not more than three conductors together at 30 °C, by NFPA 70 Table 310.16. [A]

    Parameters
    ----------
    size : str
        Canonical size text; only AWG and kcmil sizes have an ampacity here.
    material : str
        copper, tinned copper (as copper), aluminium, copper-clad aluminium (as aluminium).
    column_c : int
        One of ``NEC_COLUMNS_C``.
    before_2011 : bool
        By the editions before 2011, in which about a dozen cells were different.

    Raises
    ------
    MissingData
        If the table has no such cell.

    Examples
    --------
    >>> nec_ampacity("1 AWG", "copper", 90).value, nec_ampacity("1 AWG", "copper", 90, before_2011=True).value
    (145.0, 150.0)
    """
    edition = f"{NEC} before 2011" if before_2011 else NEC
    if size.rpartition(" ")[2] == "mm2":
        raise MissingData(f"{edition} has no ampacity for {size}, only for AWG and kcmil sizes")
    metal = _NEC_METALS.get(material)
    if metal is None:
        raise MissingData(f"{edition} has no ampacity for {material}")
    found = _nec(metal, column_c, before_2011).get(size)
    if found is None:
        raise MissingData(f"{edition} has no {column_c} °C ampacity for {material} of {size}")
    return found


def nec_column_c(insulation: str) -> int:
    """
    Column that a recorded insulation is read in, where the profile names none. [degC]

    >>> nec_column_c("PVC"), nec_column_c("XLPE")
    (60, 90)

    Raises ``MissingData`` for an insulation that the table lacks.
    """
    column = _numbers(("nec_insulation",), "insulation", "column_c").get(insulation)
    if column is None:
        raise MissingData(f"{NEC} has no column for the insulation {insulation!r}")
    return int(column.value)


def nec_ambient_factor(column_c: int, ambient_c: float) -> float:
    """
    Factor for the ambient temperature, by bands of 5 K.

    >>> nec_ambient_factor(75, 30.0), nec_ambient_factor(75, 38.0), nec_ambient_factor(60, 4.0)
    (1.0, 0.88, 1.29)

    Raises ``MissingData`` where the ambient is too hot for the column.
    """
    factor = _at_least(ambient_c, _numbers(("nec_ambient",), "ambient_up_to_c", f"c{column_c}"))
    if factor is None:
        raise MissingData(f"{NEC} leaves {column_c} °C conductors no ampacity at {ambient_c:g} °C ambient")
    return factor


def nec_bundle_factor(conductors: int) -> float:
    """
    Factor for current-carrying conductors together: 1 for up to three.

    >>> nec_bundle_factor(2), nec_bundle_factor(4), nec_bundle_factor(60)
    (1.0, 0.8, 0.35)
    """
    shares = group("nec_bundle").numbers("conductors_from", "percent")
    return min((percent / 100 for first, percent in shares.items() if conductors >= first), default=1.0)


def nec_largest_device_a(size: str, material: str) -> Printed | None:
    """
    Largest overcurrent device that the small-conductor rule allows; ``None`` for sizes it does not name. [A]

    >>> nec_largest_device_a("12 AWG", "tinned copper").value
    20.0
    >>> nec_largest_device_a("8 AWG", "copper") is None
    True
    """
    for name in ("nec_240_4_d", "nec_240_4_d_small"):
        for metal in (material, _NEC_METALS.get(material)):
            for row_size, row_metal, device_a in group(name).rows:
                if (row_size, row_metal) == (size, metal) and isinstance(device_a, float):
                    return Printed(device_a, group(name))
    return None


def nec_next_device_a(ampacity_a: float) -> float:
    """
    The smallest standard rating that is not below an ampacity; the ampacity itself above 800 A. [A]

    >>> nec_next_device_a(55.0), nec_next_device_a(60.0), nec_next_device_a(850.0)
    (60.0, 60.0, 850.0)
    """
    ratings = [rating for rating in group("nec_240_6").column("rating_a") if isinstance(rating, float)]
    return min((rating for rating in ratings if rating >= ampacity_a), default=ampacity_a)


def nec_terminal_column_c(size: str, rated_current_a: float | None) -> int:
    """
    Column by which an unmarked termination limits the ampacity; by the size where no rating is known. [degC]

    >>> nec_terminal_column_c("4 AWG", 100.0), nec_terminal_column_c("4 AWG", 125.0)
    (60, 75)
    >>> nec_terminal_column_c("1 AWG", None), nec_terminal_column_c("1/0 AWG", None)
    (60, 75)
    """
    rule = group("nec_110_14_c")
    by_size = size.endswith(" AWG") and "/0" not in size
    small = by_size if rated_current_a is None else rated_current_a <= rule.value("threshold_a")
    return int(rule.value("column_up_to_c" if small else "column_above_c"))


@cache
def _numbers(names: tuple[str, ...], key: str, value: str) -> dict[Cell, Printed]:
    """Two columns of some groups as a mapping, gaps left out; a group may lack the column of values."""
    found: dict[Cell, Printed] = {}
    for name in names:
        table = group(name)
        if value in table.columns:
            pairs = zip(table.column(key), table.column(value), strict=True)
            found |= {cell: Printed(number, table) for cell, number in pairs if isinstance(number, float)}
    return found


@cache
def _nec(metal: str, column_c: int, before_2011: bool) -> dict[Cell, Printed]:
    column = f"c{column_c}"
    groups = _NEC_GROUPS[metal]
    # what is only remembered of the later table says nothing of the earlier one
    found = dict(_numbers(groups[:1] if before_2011 else groups, "size", column))
    if before_2011:
        table = group("nec_310_16_before_2011")
        cells = zip(table.column("metal"), table.column("size"), table.column(column), strict=True)
        found |= {size: Printed(a, table) for of, size, a in cells if of == metal and isinstance(a, float)}
    return found


def _at_least(value: float, by_bound: dict[Cell, Printed]) -> float | None:
    """The figure of the first bound that a value does not pass; ``None`` past the last."""
    bounds = sorted(bound for bound in by_bound if isinstance(bound, float))
    return next((by_bound[bound].value for bound in bounds if value <= bound), None)
