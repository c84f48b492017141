"""Limits profiles: packaged, then the site's own, then its prior; every mistake is named."""

from __future__ import annotations

from dataclasses import replace

import pytest

from audit.intake.folder import site_of
from rules import limits
from rules.assess import assess
from rules.assessment import Severity
from rules.errors import ProfileError
from rules.limits import profile
from rules.limits.profile import rule_ids
from rules.record import Site
from rules.rule import catalogue

STATUSES = ("verified", "computed", "from-memory", "our own default", "common practice, no source")


def own(text: str, **more: object) -> Site:
    return Site(name="x", limits="ours.toml", own_limits=text, **more)  # type: ignore[arg-type]


def test_every_group_of_every_packaged_profile_says_where_it_comes_from() -> None:
    for name in limits.names():
        for group in limits.of(Site(name="x", limits=name)).groups.values():
            assert group.title
            assert group.unit
            assert group.values or group.words
            assert set(group.stated) == {*group.values, *group.words}
            for stated in group.by_source():
                assert stated.source
                assert stated.status in STATUSES
                assert stated.origin in limits.names()


def test_what_general_chooses_by_a_word_is_among_the_words_it_accepts() -> None:
    groups = limits.of(Site(name="x")).groups.values()
    assert any(group.words for group in groups)
    for group in groups:
        assert group.words.keys() == group.accepted.keys()
        assert not group.words.keys() & group.values.keys()
        assert all(group.words[key] in accepted for key, accepted in group.accepted.items())


def test_a_sites_own_profile_chooses_by_a_word() -> None:
    ours = limits.of(own('[capacity]\nsource = "local code"\ntable = "nec before 2011"\n'))
    assert ours.word("capacity.table") == "nec before 2011"
    assert ours.word("capacity.assumed_method") == limits.of(Site(name="x")).word("capacity.assumed_method")
    assert "local code" in ours.citation("capacity")


def test_a_sites_own_profile_starts_from_the_one_it_inherits() -> None:
    ours = limits.of(own('title = "Ours"\n[drop]\nsource = "our contract"\nallowed_percent = 2\n'))
    assert ours["drop.allowed_percent"] == 2
    assert ours["drop.allowed_total_percent"] == 5
    assert ours["temperature.hot_c"] == 70
    assert ours.title == "Ours"
    assert "our contract" in ours.citation("drop")
    assert "ours.toml" in ours.citation("drop")
    assert "limits profile general" in ours.citation("temperature")


def test_a_rule_may_be_lowered_or_switched_off_with_a_reason() -> None:
    ours = limits.of(
        own('[rules.VD01]\nseverity = "watch"\nreason = "agreed"\n[rules.VD03]\noff = true\nreason = "n/a"\n')
    )
    assert ours.rules["VD01"].severity is Severity.WATCH
    assert ours.rules["VD03"].off


