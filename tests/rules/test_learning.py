"""The site learns: which common error is reported, what each circuit carries of it, and what is left as it is."""

from __future__ import annotations

import importlib.util
import random
import sys
from dataclasses import replace
from functools import cache
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess, assess_circuit, prepare
from rules.assessment import Finding, Severity
from rules.context import Context
from rules.diagnosis.habits import Habit
from rules.diagnosis.hypotheses import AS_RECORDED
from rules.measured import posed_by
from rules.record import Site

CIRCUITS = 40
QUIET = "[habit]\nsource = 'test'\nlearned_at = 1\n"
"""A profile under which nothing is ever sure enough to be learned."""


@cache
def habits() -> ModuleType:
    """``tests/trial/habits.py``: invented sites with a known common error."""
    path = Path(__file__).parent.parent / "trial" / "habits.py"
    spec = importlib.util.spec_from_file_location("habits_trial", path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module  # its dataclasses look their module up
    spec.loader.exec_module(module)
    return module


def drawn(name: str, seed: int = 1, circuits: int = CIRCUITS, **changes: Any) -> dict[str, list[dict[str, str]]]:
    scenario = replace(habits().SCENARIOS[name], **changes)
    tables: dict[str, list[dict[str, str]]] = habits().draw(scenario, seed, circuits).tables
    return tables


def built(tables: dict[str, list[dict[str, str]]], own: str = "") -> Site:
    site = site_of(tables, {"name": "x", "nominal": "48 V", "ambient": "25 degC"})
    return replace(site, limits="ours.toml", own_limits=own) if own else site


def prepared(tables: dict[str, list[dict[str, str]]], own: str = "") -> Context:
    site = built(tables, own)
    return prepare(site, limits.of(site))


@cache
def biased() -> Context:
    """A voltmeter 12 % high on a well surveyed site."""
    return prepared(drawn("voltmeter 12 % high, well surveyed"))


def common(findings: tuple[Finding, ...]) -> list[Finding]:
    return [finding for finding in findings if finding.rule == "HB01"]


def test_a_biased_meter_is_one_finding_instead_of_one_a_circuit() -> None:
    site = built(drawn("voltmeter 12 % high, well surveyed"))
    quiet = "[habit]\nsource = 'test'\nlearned_at = 1\n"
    alone = assess(
        replace(site, limits="ours.toml", own_limits=quiet),
        limits.of(replace(site, limits="ours.toml", own_limits=quiet)),
    )
    taught = assess(site, limits.of(site))
    (found,) = common(taught.findings)
    assert (found.circuit, found.board, found.severity) == (None, None, Severity.WATCH)
    assert found.where == "voltmeter DV-1, visit 1"
    assert found.id == "HB01/site/voltmeter DV-1, visit 1"
    assert found.remedy.startswith("Read one of these circuits with another voltmeter on the same clips")
    assert found.numbers["voltmeter DV-1"].value > 0.9
    assert common(alone.findings) == []
    assert taught.summary["sound"] > alone.summary["sound"] + 5


def test_a_circuit_says_that_it_is_judged_with_a_common_error() -> None:
    context = biased()
    why = [assess_circuit(context, row).why for row in context.site.circuits if row.id in context.common]
    said = [text for text in why if text.startswith("the readings agree with the record")]
    assert len(said) > 5
    assert all("that circuits which share its meters and habits lose alike (HB01)" in text for text in said)


def test_every_circuit_of_the_meter_carries_it_and_no_other() -> None:
    context = biased()
    for circuit in context.site.circuits:
        meters = {reading.instrument for reading in context.measured[circuit.id].readings}
        share = context.common.get(circuit.id)
        assert (share is not None) == ("DV-1" in meters)
        if share is not None:
            assert share.value == pytest.approx(0.12, abs=0.03)
            assert share.u is not None
            assert share.u < 0.02


def test_all_of_an_assessment_is_the_same_for_the_rows_in_another_order() -> None:
    tables = drawn("voltmeter 12 % high, well surveyed")
    shuffled = {name: list(rows) for name, rows in tables.items()}
    for name in ("circuits", "readings", "instruments", "runs"):
        random.Random(7).shuffle(shuffled[name])
    one, other = biased(), prepared(shuffled)
    (first,), (second,) = one.taught.errors, other.taught.errors
    assert [said.habit for said in first.explanations] == [said.habit for said in second.explanations]
    assert [said.probability for said in first.explanations] == pytest.approx(
        [said.probability for said in second.explanations], abs=1e-9
    )
    by_tag = {circuit.tag: other.diagnoses[circuit.id] for circuit in other.site.circuits}
    for circuit in one.site.circuits:
        probability = one.diagnoses[circuit.id].probability(AS_RECORDED)
        assert by_tag[circuit.tag].probability(AS_RECORDED) == pytest.approx(probability, abs=1e-9)


def test_a_healthy_site_is_left_exactly_as_it_is() -> None:
    context = prepared(drawn("healthy"))
    assert context.taught.errors == ()
    assert context.common == {}
    for circuit in context.site.circuits:
        problem = posed_by(context, context.measured[circuit.id])
        assert problem is not None
        assert context.taught.told(circuit.id, problem, ()) is problem


def test_few_circuits_teach_nothing() -> None:
    tables = drawn("voltmeter 12 % high, well surveyed", circuits=4, teams=habits().ONE_TEAM)
    assert prepared(tables).taught.errors == ()
    assert prepared(tables, "[habit]\nsource = 'test'\nleast_circuits = 3\nlearned_at = 0.5\n").taught.errors


def test_what_is_small_is_not_reported() -> None:
    tables = drawn("voltmeter 12 % high, well surveyed")
    assert prepared(tables, "[habit]\nsource = 'test'\nleast_relative = 0.2\n").taught.errors == ()


def test_replaced_readings_teach_nothing() -> None:
    """The biased readings were taken back: what replaced them is right."""
    tables = drawn("voltmeter 12 % high, well surveyed")
    right = drawn("voltmeter 12 % high, well surveyed", voltage={})
    for number, (row, good) in enumerate(zip(list(tables["readings"]), right["readings"], strict=True)):
        row["reading"] = f"R{number}"
        tables["readings"].append(good | {"replaces": f"R{number}", "reason": "meter out of order"})
    assert prepared(tables).taught.errors == ()


def test_each_circuit_teaches_by_the_visit_that_it_is_judged_on() -> None:
    tables = drawn("voltmeter 12 % high, well surveyed")
    right = drawn("voltmeter 12 % high, well surveyed", voltage={})
    later = [row | {"visit": "2"} for row in right["readings"]]
    tables["visits"] = [{"visit": "1", "kind": "as found"}, {"visit": "2", "kind": "periodic"}]
    tables["readings"] += later
    assert prepared(tables).taught.errors == ()
    tables["visits"].reverse()
    (error,) = prepared(tables).taught.errors
    assert error.explanations[0].habit == Habit("voltage", "DV-1", "1")


def test_meters_that_are_not_recorded_teach_nothing_and_are_named() -> None:
    tables = drawn("voltmeter 12 % high, well surveyed")
    tables["instruments"] = [row for row in tables["instruments"] if row["quantity"] != "voltage"]
    for row in tables["readings"]:
        if row["quantity"] == "voltage":
            row["instrument"] = ""
    site = built(tables)
    assessment = assess(site, limits.of(site))
    assert "voltmeter" not in " ".join(finding.why for finding in common(assessment.findings))
    (gap,) = [gap for gap in assessment.not_judged if gap.rule == "HB01"]
    assert (
        gap.why == f"readings of {CIRCUITS} circuits name no instrument that is recorded: what they share is not known"
    )


def carrying(context: Context) -> Any:
    return next(circuit for circuit in context.site.circuits if circuit.id in context.common)


def test_typed_readings_are_told_what_the_others_say() -> None:
    context = biased()
    circuit = carrying(context)
    typed = assess_circuit(context, circuit, context.measured[circuit.id].readings)
    stored = assess_circuit(context, circuit)
    assert [row.probability for row in typed.causes] == pytest.approx([row.probability for row in stored.causes])


def test_a_short_habit_of_lengths_counts_in_the_worst_case_and_a_meter_does_not() -> None:
    """Paced lengths that are short mean more loss at the load; a voltmeter that reads high does not."""
    for name, more in (("paced 15 % short, all paced", True), ("voltmeter 12 % high, well surveyed", False)):
        context = prepared(drawn(name))
        circuit = carrying(context)
        diagnosis = context.diagnoses[circuit.id]
        factors = [known.factor for run_id in diagnosis.run_ids if (known := diagnosis.of_branch(run_id)) is not None]
        assert (min(factors) > 1.08) == more


def test_a_site_that_reads_low_alike_is_not_forty_findings() -> None:
    """A voltmeter that reads a seventh too low: each drop is below the computed one, beyond its own doubt, for one reason."""
    name = "voltmeter 12 % high, well surveyed"
    site = built(drawn(name, voltage={"DV-1": -0.15}))
    quiet = replace(site, limits="ours.toml", own_limits=QUIET)
    low, taught = (
        [finding for finding in assess(one, limits.of(one)).findings if finding.rule == "VD05"] for one in (quiet, site)
    )
    assert len(low) > 8
    assert len(taught) <= 1
