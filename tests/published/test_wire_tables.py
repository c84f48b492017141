"""
American sizes against printed wire tables.

``data/wire_tables.toml`` names each source. The 20 °C table and the common columns of NEC Chapter 9 Table 8
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