@pytest.mark.parametrize(
    ("text", "line"),
    [
        ("[drop", "ours.toml: not TOML"),
        ('inherits = "generale"', "there is no limits profile 'generale'; did you mean 'general'?"),
        ("inherits = 3", "'title' and 'inherits' are texts"),
        ("[dorp]\nallowed_percent = 2", "there is no group [dorp]; did you mean 'drop'?"),
        ("drop = 2", "drop is not a group of numbers"),
        ('[drop]\nsource="s"\nallowed_precent = 2', "there is no drop.allowed_precent; did you mean 'allowed_percent'?"),
        ('[drop]\nsource="s"\nallowed_percent = "2"', "drop.allowed_percent is '2', not a finite number"),
        (
            '[heat]\nsource="s"\nsoon_w = "2 mV"', "heat.soon_w is '2 mV', not a finite number in W",
        ),
        (
            '[drop]\nallowed_percent = { value = 2, source = "s", unit = "V" }',
            "drop.allowed_percent: there is no 'unit'; value, source, edition, status",
        ),
        (
            '[drop]\nallowed_percent = { value = 2, sorce = "s" }',
            "drop.allowed_percent: there is no 'sorce'; did you mean 'source'?",
        ),
        ('[drop]\nallowed_percent = { value = 2 }', "[drop] changes values without naming its source"),
        ('[drop]\nallowed_percent = { source = "s" }', "drop.allowed_percent is {'source': 's'}, not a finite number in %"),
        ('[drop]\nallowed_percent = { value = 2, source = 3 }', "drop.allowed_percent.source is not a text"),
        ('inherits = "ours.toml"', "profile 'ours.toml' inherits itself: ours.toml > ours.toml"),
        ('[drop]\nsource="s"\nallowed_percent = true', "drop.allowed_percent is True, not a finite number"),
        ('[drop]\nsource="s"\nallowed_percent = nan', "drop.allowed_percent is nan, not a finite number"),
        ('[drop]\nsource="s"\nallowed_percent = -1', "drop.allowed_percent is -1; not below 0"),
        ('[drop]\nsource="s"\nallowed_percent = 0', "drop.allowed_percent is 0; above 0"),
        ("[drop]\nallowed_percent = 2", "[drop] changes values without naming its source"),
        ('[drop]\nsource="s"\nunit="V"\nallowed_percent = 2', "drop.unit is 'V', its numbers are in '%'"),
        ("[drop]\nsource=3\nallowed_percent = 2", "drop.source is not a text"),
        ('[temperature]\nsource="s"\nhot_c = 900', "temperature.hot_c is 900; a temperature from -90 to 400 degC"),
        ('[decision]\nsource="s"\nsound_at = 1.5', "decision.sound_at is 1.5; a share from 0 to 1"),
        ('[decision]\nsource="s"\npasses_at = 0.99', "decision.passes_at is not below decision.fails_at"),
        ('[heat]\nsource="s"\nsoon_w = 20', "heat.soon_w is not below heat.immediate_w"),
        ('[joint_rise]\nsource="s"\nsimilar_watch_k = 20', "joint_rise.similar_watch_k is not below joint_rise.similar_soon_k"),
        ('[sampling]\nsource="s"\nconfidence = 1', "sampling.confidence is 1; a share below 1"),
        ('[prior]\nsource="s"\nas_recorded = 0', "prior.as_recorded is 0; above 0, or nothing can be as recorded"),
        (
            '[load_window]\nsource="s"\nlowest_percent = 90\nhighest_percent = 85',
            "load_window.lowest_percent is not below load_window.highest_percent",
        ),
        ('[capacity]\nsource="s"\ntable = "ice"', "table is 'ice'; one of by size, iec, nec, nec before 2011; did you mean 'iec'?"),
        ('[capacity]\nsource="s"\ntable = 3', "capacity.table is 3; one of by size, iec, nec, nec before 2011"),
        ('[capacity]\nsource="s"\ntable = { word = "iec", accepted = ["iec"] }', "capacity.table is {'word': 'iec'"),
        ('[capacity]\nsource="s"\ntabel = "iec"', "there is no capacity.tabel; did you mean 'table'?"),
        ('[capacity]\ntable = "iec"', "[capacity] changes values without naming its source"),
        ('[drop]\nsource="s"\nallowed_percent = 1e308', "drop.allowed_percent is 1e+308; at most 1000000000"),
        ('[drop]\nsource="s"\nallowed_percent = 1e-300', "drop.allowed_percent is 1e-300; 0, or at least 1e-12"),
        ('[series_semiconductor]\nsource="s"\nhigh_v = 1e12', "series_semiconductor.high_v is 1e+12; at most 10000"),
        ('[heat]\nsource="s"\nsoon_w = 1e12', "heat.soon_w is 1e+12; at most 10000000"),
        ('[prior]\nsource="s"\nas_recorded = 1e308', "prior.as_recorded is 1e+308; at most 1000000000"),
        ("[rules.VD01]\noff = true", "rules.VD01 has no reason"),
        ('[rules.VD91]\noff = true\nreason="r"', "there is no rule 'VD91'; did you mean 'VD01'?"),
        ('[rules.VD01]\noff = "yes"\nreason="r"', "rules.VD01.off is 'yes'; true or false"),
        ('[rules.VD01]\nseverity = "later"\nreason="r"', "rules.VD01.severity is 'later'; one of immediate, soon, watch, note"),
        ('[rules.VD01]\nlevel = 1\nreason="r"', "there is no rules.VD01.level; a rule may have severity, off, reason"),
        ("[rules]\nVD01 = 3", "rules.VD01 is no group"),
        ("rules = 3", "[rules] holds groups"),
        (
            '[prior]\nsource="s"\n'
            + "\n".join(
                f"{cause} = 0"
                for cause in (
                    "as_recorded", "bad_connection", "smaller_conductor", "other_metal", "longer_route",
                    "series_semiconductor", "reading_or_record_doubtful",
                )
            ),
            "the shares of [prior] sum to nothing",
        ),
    ],
)  # fmt: skip
def test_a_mistake_in_a_profile_is_named(text: str, line: str) -> None:
    with pytest.raises(ProfileError) as raised:
        limits.of(own(text))
    assert line in str(raised.value)
    assert "\n\n" not in str(raised.value)


