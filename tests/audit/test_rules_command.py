"""``ohmwalk rules``: the catalogue, one rule's page, both as JSON, and the limits of a site."""

from __future__ import annotations

import inspect
import io
import json
import shutil
from pathlib import Path

import pytest

from audit import cli
from audit.limit_words import limit_words
from audit.rule_page import rule_page
from audit.rules_text import print_rule, print_rules
from audit.tui.drawing.pieces import text_of, width_of
from audit.tui.drawing.rule import rule_lines
from rules import limits
from rules.limits import Limits
from rules.record import Site
from rules.rule import Rule, catalogue
from sample_sites.catalogue import sample_site

GENERAL = limits.of(Site(name="x"))
OURS = """
inherits = "telecom-48"
[heat]
source = "the owner's insurer"
edition = "2026"
status = "from-memory"
soon_w = 1
[rules.VD01]
severity = "note"
reason = "agreed in writing"
[rules.RD06]
off = true
reason = "the clamp has no sign"
"""
every_rule = pytest.mark.parametrize("rule", catalogue(), ids=lambda rule: rule.id)


def printed(rule: Rule | None = None, in_force: Limits = GENERAL, encoding: str = "utf-8") -> list[str]:
    """Lines of the catalogue, or of one page, as a pipe of that encoding receives them."""
    pipe = io.TextIOWrapper(io.BytesIO(), encoding=encoding)
    if rule is None:
        print_rules(in_force, pipe)
    else:
        print_rule(rule, in_force, pipe)
    pipe.seek(0)
    return pipe.read().splitlines()


def squeezed(text: str) -> str:
    return " ".join(text.split())


@pytest.fixture
def plant(tmp_path: Path) -> Path:
    """The sample plant with a limits profile of its own."""
    folder = tmp_path / "plant"
    shutil.copytree(Path(str(sample_site("plant").folder)), folder)
    settings = folder / "site.toml"
    text = settings.read_text(encoding="utf-8")
    settings.write_text(text.replace('limits = "telecom-48"', 'limits = "ours.toml"'), encoding="utf-8")
    (folder / "ours.toml").write_text(OURS, encoding="utf-8")
    return folder


@every_rule
def test_the_page_says_everything_that_the_rule_says(rule: Rule) -> None:
    words = squeezed(" ".join(printed(rule)))
    for text in (rule.id, rule.title, rule.remedy, rule.caution, rule_page(rule, GENERAL).usual):
        assert squeezed(text) in words
    for paragraph in inspect.cleandoc(rule.text).split("\n\n"):
        said = squeezed(paragraph.replace("``", "").replace("**Finds**: ", "").replace("**Leaves alone**: ", ""))
        assert said[1:] in words
    for citation in (rule.source, *rule.also):
        assert citation.document in words
        assert citation.clause in words
        assert citation.status in words
    for name in rule.limits:
        group = GENERAL.groups[name]
        assert squeezed(group.title) in words
        for key in (*group.values, *group.words):
            assert squeezed(limit_words(group, key)) in words
            assert squeezed(str(group.stated[key])) in words


@every_rule
def test_screen_and_pipe_show_the_same_page(rule: Rule) -> None:
    drawn = rule_lines(rule_page(rule, GENERAL), 80)
    assert all(width_of(line) <= 80 for line in drawn)
    assert "".join("".join(map(text_of, drawn)).split()) == "".join("".join(printed(rule)).split())


@pytest.mark.parametrize("rule", [None, *catalogue()], ids=lambda rule: rule.id if rule else "catalogue")
def test_fit_for_a_pipe_in_any_encoding(rule: Rule | None) -> None:
    for line in printed(rule):
        assert len(line) <= 80
        assert line == line.rstrip()
        assert "\x1b" not in line
    assert "\n".join(printed(rule, encoding="ascii")).isascii()


@every_rule
def test_the_page_says_what_the_rule_is_about_and_its_severity(rule: Rule) -> None:
    usual = rule_page(rule, GENERAL).usual
    assert usual.startswith(rule.about)
    assert all(about in usual for about in rule.also_about)
    assert usual.endswith(f", usually {rule.severity}")


def test_the_catalogue_has_every_rule_with_its_line() -> None:
    words = squeezed(" ".join(printed()))
    for rule in catalogue():
        page = rule_page(rule, GENERAL)
        assert squeezed(f"{rule.id} {rule.title} {page.usual} {page.brief}") in words
        assert page.brief.count(".") >= 1
        assert len(page.brief) < 160


