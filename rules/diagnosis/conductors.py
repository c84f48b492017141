"""Other conductors that may lie in the place of the recorded one: a smaller or larger size, another metal."""

from __future__ import annotations

from functools import lru_cache

from rules.tables.conductors import alpha_20c, area_mm2, ladder, next_smaller, resistance_20c_ohm_per_m

ALTERNATIVES = (
    "one size smaller",
    "two sizes smaller",
    "copper-clad aluminium",
    "aluminium",
    "one size larger",
    "two sizes larger",
)
"""In the order of the figures that ``alternatives`` gives."""

COPPER = ("copper", "tinned copper")


def alternatives(size: str, material: str, stranding: str, temperature_c: float) -> tuple[float, ...]:
    """
    Resistance of each of ``ALTERNATIVES`` over that of the recorded conductor; 0 where there is none.

    Sizes step along the ladder of the record's standard. Another metal is looked for only in the place of copper:
    aluminium and copper-clad aluminium differ by less than the doubt of any cable.

    Examples
    --------
    >>> [round(ratio, 3) for ratio in alternatives("2.5 mm2", "copper", "stranded", 20.0)]
    [1.633, 2.443, 1.613, 1.639, 0.622, 0.416]
    >>> alternatives("0.5 mm2", "aluminium", "stranded", 20.0)[:4]
    (0.0, 0.0, 0.0, 0.0)
    """
    sizes, metals = _at_20c(size, material, stranding)
    own = 1 + alpha_20c(material) * (temperature_c - 20)
    warmed = tuple(ratio * (1 + alpha * (temperature_c - 20)) / own for ratio, alpha in metals)
    return (*sizes[:2], *warmed, *sizes[2:])


@lru_cache(maxsize=1024)
def _at_20c(
    size: str, material: str, stranding: str
) -> tuple[tuple[float, ...], tuple[tuple[float, float], tuple[float, float]]]:
    """Ratios at 20 °C: of the other sizes, and of the other metals with their temperature coefficients."""
    own = resistance_20c_ohm_per_m(size, material, stranding)
    larger = [step for step in ladder(size) if area_mm2(step) > area_mm2(size)]
    steps = (next_smaller(size), next_smaller(size, 2), *larger[:2], *(None,) * (2 - len(larger[:2])))
    sizes = tuple(0.0 if step is None else resistance_20c_ohm_per_m(step, material, stranding) / own for step in steps)
    clad, aluminium = (
        (resistance_20c_ohm_per_m(size, metal, stranding) / own if material in COPPER else 0.0, alpha_20c(metal))
        for metal in ("copper-clad aluminium", "aluminium")
    )
    return sizes, (clad, aluminium)
