"""
Resistance, area and order of conductor sizes: what the record's ``size`` stands for.

Sizes are canonical texts, as ``rules.units.parse_size`` writes them. AWG and kcmil sizes follow from the
circular-mil area and the metal's resistivity, stranded and flexible ones with 2 % for lay; metric sizes have
IEC 60228's own figures, class 1 solid, class 2 stranded, class 5 flexible. Where the standard has no figure
for a metal, copper's is scaled by resistivity: copper-clad aluminium throughout, aluminium below 10 mm² and
flexible, solid tinned copper above 16 mm². Solid copper of 500 and 630 mm², which it lacks, has class 2's.
"""

from __future__ import annotations

from functools import cache

from rules.errors import UnknownSize
from rules.tables import awg
from rules.tables.loader import group

METALS = ("copper", "tinned copper", "aluminium", "copper-clad aluminium")
"""Metals that the tables know, as a record names them."""

_IEC: dict[str, dict[str, tuple[str, ...]]] = {
    "solid": {
        "copper": ("iec_class1",),
        "tinned copper": ("iec_class1",),
        "aluminium": ("iec_class1",),
    },
    "stranded": {
        "copper": ("iec_class2_copper",),
        "tinned copper": ("iec_class2_copper",),
        "aluminium": ("iec_class2_aluminium", "iec_class2_aluminium_large"),
    },
    "flexible": {
        "copper": ("iec_class5_copper_small", "iec_class5_copper"),
        "tinned copper": ("iec_class5_copper_small", "iec_class5_copper"),
    },
}
"""Groups with a metal's figures, by stranding."""

_IEC_COLUMN = {"copper": "copper_plain", "tinned copper": "copper_metal_coated", "aluminium": "aluminium"}

_STANDARDS = {"AWG": "AWG", "kcmil": "kcmil", "mm2": "IEC 60228"}


def resistance_20c_ohm_per_m(size: str, material: str = "copper", stranding: str = "stranded") -> float:
    """
    Resistance of one conductor at 20 °C.

    Parameters
    ----------
    size : str
        Canonical size text, for example ``12 AWG``, ``250 kcmil``, ``2.5 mm2``.
    material : str
        copper, tinned copper, aluminium or copper-clad aluminium.
    stranding : str
        solid, stranded or flexible.

    Returns
    -------
    float
        Nominal for AWG and kcmil, the standard's maximum for metric sizes. [Ω/m]

    Raises
    ------
    UnknownSize
        If no table has the size, the metal or the stranding; its neighbours are named.

    References
    ----------
    ASTM B258; IEC 60228:2004 Tables 1 to 3; IEC 60028:1925. Lay: NEC Chapter 9 Table 8.

    Examples
    --------
    >>> round(1000 * resistance_20c_ohm_per_m("2.5 mm2"), 2), round(1000 * resistance_20c_ohm_per_m("12 AWG"), 3)
    (7.41, 5.315)
    """
    return _resistance(size, material, stranding)


def alpha_20c(material: str) -> float:
    """
    Temperature coefficient of resistance at 20 °C. [1/K]

    >>> alpha_20c("copper")
    0.00393

    Raises ``UnknownSize`` for a metal that no table has.
    """
    return _metal(material)[1]


def resistivity_20c(material: str) -> float:
    """
    Resistivity at 20 °C. [Ω m]

    >>> round(1 / resistivity_20c("copper") / 1e6, 6)
    58.0

    Raises ``UnknownSize`` for a metal that no table has.
    """
    return _metal(material)[0]


def area_mm2(size: str) -> float:
    """
    Nominal cross-sectional area of the metal. [mm²]

    >>> round(area_mm2("250 kcmil"), 2), area_mm2("2.5 mm2")
    (126.68, 2.5)

    Raises ``UnknownSize`` if no table has the size.
    """
    area = _areas().get(size)
    if area is None:
        raise _unknown(size)
    return area


def is_known(size: str) -> bool:
    """
    Whether a table has the size.

    >>> is_known("2.5 mm2"), is_known("3 mm2"), is_known("12awg")
    (True, False, False)
    """
    return size in _areas()


def neighbours(size: str) -> tuple[str, ...]:
    """
    The next smaller and the next larger known size of the same standard, as far as there are any.

    >>> neighbours("3 mm2"), neighbours("31 AWG"), neighbours("12 AWG"), neighbours("round")
    (('2.5 mm2', '4 mm2'), ('30 AWG',), ('13 AWG', '11 AWG'), ())
    """
    area = _area_by_text(size)
    if area is None:
        return ()
    known = [other for other in _areas() if _standard(other) == _standard(size) and other != size]
    smaller = [other for other in known if _areas()[other] < area]
    larger = [other for other in known if _areas()[other] > area]
    return (*smaller[-1:], *larger[:1])


