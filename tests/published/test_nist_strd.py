"""
Straight lines against NIST's Statistical Reference Datasets: Norris (with an intercept), NoInt1 and NoInt2 (without).

The data and certified values beside this file were read in a reprint. Every certified value is computed here anew in
exact fractions, so that a slip of either would show; then the program's fit is held against it.
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Sequence
from decimal import Decimal, localcontext
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest

from rules.calc.straight_line import fit
from rules.errors import InvalidQuantity

DATA = tomllib.loads((Path(__file__).parent / "data" / "nist_strd.toml").read_text(encoding="utf-8"))
NORRIS, NOINT1 = DATA["norris"], DATA["noint1"]
NOINT2 = DATA["noint2_data"] | DATA["noint2"]
DIGITS = 15
"""So many significant digits are certified."""


def exact(values: Sequence[float]) -> list[Fraction]:
    """Decimal numbers as printed, not as the nearest float."""
    return [Fraction(str(value)) for value in values]


def root(value: Fraction) -> Decimal:
    with localcontext() as context:
        context.prec = 40
        return (Decimal(value.numerator) / Decimal(value.denominator)).sqrt()


def certified(x: Sequence[float], y: Sequence[float], intercept: bool) -> dict[str, Fraction | Decimal]:
    """Everything that NIST certifies of a line, in exact fractions and their roots."""
    xs, ys, n, zero = exact(x), exact(y), len(x), Fraction(0)
    middle_x, middle_y = (sum(xs, zero) / n, sum(ys, zero) / n) if intercept else (zero, zero)
    square = sum(((a - middle_x) ** 2 for a in xs), zero)
    b1 = sum(((a - middle_x) * (b - middle_y) for a, b in zip(xs, ys, strict=True)), zero) / square
    b0 = middle_y - b1 * middle_x
    residual = sum(((b - b0 - b1 * a) ** 2 for a, b in zip(xs, ys, strict=True)), zero)
    total, freedom = sum(((b - middle_y) ** 2 for b in ys), zero), n - 1 - intercept
    spread = residual / freedom
    found: dict[str, Fraction | Decimal] = {
        "B1": b1, "sd_B1": root(spread / square), "residual_sd": root(spread), "R2": 1 - residual / total,
        "ss_regression": total - residual, "ss_residual": residual, "df_residual": Fraction(freedom),
        "F": (total - residual) / spread,
    }  # fmt: skip
    if intercept:
        found |= {"B0": b0, "sd_B0": root(spread * (Fraction(1, n) + middle_x**2 / square))}
    return found


def digits(value: Fraction | Decimal) -> str:
    """As many digits as are certified."""
    with localcontext() as context:
        context.prec = 40
        whole = value if isinstance(value, Decimal) else Decimal(value.numerator) / Decimal(value.denominator)
        return f"{whole:.{DIGITS - 1}e}"


@pytest.mark.parametrize(("name", "intercept"), [("norris", True), ("noint1", False), ("noint2", False)])
def test_every_certified_value_follows_exactly_from_the_data(name: str, intercept: bool) -> None:
    rows: dict[str, Any] = {"norris": NORRIS, "noint1": NOINT1, "noint2": NOINT2}[name]
    found = certified(rows["x"], rows["y"], intercept)
    assert len(rows["x"]) == {"norris": 36, "noint1": 11, "noint2": 3}[name]
    for key, value in found.items():
        assert f"{Decimal(str(rows[key])):.{DIGITS - 1}e}" == digits(value), key


def test_norris_is_fitted_to_its_certified_values() -> None:
    line = fit(NORRIS["x"], NORRIS["y"])
    assert line.slope == pytest.approx(NORRIS["B1"], rel=1e-13)
    assert line.intercept == pytest.approx(NORRIS["B0"], rel=1e-11)
    assert line.slope_u == pytest.approx(NORRIS["sd_B1"], rel=1e-11)
    assert line.intercept_u == pytest.approx(NORRIS["sd_B0"], rel=1e-11)
    assert line.residual_sd == pytest.approx(NORRIS["residual_sd"], rel=1e-11)
    assert line.freedom == NORRIS["df_residual"]


@pytest.mark.parametrize("rows", [NOINT1, NOINT2], ids=["NoInt1", "NoInt2"])
def test_lines_through_the_origin_are_fitted_to_their_certified_values(rows: dict[str, Any]) -> None:
    line = fit(rows["x"], rows["y"], through_origin=True)
    assert line.slope == pytest.approx(rows["B1"], rel=1e-13)
    assert line.slope_u == pytest.approx(rows["sd_B1"], rel=1e-12)
    assert line.residual_sd == pytest.approx(rows["residual_sd"], rel=1e-12)
    assert (line.intercept, line.intercept_u, line.freedom) == (0.0, 0.0, rows["df_residual"])


def test_two_points_leave_no_scatter_to_judge_by() -> None:
    line = fit([2.0, 6.0], [0.58, 0.74])
    assert (line.slope, line.intercept) == pytest.approx((0.04, 0.5))
    assert math.isnan(line.slope_u)


@pytest.mark.parametrize(("x", "y"), [([1.0], [2.0]), ([1.0, 1.0], [2.0, 3.0]), ([1.0, 2.0], [2.0])])
def test_what_is_no_line_is_refused(x: list[float], y: list[float]) -> None:
    with pytest.raises(InvalidQuantity, match="a line takes"):
        fit(x, y)
