"""The JSON object: the schema holds every output, and nothing that is not known is written as a number."""

from __future__ import annotations

import json
from dataclasses import replace
from typing import Any

import pytest
from jsonschema import Draft202012Validator

from audit.report.as_json import as_json, as_text, schema
from audit.report.content import AUDIENCES, content_of
from audit.report.json import document
from rules.assessment import Assessment, Place, Severity, Status
from rules.record import Figure, Site

NAN, INFINITY = float("nan"), float("inf")


@pytest.fixture(scope="module")
def validator() -> Draft202012Validator:
    """The packaged schema, itself checked."""
    Draft202012Validator.check_schema(schema())
    return Draft202012Validator(schema())


def causes_sum_to_one(output: dict[str, Any]) -> bool:
    """What the schema cannot say: the probabilities of a circuit sum to 1 where there are any."""
    return all(
        abs(sum(cause["probability"] for cause in circuit["causes"]) - 1) < 1e-9
        for circuit in output["circuits"]
        if circuit["causes"]
    )


def test_output_without_causes_is_valid(validator: Draft202012Validator, assessment: Assessment) -> None:
    output = as_json(assessment)
    validator.validate(output)
    assert causes_sum_to_one(output)
    assert all(circuit["causes"] == [] and "next_reading" not in circuit for circuit in output["circuits"])


def test_output_with_everything_filled_is_valid(validator: Draft202012Validator, with_causes: Assessment) -> None:
    output = as_json(with_causes)
    validator.validate(output)
    assert causes_sum_to_one(output)
    first = output["circuits"][0]
    assert first["causes"][0]["extra_resistance"] == {"value": 0.155, "low": 0.151, "high": 0.159, "unit": "ohm"}
    assert "extra_resistance" not in first["causes"][1]
    assert first["next_reading"]["current_at_least"] == {"value": 4.0, "unit": "A"}
    assert "to" not in first["next_reading"]
    assert "lowest" not in first["points"][0]


@pytest.mark.parametrize("audience", AUDIENCES)
def test_report_is_valid(validator: Draft202012Validator, site: Site, with_causes: Assessment, audience: str) -> None:
    output = document(content_of(site, with_causes, audience, "2026-03-05 10:00"))
    validator.validate(output)
    assert {key: value for key, value in output.items() if key != "report"} == as_json(with_causes)
    assert output["report"]["for"] == audience


@pytest.mark.parametrize("audience", AUDIENCES)
def test_hostile_report_is_valid_and_free_of_control_codes(
    validator: Draft202012Validator, hostile_site: Site, hostile_assessment: Assessment, audience: str
) -> None:
    text = as_text(document(content_of(hostile_site, hostile_assessment, audience)))
    validator.validate(json.loads(text))
    assert not [c for c in text if (ord(c) < 32 and c != "\n") or 0x7F <= ord(c) < 0xA0 or c in "\u202e\u202c"]


def test_keys_keep_the_formats_order(with_causes: Assessment) -> None:
    output = as_json(with_causes)
    assert list(output) == [
        "schema",
        "program",
        "site",
        "summary",
        "circuits",
        "findings",
        "not_judged",
        "rule_changes",
    ]
    assert list(output["summary"]) == ["circuits", "sound", "watch", "act", "measure", "incomplete"]
    assert list(output["circuits"][0]) == [
        "circuit", "visit", "status", "drop", "causes", "points", "next_reading",
    ]  # fmt: skip
    assert list(output["circuits"][0]["drop"]["measured"]) == ["value", "u", "unit"]
    assert list(output["findings"][0]) == [
        "id", "rule", "circuit", "board", "where", "severity", "cause", "title", "why", "consequences", "numbers",
        "remedy", "caution", "source",
    ]  # fmt: skip


@pytest.mark.parametrize("bad", [NAN, INFINITY, -INFINITY])
def test_a_figure_that_is_not_finite_is_left_out(
    validator: Draft202012Validator, with_causes: Assessment, bad: float
) -> None:
    first = with_causes.circuits[0]
    assert first.drop is not None
    circuits = (
        replace(first, drop=replace(first.drop, excess=Figure(bad, "V")), causes=(Place("as recorded", "", bad),)),
        replace(first, drop=replace(first.drop, excess=Figure(1.0, "V", bad)), points=()),
    )
    finding = replace(with_causes.findings[0], numbers={"heat": Figure(bad, "W"), "drop": Figure(1.0, "V")})
    output = as_json(replace(with_causes, circuits=circuits, findings=(finding,)))
    validator.validate(json.loads(as_text(output)))
    assert "drop" not in output["circuits"][0]
    assert output["circuits"][0]["causes"] == []
    assert output["circuits"][1]["drop"]["excess"] == {"value": 1.0, "unit": "V"}
    assert output["findings"][0]["numbers"] == {"drop": {"value": 1.0, "unit": "V"}}


def test_not_a_number_is_never_written() -> None:
    with pytest.raises(ValueError, match="not JSON compliant"):
        as_text({"value": NAN})


def test_an_empty_site_is_valid(validator: Draft202012Validator) -> None:
    empty = Assessment("0.1.0", "hut", "general", (), (), ())
    for audience in AUDIENCES:
        validator.validate(document(content_of(Site(name="hut"), empty, audience)))


def _set(document: Any, path: tuple[Any, ...], value: Any) -> None:
    for step in path[:-1]:
        document = document[step]
    document[path[-1]] = value


@pytest.mark.parametrize(
    ("path", "value"),
    [
        (("extra",), 1),
        (("schema",), "ohmwalk.check/2"),
        (("circuits", 0, "status"), "fine"),
        (("circuits", 0, "why"), "more"),
        (("circuits", 0, "causes", 0, "cause"), "gremlins"),
        (("circuits", 0, "causes", 0, "probability"), 1.2),
        (("circuits", 0, "drop", "measured", "unit"), "mV"),
        (("circuits", 0, "drop", "measured", "u"), -0.1),
        (("circuits", 0, "next_reading", "what"), "guess"),
        (("findings", 0, "severity"), "bad"),
        (("findings", 0, "cause"), "gremlins"),
        (("findings", 1, "numbers", "share", "value"), "many"),
    ],
)
def test_the_schema_refuses(
    validator: Draft202012Validator, with_causes: Assessment, path: tuple[Any, ...], value: Any
) -> None:
    output = json.loads(as_text(as_json(with_causes)))
    assert validator.is_valid(output)
    _set(output, path, value)
    assert not validator.is_valid(output)


def test_the_schema_knows_every_status_and_severity() -> None:
    definitions = schema()["$defs"]
    assert definitions["status"]["enum"] == [str(status) for status in Status]
    assert definitions["severity"]["enum"] == [str(severity) for severity in Severity]
