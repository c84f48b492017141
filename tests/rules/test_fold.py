"""A cause and what follows from it are one finding: what is kept, and what stands on its own."""

from __future__ import annotations

from dataclasses import replace

from audit.intake.folder import site_of
from audit.opening import only
from rules import limits
from rules.assess import assess
from rules.assessment import Finding, Severity, Status
from rules.fold import folded, said
from rules.record import Figure, Site
from rules.rule import catalogue

FINDING = Finding("", "", "C1", None, "", Severity.SOON, None, "title", "why", {}, "Do.", "Care. Isolate.", "source")


def finding(id_: str, *under: str, severity: Severity = Severity.SOON, cause: str | None = None) -> Finding:
    rule, circuit, where = id_.split("/")
    return replace(
        FINDING,
        id=id_,
        rule=rule,
        circuit=circuit,
        where=where,
        under=under,
        severity=severity,
        cause=cause,
        why=f"{where} of {rule}",
        numbers={"drop": Figure(float(where.removeprefix("p")), "V"), "nominal": Figure(24.0, "V")},
        caution=f"{FINDING.caution} Mind {rule}.",
        source=f"book of {rule}",
    )


def test_nothing_is_lost_of_what_goes_under_a_cause() -> None:
    cause = finding("VD01/C1/p1", severity=Severity.WATCH)
    under = replace(finding("VD04/C1/p2", "VD01/C1/p1"), consequences=("it stalls",))
    (whole,) = folded([under, cause])
    assert whole.id == "VD01/C1/p1"
    assert whole.severity is Severity.SOON
    assert whole.consequences == ("p2 of VD04 (VD04); it stalls",)
    assert whole.numbers == {"drop": Figure(1.0, "V"), "nominal": Figure(24.0, "V"), "VD04 drop": Figure(2.0, "V")}
    assert whole.caution == "Care. Isolate. Mind VD01. Mind VD04."
    assert whole.source == "book of VD01; VD04: book of VD04"
    assert whole.holds == (under,)
    assert [one.id for one in said([whole])] == ["VD01/C1/p1", "VD04/C1/p2"]


def test_figures_of_two_of_one_rule_keep_their_places() -> None:
    cause = finding("VD01/C1/p1")
    (whole,) = folded([cause, finding("LV01/C1/p2", cause.id), finding("LV01/C1/p3", cause.id)])
    assert list(whole.numbers) == ["drop", "nominal", "LV01 drop", "LV01 p3: drop"]


def test_what_it_says_as_a_consequence_may_differ() -> None:
    under = replace(finding("VD04/C1/p2", "VD01/C1"), as_consequence="read: 2 V")
    (whole,) = folded([finding("VD01/C1/p1"), under])
    assert whole.consequences == ("read: 2 V (VD04)",)


def test_a_consequence_on_another_circuit_names_it() -> None:
    cause = replace(finding("SR01/S/p1"), circuit=None, board="S", id="SR01/board S/p1")
    (whole,) = folded([cause, finding("LV01/C1/p2", "SR01/board S/p1")])
    assert whole.consequences == ("C1: p2 of LV01 (LV01)",)
    assert "LV01 C1 p2: drop" in whole.numbers


def test_without_its_cause_it_stands_on_its_own() -> None:
    alone = [finding("VD04/C1/p2", "VD01/C1/p1"), finding("VD01/C2/p1"), finding("VD01/C1/p9")]
    assert folded(alone) == alone


def test_the_first_that_stands_is_the_cause() -> None:
    rows = [finding("VD04/C1/p3", "VD02/C1", "VD01/C1"), finding("VD01/C1/p1"), finding("VD02/C1/p2")]
    assert [(row.id, len(row.holds)) for row in folded(rows)] == [("VD01/C1/p1", 0), ("VD02/C1/p2", 1)]


def test_the_cause_of_a_cause_holds_both() -> None:
    rows = [finding("RD07/C1/p1"), finding("VD05/C1/p2", "RD07/C1"), finding("LV01/C1/p3", "VD05/C1")]
    (whole,) = folded(rows)
    assert [row.id for row in whole.holds] == ["VD05/C1/p2", "LV01/C1/p3"]
    assert whole.consequences == ("p2 of VD05 (VD05)", "p3 of LV01 (LV01)")


def test_what_went_under_before_stays_when_more_is_found() -> None:
    first = folded([finding("VD05/C1/p2"), finding("LV01/C1/p3", "VD05/C1")])
    (whole,) = folded([finding("RD07/C1/p1"), *(replace(row, under=("RD07/C1",)) for row in first)])
    assert [row.rule for row in whole.holds] == ["VD05", "LV01"]
    assert whole.consequences == ("p2 of VD05 (VD05); p3 of LV01 (LV01)",)


