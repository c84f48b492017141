"""Rules on heat, capacity and peaks against what standards and practice print; ``data/maintenance.toml`` says what was seen."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from rules import limits
from rules.calc.device import device_resistance_ohm
from rules.calc.joint_heat import joint_heat_w, rise_at
from rules.calc.network import Network
from rules.calc.newton import Loads
from rules.calc.peak import lowest_at_peak_v
from rules.record import Site
from rules.tables.ampacity import nec_largest_device_a

PRINTED: dict[str, dict[str, Any]] = tomllib.loads(
    (Path(__file__).parent / "data" / "maintenance.toml").read_text(encoding="utf-8")
)
GENERAL = limits.of(Site(name="published"))
OHM_MM2_PER_M = 1 / 58
"""Copper at 20 °C, IEC 60028:1925."""


def test_classes_of_rise_are_those_of_the_table() -> None:
    """Watch from "probable deficiency" on, soon from "major discrepancy" on; over the ambient from "monitor" on."""
    rows = PRINTED["infrared_delta_t"]["rows"]
    by_action = {row[4].partition(",")[0].partition(" until")[0]: row for row in rows}
    assert GENERAL["joint_rise.similar_watch_k"] == by_action["probable deficiency"][0]
    assert GENERAL["joint_rise.similar_soon_k"] == by_action["major discrepancy"][0]
    assert GENERAL["joint_rise.ambient_watch_k"] == by_action["monitor"][2]
    assert GENERAL["joint_rise.ambient_soon_k"] == by_action["major discrepancy"][2]


def test_share_above_the_lowest_similar_is_that_of_the_standard() -> None:
    assert 1 + GENERAL["joint_compare.above_similar"] == PRINTED["contact_resistance"]["multiplier_of_lowest"]


def test_a_comparison_alone_ranks_worse_poles_better() -> None:
    """The trade's own example: the pole that the 50 % calls bad has less resistance than all that it passes."""
    example, factor = PRINTED["contact_resistance"], PRINTED["contact_resistance"]["multiplier_of_lowest"]
    fails, passes = example["fail_micro_ohm"], example["pass_micro_ohm"]
    assert max(fails) > factor * min(fails)
    assert max(passes) <= factor * min(passes)
    assert max(fails) < min(passes)
    more_w = float(joint_heat_w((max(fails) - min(fails)) * 1e-6, 100.0))
    assert more_w < GENERAL["joint_compare.least_w"]  # what the rule asks beside it: nothing at 100 A


def test_glowing_joints_are_soon_and_immediate() -> None:
    (_, least_w), (_, most_w) = PRINTED["glowing_joint"]["rows"]
    assert GENERAL["heat.soon_w"] <= least_w < GENERAL["heat.immediate_w"] <= most_w


def test_a_deteriorated_joint() -> None:
    example = PRINTED["deteriorated_joint"]
    watts = joint_heat_w(example["micro_ohm"][1] * 1e-6, example["current_A"])
    assert watts == pytest.approx(example["printed_W"], abs=0.5)


def test_rise_is_scaled_from_no_less_load_than_is_asked_for() -> None:
    assert GENERAL["joint_scaling.least_share"] == PRINTED["infrared_load"]["least_share"]


def test_practice_scales_a_rise_of_5_k_at_40_percent_to_22_to_31_k() -> None:
    """With powers of 1.6 and 2; from a trade text."""
    scaled = [float(rise_at(5.0, 0.4, 1.0, power)) for power in (1.6, 2.0)]
    assert scaled == pytest.approx([22, 31], abs=0.5)


def test_overload_factor() -> None:
    assert GENERAL["overload.immediate_factor"] == PRINTED["overload"]["factor"]


@pytest.mark.parametrize(("size", "metal", "device_a"), PRINTED["small_conductors"]["rows"])
def test_small_conductor_rule(size: str, metal: str, device_a: float) -> None:
    found = nec_largest_device_a(size, metal)
    assert found is not None
    assert found.value == device_a


@pytest.mark.parametrize(("rated_a", "loss_w"), PRINTED["breaker_loss"]["rows"])
def test_largest_resistance_of_a_pole(rated_a: float, loss_w: float) -> None:
    ohm = device_resistance_ohm("breaker C", rated_a, 1, 1.0)
    assert ohm is not None
    assert joint_heat_w(ohm, rated_a) == pytest.approx(loss_w)


class TestSharedReturn:
    """Six circuits on one return: the network against the sums by hand."""

    example = PRINTED["shared_return"]

    def drop_v(self, on: int) -> float:
        """From the source to the load of the first circuit, with some of the circuits on."""
        count = self.example["circuits"]
        nodes = np.arange(1, count + 1)
        network = Network(np.array([-1] + [0] * count), shared=[nodes])
        out = np.zeros(count + 1)
        out[1:] = self.example["length_m"] * OHM_MM2_PER_M / 1.5
        shared = np.array([self.example["length_m"] * OHM_MM2_PER_M / 2.5])
        legs = network.legs(out, np.zeros(count + 1), shared=shared)
        amps = np.zeros(count + 1)
        amps[1 : on + 1] = self.example["current_A"]
        held = np.zeros(count + 1)
        held[0] = 24.0
        solved = network.solve(legs, Loads(amps, np.zeros(count + 1), np.zeros(count + 1)), held)
        return float(solved.voltage_v[0] - solved.voltage_v[1])

    def test_all_on(self) -> None:
        assert self.drop_v(self.example["circuits"]) == pytest.approx(self.example["all_on_V"], abs=0.005)

    def test_one_on(self) -> None:
        assert self.drop_v(1) == pytest.approx(self.example["one_on_V"], abs=0.005)

    def test_own_loop_as_one_might_take_it(self) -> None:
        own_ohm = 2 * self.example["length_m"] * OHM_MM2_PER_M / 1.5
        assert own_ohm * self.example["current_A"] == pytest.approx(self.example["own_loop_V"], abs=0.005)


def test_a_start_of_five_times_the_current() -> None:
    example = PRINTED["inrush"]
    ohm = example["steady_share"] * 24.0 / 1.0
    assert 24.0 - lowest_at_peak_v(24.0, example["times"] * 1.0, ohm) == pytest.approx(example["dip_share"] * 24.0)