@every_rule
def test_what_is_from_memory_is_said_so_in_the_catalogue(rule: Rule) -> None:
    origin = rule_page(rule, GENERAL).origin
    from_memory = [citation for citation in (rule.source, *rule.also) if citation.status == "from-memory"]
    assert origin.count("from-memory") >= len(from_memory)
    groups = [name for name in rule.limits if any(s.status == "from-memory" for s in GENERAL.groups[name].by_source())]
    assert ("limits from-memory: " in origin) == bool(groups)
    assert all(name.replace("_", " ") in origin for name in groups)
    assert squeezed(origin) in squeezed(" ".join(printed()))


@pytest.mark.parametrize("id_", ["VD01", "vd01", " Vd01 "])
def test_an_id_in_capitals_or_not(id_: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["rules", id_]) == 0
    assert capsys.readouterr().out.startswith("VD01  Computed drop above the allowed drop\n")


@pytest.mark.parametrize(
    ("id_", "line"),
    [("VD10", "no rule 'VD10'; did you mean VD0"), ("qqq", "no rule 'qqq'; there are: CP01, "), ("", "no rule ''; there are")],
)  # fmt: skip
def test_an_unknown_id_is_one_line_with_the_nearest(id_: str, line: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["rules", id_]) == 2
    said = capsys.readouterr()
    assert said.out == ""
    assert said.err.startswith(line)
    assert said.err.count("\n") == 1


def test_the_limits_of_a_site_with_their_origin(plant: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["rules", "VD02", "--site", str(plant)]) == 0
    words = squeezed(capsys.readouterr().out)
    assert "Limits in force, profile ours.toml" in words
    assert "soon 1 W the owner's insurer, edition 2026 (from-memory); limits profile ours.toml" in words
    assert "immediate 10 W; limit 2 W; load test 5 W our own classes" in words
    assert "low 200 µΩ; high 100 mΩ our own default for heavy plants" in words
    assert "limits profile telecom-48" in words


def test_what_a_profile_changes_of_a_rule(plant: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["rules", "VD01", "--site", str(plant)]) == 0
    assert "here reports note, by limits profile ours.toml: agreed in writing" in squeezed(capsys.readouterr().out)
    assert cli.run(["rules", "--site", str(plant)]) == 0
    words = squeezed(capsys.readouterr().out)
    assert "usually watch; here switched off, by limits profile ours.toml: the clamp has no sign" in words


def test_a_site_that_cannot_be_opened_or_whose_profile_is_wrong(
    plant: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (plant / "ours.toml").write_text('inherits = "telcom-48"', encoding="utf-8")
    assert cli.run(["rules", "--site", str(plant)]) == 2
    assert "did you mean 'telecom-48'?" in capsys.readouterr().err
    assert cli.run(["rules", "--site", str(plant / "nothing.ohmwalk")]) == 2


def test_json_of_all_and_of_one(plant: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert cli.run(["rules", "--json", "--site", str(plant)]) == 0
    told = json.loads(capsys.readouterr().out)
    assert list(told) == ["schema", "program", "limits", "rules"]
    assert (told["schema"], told["limits"]) == ("ohmwalk.rules/1", "ours.toml")
    by_id = {rule["rule"]: rule for rule in told["rules"]}
    assert by_id["RD11"]["about"] == ["circuit", "board", "source"]
    assert list(by_id) == [rule.id for rule in catalogue()]
    assert by_id["VD01"]["in_force"] == {"off": False, "severity": "note", "reason": "agreed in writing"}
    assert by_id["RD06"]["in_force"]["off"] is True
    heat = {row["key"]: (row["value"], row["profile"]) for row in by_id["VD02"]["limits"] if row["group"] == "heat"}
    assert heat["soon_w"] == (1.0, "ours.toml")
    assert heat["immediate_w"] == (10.0, "general")
    assert cli.run(["rules", "vd05", "--json"]) == 0
    (one,) = json.loads(capsys.readouterr().out)["rules"]
    (rule,) = [rule for rule in catalogue() if rule.id == "VD05"]
    assert (one["rule"], one["remedy"], one["caution"]) == ("VD05", rule.remedy, rule.caution)
    assert one["sources"][0]["document"] == rule.source.document