def test_a_claim_goes_under_the_same_claim_alone() -> None:
    claims = finding("VD05/C1/p2", "RD07/C1", cause="slip")
    assert len(folded([claims, finding("RD07/C1/p1")])) == 2
    assert len(folded([claims, finding("RD07/C1/p1", cause="joint")])) == 2
    (whole,) = folded([claims, finding("RD07/C1/p1", cause="slip")])
    assert whole.cause == "slip"


def test_a_part_of_a_finding_of_the_same_rule_is_not_said_twice() -> None:
    whole, *others = folded([finding("LV02/S/p1", severity=Severity.WATCH), finding("LV02/C1/p2", "LV02/S")])
    assert not others
    assert (whole.consequences, whole.severity, len(whole.holds)) == ((), Severity.SOON, 1)
    assert list(whole.numbers) == ["drop", "nominal"]


def test_what_the_profile_made_less_grave_hides_nothing_graver() -> None:
    lowered = replace(finding("VD02/C1/p1", severity=Severity.NOTE), by_profile=True)
    assert len(folded([lowered, finding("VD04/C1/p2", "VD02/C1")])) == 2
    assert len(folded([lowered, finding("VD04/C1/p2", "VD02/C1", severity=Severity.NOTE)])) == 1


def test_rules_stand_under_rules_that_there_are_and_in_no_circle() -> None:
    under = {rule.id: {name for name in rule.under if name != rule.id} for rule in catalogue()}
    assert {name for names in under.values() for name in names} <= set(under)
    assert sum(bool(names) for names in under.values()) >= 5
    while under:
        free = {rule for rule, names in under.items() if not names & under.keys()}
        assert free, f"a circle of {sorted(under)}"
        under = {rule: names for rule, names in under.items() if rule not in free}


def test_a_cause_that_is_switched_off_holds_nothing() -> None:
    site = undersized()
    (whole,) = assess(site, limits.of(site)).findings[-1:]
    assert (whole.rule, [held.rule for held in whole.holds]) == ("VD01", ["LV01"])
    off = replace(site, limits="ours.toml", own_limits='[rules.VD01]\noff = true\nreason = "told elsewhere"\n')
    assert [row.rule for row in assess(off, limits.of(off)).findings if row.circuit] == ["LV01"]


def test_a_circuit_tells_what_the_site_has_under_its_source() -> None:
    """24 V of a supply stand at 20.1 V; the lock, read at 19.8 V, would have 23.7 V of the 20.4 V that it needs."""
    site = site_of(
        {
            "sources": [{"source": "PS", "kind": "power supply", "nominal": "24", "working": "24", "lowest": "20"}],
            "circuits": [{"circuit": "C1", "fed_from": "PS", "device": "none"}],
            "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "5", "size": "4 mm2"}],
            "loads": [{"circuit": "C1", "point": "p1", "load": "lock", "current": "1", "lowest": "20.4"}],
            "instruments": [
                {"instrument": "M1", "quantity": "voltage", "accuracy": "0.5", "counts": "2", "resolution": "0.01"}
            ],
            "readings": [
                {"board": "PS", "round": "1", "quantity": "voltage", "at": "bus", "value": "20.10", "instrument": "M1"},
                {
                    "circuit": "C1",
                    "round": "1",
                    "quantity": "voltage",
                    "at": "p1",
                    "value": "19.80",
                    "instrument": "M1",
                },
            ],
        },
        {"name": "x"},
    )
    assessment = assess(site, limits.of(site))
    (circuit,) = assessment.circuits
    assert circuit.status is Status.ACT
    assert [row.rule for row in circuit.findings] == ["LV01"]
    assert [row.rule for row in only(assessment, "C1").findings] == ["LV01"]
    assert "LV01" not in {row.rule for row in assessment.findings}
    (sags,) = (row for row in assessment.findings if row.rule == "SR01")
    assert sags.consequences[-1] == "C1: lock was read at 19.8 V in round 1, below its lowest 20.4 V (LV01)"


def undersized() -> Site:
    """24 V, 29 m of 4 mm² copper, 8 A: 2.14 V, 8.9 %; with the battery at 21 V less than the 20.4 V of the lock."""
    return site_of(
        {
            "sources": [{"source": "B", "kind": "battery", "nominal": "24", "lowest": "21"}],
            "circuits": [{"circuit": "C1", "fed_from": "B", "device": "none"}],
            "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "29", "size": "4 mm2"}],
            "loads": [{"circuit": "C1", "point": "p1", "load": "lock", "current": "8", "lowest": "20.4"}],
        },
        {"name": "x"},
    )
