"""
Drop of two-core copper cables against the d.c. columns of BS 7671 Appendix 4.

Tables 4D1B (70 °C) and 4E1B (90 °C) are from memory, except 10 mm² at 70 °C, which a worked example confirms.
Left out are 1, 70, 120, 150 and 185 mm²: their printed figures do not come from the maxima of IEC 60228:2004.
The rest must agree within one step of the print: not every cell is rounded to the nearest step (7.37 is
printed 7.3).
"""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from rules.calc.conductor import loop_resistance_ohm
from rules.tables.conductors import alpha_20c, resistance_20c_ohm_per_m

TABLES = tomllib.loads((Path(__file__).parent / "data" / "bs7671.toml").read_text(encoding="utf-8"))
LEFT_OUT = TABLES["dc_70C"]["not_from_iec60228_mm2"]
CELLS = [
    (temperature_c, *row)
    for name, temperature_c in (("dc_70C", 70.0), ("dc_90C", 90.0))
    for row in TABLES[name]["rows"]
    if row[0] not in LEFT_OUT
]


def millivolt_per_ampere_and_metre(mm2: float, temperature_c: float) -> float:
    r20 = resistance_20c_ohm_per_m(f"{mm2:g} mm2")
    return 1000 * float(loop_resistance_ohm(1.0, temperature_c, r20, alpha_20c("copper"), r20, alpha_20c("copper")))


@pytest.mark.parametrize(("temperature_c", "mm2", "printed", "step"), CELLS)
def test_dc_columns(temperature_c: float, mm2: float, printed: float, step: float) -> None:
    assert millivolt_per_ampere_and_metre(mm2, temperature_c) == pytest.approx(printed, abs=step)


def test_a_worked_example_uses_the_same_figure_for_10_mm2() -> None:
    """Basic Electrical Installation Work (read): 4.4 mV/A/m."""
    assert millivolt_per_ampere_and_metre(10.0, 70.0) == pytest.approx(TABLES["uk_10mm2"]["mV_A_m"], abs=0.05)


def test_the_cells_left_out_miss_by_more_than_their_rounding() -> None:
    """So that nothing is left out without need."""
    for mm2, printed, step in TABLES["dc_70C"]["rows"]:
        if mm2 in LEFT_OUT:
            assert abs(millivolt_per_ampere_and_metre(mm2, 70.0) - printed) > step / 2
