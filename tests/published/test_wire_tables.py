"""
American sizes against printed wire tables.

``data/wire_tables.toml`` names each source. The 20 °C table, diameters and the common columns of NEC Chapter 9 Table 8
were read (second-hand); the whole of Table 8 with its solid and coated lines is from memory.
"""

from __future__ import annotations

import math
import tomllib
from pathlib import Path

import pytest

from rules.calc.conductor import at_temperature
from rules.tables import awg
from rules.tables.conductors import alpha_20c, area_mm2, resistance_20c_ohm_per_m

TABLES = tomllib.loads((Path(__file__).parent / "data" / "wire_tables.toml").read_text(encoding="utf-8"))
METRES_IN_1000_FT = 304.8


def ohm_per_kft(size: str, metal: str, stranding: str, temperature_c: float) -> float:
    r20 = METRES_IN_1000_FT * resistance_20c_ohm_per_m(size, metal, stranding)
    return float(at_temperature(r20, alpha_20c(metal), temperature_c))


def table_8_tolerance(printed: float, stranding: str) -> float:
    """
    What the print of Table 8 allows: one unit of its third digit for a solid wire; half of one plus 0.5 % for
    a stranded one, since its lines hold a lay of 1.8 to 2.5 % where we have 2 %.
    """
    unit = float(10.0 ** (math.floor(math.log10(printed)) - 2))
    return unit if stranding == "solid" else unit / 2 + 0.005 * printed


def nec_size(text: str) -> str:
    return f"{text} kcmil" if text.isdigit() and int(text) >= 250 else f"{text} AWG"


@pytest.mark.parametrize(("number", "printed"), TABLES["solid_copper_20C_table"]["rows"])
def test_solid_copper_at_20_c(number: int, printed: float) -> None:
    """
    Standard annealed copper wire table, NBS Circular 31 and Handbook 100. Within one unit of its last digit:
    the printed table was itself computed from rounded diameters.
    """
    unit = max(1e-4, 10.0 ** (math.floor(math.log10(printed)) - 3))
    assert ohm_per_kft(awg.name(number), "copper", "solid", 20) == pytest.approx(printed, abs=unit)


@pytest.mark.parametrize(("size", "copper", "aluminium"), TABLES["nec_ch9_table8_stranded_cu_al"]["rows"])
def test_nec_table_8_stranded_at_75_c(size: str, copper: float, aluminium: float) -> None:
    """NFPA 70 Chapter 9 Table 8, uncoated copper and aluminium."""
    for metal, printed in (("copper", copper), ("aluminium", aluminium)):
        ours = ohm_per_kft(nec_size(size), metal, "stranded", 75)
        assert ours == pytest.approx(printed, abs=table_8_tolerance(printed, "stranded")), metal


def test_nec_table_8_16_awg() -> None:
    printed = TABLES["nec_ch9_table8_16awg"]["copper_uncoated"]
    assert ohm_per_kft("16 AWG", "copper", "stranded", 75) == pytest.approx(
        printed, abs=table_8_tolerance(printed, "stranded")
    )


@pytest.mark.parametrize(
    ("size", "strands", "circular_mils", "uncoated", "coated", "aluminium"), TABLES["nec_ch9_table8_full"]["rows"]
)
def test_nec_table_8_from_memory(
    size: str, strands: int, circular_mils: float, uncoated: float, coated: float, aluminium: float
) -> None:
    """All lines, from memory: 18 AWG to 2000 kcmil, solid and stranded. The coated column bounds tinned copper."""
    stranding = "solid" if strands == 1 else "stranded"
    for metal, printed in (("copper", uncoated), ("aluminium", aluminium)):
        ours = ohm_per_kft(nec_size(size), metal, stranding, 75)
        assert ours == pytest.approx(printed, abs=table_8_tolerance(printed, stranding)), metal
    tinned = ohm_per_kft(nec_size(size), "tinned copper", stranding, 75)
    assert uncoated < tinned < coated + table_8_tolerance(coated, stranding)


@pytest.mark.parametrize(("size", "circular_mils"), [(row[0], row[2]) for row in TABLES["nec_ch9_table8_full"]["rows"]])
def test_circular_mils_as_printed(size: str, circular_mils: float) -> None:
    """Size column of Table 8, from memory: three to four digits of what the gauge formula gives."""
    if nec_size(size).endswith("AWG"):
        assert awg.circular_mils(awg.number(nec_size(size))) == pytest.approx(circular_mils, rel=0.003)
    else:
        assert area_mm2(nec_size(size)) == pytest.approx(circular_mils * awg.SQUARE_MM_PER_CIRCULAR_MIL)