def test_all_mistakes_come_in_one_go() -> None:
    with pytest.raises(ProfileError) as raised:
        limits.of(own("[dorp]\nx = 1\n[drop]\nallowed_precent = 2\n[rules.VD01]\noff = true\n"))
    assert len(str(raised.value).splitlines()) == 4


def test_an_unknown_profile_names_the_nearest() -> None:
    with pytest.raises(ProfileError, match="did you mean 'general'"):
        limits.of(Site(name="x", limits="genral"))


def test_a_sites_prior_is_normalised_and_leaves_out_what_it_does_not_name() -> None:
    prior = limits.of(Site(name="x", prior=(("as recorded", 3.0), ("bad connection", 1.0)))).prior
    doubtful = 0.005 / 1.005  # keeps the profile's share of 0.005 in 1.005
    assert prior["as recorded"] == pytest.approx(0.75 / (1 + doubtful))
    assert prior["bad connection"] == pytest.approx(0.25 / (1 + doubtful))
    assert prior["reading or record doubtful"] == pytest.approx(doubtful / (1 + doubtful))
    assert prior["longer route"] == 0
    assert sum(prior.values()) == pytest.approx(1)


def test_a_prior_may_rule_out_doubtful_readings() -> None:
    prior = limits.of(Site(name="x", prior=(("as recorded", 1.0), ("reading or record doubtful", 0.0)))).prior
    assert prior["as recorded"] == 1


@pytest.mark.parametrize(
    ("prior", "line"),
    [
        ((("as recorded", 1.0), ("bad conection", 1.0)), "did you mean 'bad connection'"),
        ((("as recorded", -1.0),), "share -1"),
        ((("as recorded", 0.0),), "sum to nothing"),
    ],
)
def test_a_mistake_in_a_prior_is_named(prior: tuple[tuple[str, float], ...], line: str) -> None:
    with pytest.raises(ProfileError, match=line):
        limits.of(Site(name="x", prior=prior))


def test_without_a_prior_the_profiles_holds() -> None:
    assert limits.of(Site(name="x")).prior["as recorded"] == pytest.approx(0.80 / 1.005)


def test_a_value_may_come_from_elsewhere_than_the_rest_of_its_group() -> None:
    text = """
        [drop]
        source = "our contract"
        allowed_percent = 2
        allowed_total_percent = { value = 4, source = "the owner's letter", edition = "3 May", status = "from-memory" }
    """
    ours = limits.of(own(text))
    assert ours["drop.allowed_total_percent"] == 4
    assert ours.citation("drop", "allowed_percent") == "our contract (not stated); limits profile ours.toml"
    letter = "the owner's letter, edition 3 May (from-memory); limits profile ours.toml"
    assert ours.citation("drop", "allowed_total_percent") == letter
    assert ours.citation("drop") == f"our contract (not stated); limits profile ours.toml; {letter}"


def test_a_value_that_a_profile_leaves_alone_keeps_its_source() -> None:
    ours = limits.of(own('[drop]\nsource = "our contract"\nallowed_percent = 2\n'))
    assert "NFPA 70" in ours.citation("drop", "allowed_total_percent")
    assert "limits profile general" in ours.citation("drop", "allowed_total_percent")


def test_a_profile_of_ones_own_inherits_a_packaged_one_and_what_that_inherits() -> None:
    ours = limits.of(own('inherits = "battery-125"\n[heat]\nsource = "us"\nsoon_w = 1\n'))
    assert ours.inherited == ("battery-125", "battery-110", "general")
    assert (ours["drop.allowed_total_percent"], ours["drop.allowed_percent"], ours["heat.soon_w"]) == (4, 3, 1)
    assert ours.citation("drop", "allowed_total_percent").endswith("limits profile battery-125")
    assert ours.citation("bad_connection", "low_ohm").endswith("limits profile battery-110")
    assert ours.citation("heat", "immediate_w").endswith("limits profile general")


def test_a_rule_that_an_inherited_profile_changes_may_be_put_back(monkeypatch: pytest.MonkeyPatch) -> None:
    parent = 'inherits = "general"\n[rules.VD01]\noff = true\nreason = "theirs"\n'
    packaged(monkeypatch, {"strict": parent})
    theirs = limits.of(own('inherits = "strict"')).rules["VD01"]
    assert (theirs.off, theirs.origin) == (True, "strict")
    ours = limits.of(own('inherits = "strict"\n[rules.VD01]\noff = false\nreason = "ours"')).rules["VD01"]
    assert (ours.off, ours.origin) == (False, "ours.toml")


