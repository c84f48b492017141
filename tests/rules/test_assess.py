"""The one pure function at the centre."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from importlib.resources import as_file

import pytest

from audit.intake.folder import read_folder, site_of
from rules import limits
from rules.assess import assess, assess_circuit, prepare
from rules.assessment import Severity, Status
from rules.record import Site
from sample_sites.catalogue import SAMPLE_SITES, SampleSite


@pytest.fixture(params=SAMPLE_SITES, ids=lambda sample: sample.name)
def sample(request: pytest.FixtureRequest) -> Iterator[Site]:
    wanted: SampleSite = request.param
    with as_file(wanted.folder) as folder:
        yield read_folder(folder)


def test_the_same_record_gives_the_same_answer(sample: Site) -> None:
    assert assess(sample, limits.of(sample)) == assess(sample, limits.of(sample))


def test_one_circuit_alone_agrees_with_the_whole(sample: Site) -> None:
    in_force = limits.of(sample)
    context = prepare(sample, in_force)
    whole = {result.circuit_id: result for result in assess(sample, in_force).circuits}
    assert {circuit.id: assess_circuit(context, circuit) for circuit in sample.circuits} == whole


def test_every_circuit_has_one_status(sample: Site) -> None:
    summary = assess(sample, limits.of(sample)).summary
    assert summary["sound"] >= 5
    assert sum(summary[str(status)] for status in Status) == summary["circuits"] == len(sample.circuits)


def test_the_order_of_rows_changes_no_figure(sample: Site) -> None:
    turned = replace(sample, runs=sample.runs[::-1], loads=sample.loads[::-1], circuits=sample.circuits[::-1])
    before = {r.circuit: r for r in assess(sample, limits.of(sample)).circuits}
    after = {r.circuit: r for r in assess(turned, limits.of(turned)).circuits}
    for tag, result in before.items():
        assert after[tag].status is result.status
        assert {p.point: p.design and pytest.approx(p.design.value) for p in after[tag].points} == {
            p.point: p.design and p.design.value for p in result.points
        }


def test_a_profile_may_lower_a_rule(sample: Site) -> None:
    own = '[rules.VD02]\nseverity = "note"\nreason = "demonstration"\n'
    lowered = replace(sample, limits="ours.toml", own_limits=own)
    found = [f for f in assess(lowered, limits.of(lowered)).findings if f.rule == "VD02"]
    assert found
    assert {f.severity for f in found} == {Severity.NOTE}


def test_an_empty_site_has_nothing_to_say() -> None:
    empty = Site(name="empty")
    assessment = assess(empty, limits.of(empty))
    assert (assessment.circuits, assessment.findings, assessment.not_judged) == ((), (), ())
    assert assessment.cautions


@pytest.mark.parametrize(
    ("kind", "volts", "words"),
    [
        ("battery", 48.0, {"battery"}),
        ("battery", 110.0, {"battery", "60 V", "arc can hold"}),
        ("power supply", 24.0, set()),
        ("pv", 600.0, {"60 V", "arc can hold", "PV string"}),
    ],
)
def test_cautions_follow_what_the_site_holds(kind: str, volts: float, words: set[str]) -> None:
    site = site_of(
        {
            "sources": [{"source": "S", "kind": kind, "nominal": str(volts)}],
            "circuits": [{"circuit": "C1", "fed_from": "S"}],
            "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "", "size": ""}],
        },
        {"name": "x"},
    )
    text = " ".join(assess(site, limits.of(site)).cautions)
    assert {word for word in ("battery", "60 V", "arc can hold", "PV string") if word in text} == words
    assert "local code" in text