def ladder(size: str) -> tuple[str, ...]:
    """
    The trade sizes among which a size may have been mistaken, smallest first: metric or American.

    >>> ladder("12 AWG")[:3], ladder("250 kcmil")[-1], ladder("3 mm2")[0]
    (('24 AWG', '22 AWG', '20 AWG'), '4/0 AWG', '0.5 mm2')
    """
    return _ladder("ladder_mm2" if _standard(size) == "mm2" else "ladder_awg")


def next_smaller(size: str, steps: int = 1) -> str | None:
    """
    The size some steps down its ladder, ``None`` where none is left; the size itself may lie beside the ladder.

    >>> next_smaller("2.5 mm2"), next_smaller("3 AWG"), next_smaller("2.5 mm2", 2), next_smaller("0.75 mm2", 2)
    ('1.5 mm2', '4 AWG', '1 mm2', None)

    Raises ``UnknownSize`` if no table has the size.
    """
    area = area_mm2(size)
    smaller = [step for step in ladder(size) if area_mm2(step) < area]
    return smaller[-steps] if 1 <= steps <= len(smaller) else None


@cache
def _resistance(size: str, material: str, stranding: str) -> float:
    """Cached: a site of 100,000 circuits asks some hundred different ones."""
    area = area_mm2(size)
    resistivity = resistivity_20c(material)
    if stranding not in _IEC:
        raise UnknownSize(f"no table has {stranding!r} conductors; accepted are {', '.join(_IEC)}")
    if _standard(size) != "mm2":
        lay = 1.0 if stranding == "solid" else group("lay").value("factor")
        return resistivity / (area * 1e-6) * lay
    own = _iec(stranding, material).get(area)
    if own is not None:
        return own / 1000
    copper = _iec(stranding, "copper").get(area) or _iec("stranded", "copper")[area]
    return copper / 1000 * resistivity / resistivity_20c("copper")


@cache
def _iec(stranding: str, material: str) -> dict[float, float]:
    """Area [mm²] → largest resistance at 20 °C [Ω/km]; empty where the standard has no such conductor."""
    figures: dict[float, float] = {}
    for name in _IEC[stranding].get(material, ()):
        figures |= group(name).numbers("size_mm2", _IEC_COLUMN[material])
    return figures


@cache
def _ladder(name: str) -> tuple[str, ...]:
    return tuple(str(size) for size in group(name).column("size"))


@cache
def _metal(material: str) -> tuple[float, float]:
    """Resistivity [Ω m] and temperature coefficient [1/K] at 20 °C."""
    if material not in METALS:
        raise UnknownSize(f"no table has the metal {material!r}; accepted are {', '.join(METALS)}")
    metal = group("metal_" + material.replace(" ", "_").replace("-", "_"))
    return metal.value("resistivity_20c_ohm_m"), metal.value("alpha_20c_per_k")


@cache
def _areas() -> dict[str, float]:
    """Area [mm²] of every known size, rising within each standard."""
    sizes = {name: area for name, _, _, area in awg.rows()}
    for kcmil in group("kcmil").numbers("kcmil", "kcmil") | group("kcmil_large").numbers("kcmil", "kcmil"):
        sizes[f"{kcmil:g} kcmil"] = kcmil * 1000 * awg.SQUARE_MM_PER_CIRCULAR_MIL
    for area in _iec("stranded", "copper"):
        sizes[f"{area:g} mm2"] = area
    return sizes


def _standard(size: str) -> str:
    return size.rpartition(" ")[2]


def _area_by_text(size: str) -> float | None:
    """The area that a size text says, in a table or not; ``None`` where it says none. [mm²]"""
    number, _, unit = size.rpartition(" ")
    try:
        if unit == "AWG":
            return awg.area_mm2(awg.number(size))
        return float(number) * {"kcmil": 1000 * awg.SQUARE_MM_PER_CIRCULAR_MIL, "mm2": 1.0}[unit]
    except (UnknownSize, ValueError, KeyError):
        return None


def _unknown(size: str) -> UnknownSize:
    near = neighbours(size)
    if not near:
        return UnknownSize(
            f"no table has the size {size!r}; accepted are 30 to 4/0 AWG, 250 to 2000 kcmil and 0.5 to 630 mm2"
        )
    return UnknownSize(f"{_STANDARDS[_standard(size)]} has no size {size!r}; next to it {_are(near)}")


def _are(near: tuple[str, ...]) -> str:
    return f"is {near[0]}" if len(near) == 1 else f"are {' and '.join(near)}"