@pytest.mark.parametrize("row", TABLES["awg_computed"]["rows"])
def test_gauge_progression_as_computed_outside(row: list[float]) -> None:
    """Every figure of 4/0 to 30 AWG as another hand computed it, within half a unit of the last digit it was written with."""
    number, inches, mm, circular_mils, square_mm, ohm_kft, ohm_km = row[1:]
    size = awg.name(int(number))
    r20 = resistance_20c_ohm_per_m(size, "copper", "solid")
    assert awg.diameter_mm(int(number)) / 25.4 == pytest.approx(inches, abs=0.6e-6)
    assert awg.diameter_mm(int(number)) == pytest.approx(mm, rel=2e-5)
    assert awg.circular_mils(int(number)) == pytest.approx(circular_mils, abs=0.006)
    assert area_mm2(size) == pytest.approx(square_mm, abs=0.6e-5, rel=1e-6)
    assert METRES_IN_1000_FT * r20 == pytest.approx(ohm_kft, rel=5e-5)
    assert 1000 * r20 == pytest.approx(ohm_km, rel=5e-5)


@pytest.mark.parametrize(("number", "inches", "circular_mils"), TABLES["solid_geometry_table"]["rows"])
def test_diameter_and_area_as_reprinted(number: int, inches: float, circular_mils: float) -> None:
    """
    Kuphaldt vol. V, four digits: half a unit of the last for the diameter; a whole one for the area, which was
    printed from rounded diameters.
    """
    unit = 10.0 ** (math.floor(math.log10(circular_mils)) - 3)
    digits = 4 if inches >= 0.1 else 5
    assert awg.diameter_mm(number) / 25.4 == pytest.approx(inches, abs=0.51 * 10.0**-digits)
    assert awg.circular_mils(number) == pytest.approx(circular_mils, abs=unit)


@pytest.mark.parametrize(("size", "circular_mils", "square_mm"), TABLES["nec_ch9_table8_area"]["rows"])
def test_area_of_printed_circular_mils(size: str, circular_mils: float, square_mm: float) -> None:
    """The circular mil, π/4 × (0.001 in)²; a gauge's own area is within 0.3 % of its printed circular mils."""
    assert circular_mils * awg.SQUARE_MM_PER_CIRCULAR_MIL == pytest.approx(square_mm, abs=0.6e-3)
    assert area_mm2(nec_size(size)) == pytest.approx(square_mm, rel=0.003)


def test_temperature_coefficient_at_75_c() -> None:
    """Table 8 prints 0.00323 and 0.00330 at 75 °C (from memory): α75 = α20 / (1 + 55 α20)."""
    printed, model = TABLES["table8_footnote"], TABLES["table8_model"]
    for metal, key in (("copper", "alpha75_copper"), ("aluminium", "alpha75_aluminum")):
        ours = alpha_20c(metal) / float(at_temperature(1.0, alpha_20c(metal), 75.0))
        assert ours == pytest.approx(printed[key], abs=0.5e-5)
        assert ours == pytest.approx(model[key], abs=0.6e-6)
    ratio = resistance_20c_ohm_per_m("4/0 AWG", "copper", "stranded") / resistance_20c_ohm_per_m(
        "4/0 AWG", "copper", "solid"
    )
    assert ratio == pytest.approx(model["lay_factor_stranded"])


@pytest.mark.parametrize(("number", "largest", "circular_mils"), TABLES["faa_tinned_copper_20C"]["rows"])
def test_tinned_copper_lies_below_the_limits_of_aircraft_wire(
    number: int, largest: float, circular_mils: float
) -> None:
    """
    FAA AC 43.13-1B Table 11-9 prints largest values, of wires with their own area: 3 to 22 % above ours for that area. Two
    digits from 8 AWG on let the print itself move by up to half a unit.
    """
    ours = ohm_per_kft(awg.name(number), "tinned copper", "stranded", 20) * awg.circular_mils(number) / circular_mils
    half = 0.005 if number <= 8 else 0.0
    assert ours < largest + half
    assert largest - half < 1.3 * ours
