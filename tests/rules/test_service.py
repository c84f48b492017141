"""Runs in service at design, beside the circuit."""

from __future__ import annotations

from dataclasses import replace

import pytest

from rules import limits
from rules.assess import assess
from rules.assessment import RunService
from rules.record import Circuit, Feed, Load, Run, Site, Source

SITE = Site(
    name="hut",
    nominal_voltage_v=24.0,
    ambient_temperature_c=24.0,
    sources=(Source(id="s", tag="S", kind="power supply", nominal_voltage_v=24.0),),
    circuits=(
        Circuit(id="c", tag="C1", fed_from=Feed("sources", "s"), device="fuse gG", rated_current_a=20.0),
    ),
    runs=(
        Run(
            id="r1", circuit_id="c", number=1, from_point="way", to_point="p1", one_way_length_m=10.0, size="4 mm2",
            insulation="PVC", method="C", grouped=1, conductor_temperature_c=24.0,
        ),
        Run(
            id="r2", circuit_id="c", number=2, from_point="p1", to_point="p2", one_way_length_m=5.0, size="14 AWG",
            insulation="XLPE", grouped=1, conductor_temperature_c=24.0,
        ),
    ),
    loads=(
        Load(id="l1", circuit_id="c", point="p1", tag="fan", current_a=9.0),
        Load(id="l2", circuit_id="c", point="p2", tag="lamp", current_a=9.0),
    ),
)  # fmt: skip


def service(site: Site) -> tuple[RunService, ...]:
    return assess(site, limits.of(site)).circuits[0].service


def test_each_run_at_its_own_current() -> None:
    """18 A in 36 A of PVC: 24 + 40 × 0.25 = 34 °C. 9 A in 25 A of 90 °C: 24 + 60 × 0.1296 = 31.8 °C; terminals 15 A."""
    first, second = service(SITE)
    assert first.current is not None
    assert first.ampacity is not None
    assert first.temperature is not None
    assert second.ampacity is not None
    assert second.temperature is not None
    assert (first.run, first.current.value) == ("run 1", 18.0)
    assert first.ampacity.value == pytest.approx(36 * 1.06)
    assert first.temperature.value == pytest.approx(34.0)
    assert first.temperature.u == 8
    assert first.basis == "PVC, method C; IEC 60364-5-52 Table B.52.2, edition 2009, verified"
    assert second.ampacity.value == 15.0
    assert second.temperature.value == pytest.approx(24 + 60 * (9 / 25) ** 2)
    assert (first.gap, second.gap, first.assumed, second.assumed) == ("", "", (), ())


def test_it_moves_neither_design_nor_drop() -> None:
    cool = assess(SITE, limits.of(SITE)).circuits[0]
    run = replace(SITE.runs[0], insulation="XLPE", method="E", grouped=9)
    other = replace(SITE, runs=(run, SITE.runs[1]))
    warm = assess(other, limits.of(other)).circuits[0]
    assert warm.service != cool.service
    assert (warm.points, warm.design_drop) == (cool.points, cool.design_drop)


def test_too_much_current_is_no_forecast_of_a_temperature() -> None:
    site = replace(SITE, loads=(replace(SITE.loads[0], current_a=60.0), SITE.loads[1]))
    first = service(site)[0]
    assert first.temperature is None
    assert first.gap == "above the 70 °C that the insulation stands"


def test_what_is_not_known_is_said() -> None:
    site = replace(SITE, loads=(replace(SITE.loads[0], current_a=None), SITE.loads[1]))
    first, second = service(site)
    assert (first.current, first.temperature, first.gap) == (None, None, "the current at design is not known")
    assert first.ampacity is not None
    assert second.temperature is not None
    buried = replace(SITE, runs=(replace(SITE.runs[0], method="D"), SITE.runs[1]))
    assert "no table held here has method 'D'" in service(buried)[0].gap
    assert service(buried)[0].ampacity is None


@pytest.mark.parametrize(
    ("run", "said"),
    [
        (replace(SITE.runs[0], grouped=-3), "the number of circuits together must be 1 or more, got -3"),
        (replace(SITE.runs[0], insulation="paper"), "no capacity for copper in paper insulation"),
    ],
)
def test_a_record_that_cannot_be_is_shown_and_does_not_stop_the_rest(run: Run, said: str) -> None:
    first, second = service(replace(SITE, runs=(run, SITE.runs[1])))
    assert said in first.gap
    assert second.ampacity is not None