def test_profiles_that_inherit_each_other_are_an_error(monkeypatch: pytest.MonkeyPatch) -> None:
    packaged(monkeypatch, {"egg": 'inherits = "hen"', "hen": 'inherits = "egg"'})
    with pytest.raises(ProfileError, match="profile 'egg' inherits itself: egg > hen > egg"):
        limits.of(Site(name="x", limits="egg"))
    with pytest.raises(ProfileError, match=r"profile 'hen' inherits itself: ours\.toml > hen > egg > hen"):
        limits.of(own('inherits = "hen"'))


def packaged(monkeypatch: pytest.MonkeyPatch, texts: dict[str, str]) -> None:
    """Further packaged profiles, for one test."""
    known, text_of = limits.names(), profile._text_of
    monkeypatch.setattr(profile, "names", lambda: (*known, *texts))
    monkeypatch.setattr(profile, "_text_of", lambda name: texts.get(name) or text_of(name))


def test_the_trades_have_their_profiles() -> None:
    """The list of issue 6."""
    assert set(limits.names()) == {
        "general", "telecom-48", "control-24", "security-12-24", "emergency-lighting", "battery-110", "battery-125",
        "battery-220", "dc-lighting", "pv-strings",
    }  # fmt: skip
    for name in limits.names():
        assert limits.of(Site(name="x", limits=name)).title


@pytest.mark.parametrize("name", [name for name in limits.names() if name != "general"])
def test_what_a_profile_changes_shows_in_the_findings_that_it_changes(name: str) -> None:
    """100 m of 1.5 mm² at 5 A lose 12 V: too much for every profile, by the profile's own figure."""
    tables = {
        "sources": [{"source": "S", "kind": "battery", "nominal": "24"}],
        "circuits": [{"circuit": "C1", "fed_from": "S", "device": "none"}],
        "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "100", "size": "1.5 mm2"}],
        "loads": [{"circuit": "C1", "point": "p1", "load": "lamp", "current": "5"}],
    }
    site = replace(site_of(tables, {"name": "x", "nominal": "24 V"}), limits=name)
    in_force = limits.of(site)
    (finding,) = [finding for finding in assess(site, in_force).findings if finding.rule == "VD01"]
    assert finding.numbers["allowed"].value == pytest.approx(in_force["drop.allowed_percent"] / 100)
    assert in_force.citation("drop", "allowed_percent") in finding.source
    assert [profile for profile in (name, *in_force.inherited[:-1]) if f"limits profile {profile}" in finding.source]


def test_a_profile_knows_every_rule_by_its_file() -> None:
    assert rule_ids() == tuple(rule.id for rule in catalogue())


def test_a_finding_cites_only_the_values_that_decided_it() -> None:
    """A telecom plant sets when a circuit is sound and from where a bad connection is sought: no part of a polarity."""
    tables = {
        "sources": [{"source": "S", "kind": "battery", "nominal": "48"}],
        "circuits": [{"circuit": "C1", "fed_from": "S", "device": "none"}],
        "runs": [{"circuit": "C1", "run": "1", "from": "way", "to": "p1", "length": "20", "size": "6 mm2"}],
        "loads": [{"circuit": "C1", "point": "p1", "load": "lamp", "current": "5"}],
        "readings": [
            {"visit": "v", "circuit": "C1", "round": "1", "at": "way", "quantity": "current", "value": "5 A"},
            {"visit": "v", "circuit": "C1", "round": "1", "at": "way", "quantity": "voltage", "value": "50 V"},
            {"visit": "v", "circuit": "C1", "round": "1", "at": "p1", "quantity": "voltage", "value": "-49 V"},
        ],
    }
    site = replace(site_of(tables, {"name": "x", "nominal": "48 V"}), limits="telecom-48")
    (reversed_,) = [finding for finding in assess(site, limits.of(site)).findings if finding.rule == "RD01"]
    assert "telecom-48" not in reversed_.source
    decision = limits.of(site).groups["decision"]
    assert decision.stated["sound_at"].origin == "telecom-48"
    assert "sound_at" not in decision.deciding()
    assert decision.deciding(("decision",)) == ()
    assert "fails_at" not in decision.deciding(("decision.fails_at",))
    assert "sound" not in limits.of(site).citation("decision")
