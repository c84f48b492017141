"""What speaks for a cause and against it: the sums against scipy, the sentences against drops computed by hand."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from types import ModuleType

import numpy as np
import pytest
import scipy.stats
from numpy.testing import assert_allclose

from rules import limits
from rules.assess import assess, prepare
from rules.assessment import Place
from rules.diagnosis.explanation import Pictures, explained, groups_of, pictured, spoken
from rules.diagnosis.hypotheses import AS_RECORDED, BAD_CONNECTION, DOUBTFUL, LONGER, SEMICONDUCTOR
from rules.diagnosis.judge import judge_block
from rules.diagnosis.pairs import TWO_PLACES
from rules.diagnosis.problem import Problem
from rules.diagnosis.shape import shape_of
from rules.explain import causes_with_facts
from rules.measured import posed_by
from rules.record import Site

LENGTHS = (9.0, 7.0, 8.0)


def problem_of(site: Site) -> tuple[Problem, limits.Limits]:
    context = prepare(site, limits.of(site))
    problem = posed_by(context, context.measured[site.circuits[0].id])
    assert problem is not None
    return problem, context.limits


def told(site: Site) -> tuple[Place, ...]:
    """The causes of the only circuit, with their facts."""
    (result,) = assess(site, limits.of(site), explain=True).circuits
    return result.causes


def of(causes: Sequence[Place], cause: str) -> Place:
    return next(row for row in causes if row.cause == cause)


def test_two_groups_share_the_whole_log_ratio(chains: ModuleType) -> None:
    """Of two groups what each says alone and adds to the other is all there is: the log ratio, as scipy has it."""
    volts = chains.drops(LENGTHS[:2], 8.0, extra=(0.0, 0.04))
    problem, in_force = problem_of(chains.chain(LENGTHS[:2], chains.read(("way", "p1", "p2"), volts, 8.0)))
    judged = judge_block(shape_of(problem.signature), [problem], in_force)
    names = judged.hypotheses.names
    which = np.array([[n for n, name in enumerate(names) if name.what != TWO_PLACES]])
    pictures = pictured(judged, which)
    groups = groups_of(judged.block.shape)
    assert len(groups) == 2
    said = spoken(pictures, groups)[0]
    whole = [
        scipy.stats.multivariate_normal(None, covariance).logpdf(residual)
        for residual, covariance in zip(pictures.residual[0], pictures.covariance[0], strict=True)
    ]
    assert_allclose(said.sum(axis=1), whole, rtol=1e-9)


def test_of_more_groups_each_is_the_mean_of_first_and_last() -> None:
    rng = np.random.default_rng(3)
    factor = rng.normal(size=(5, 7))
    covariance, residual = factor @ factor.T, rng.normal(size=5)
    groups = [[0, 3], [1], [2, 4]]
    pictures = Pictures(residual[None, None], covariance[None, None], residual[None, None])
    found = spoken(pictures, groups)[0, 0]
    for rows, value in zip(groups, found, strict=True):
        others = [n for n in range(5) if n not in rows]
        alone, left, whole = (
            scipy.stats.multivariate_normal(None, covariance[np.ix_(part, part)]).logpdf(residual[part])
            for part in (rows, others, list(range(5)))
        )
        assert value == pytest.approx((alone + whole - left) / 2)


def test_single_hypotheses_at_their_size_have_the_diagnosis_s_own_density(chains: ModuleType) -> None:
    """As recorded and each single factor on the conductors has no size: the picture's density is its evidence."""
    volts = chains.drops(LENGTHS, 8.0, factor=1.6)
    problem, in_force = problem_of(chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), volts, 8.0)))
    judged = judge_block(shape_of(problem.signature), [problem], in_force)
    names = judged.hypotheses.names
    single = [
        n
        for n, name in enumerate(names)
        if name.cause == AS_RECORDED or (name in judged.conductors.hypotheses.names and "longer" not in name.what)
    ]
    single = [n for n in single if names[n].what != "parallel_path"]
    assert len(single) > 8
    pictures = pictured(judged, np.array([single]))
    for number, hypothesis in enumerate(single):
        density = scipy.stats.multivariate_normal(None, pictures.covariance[0, number]).logpdf(
            pictures.residual[0, number]
        )
        assert density == pytest.approx(judged.hypotheses.log_evidence[0, hypothesis], abs=1e-6), names[hypothesis]


def test_a_bad_connection_says_where_more_is_lost_and_where_nothing_is(chains: ModuleType) -> None:
    """40 mΩ in run 2 at 8 A: 0.32 V more there, the others as computed."""
    # run 2: (2 × 7 m × 4.61 mΩ/m + 1.206 mΩ) × 8 A = 0.526 V, with 40 mΩ 0.846 V
    volts = chains.drops(LENGTHS, 8.0, extra=(0.0, 0.04))
    causes = told(chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), volts, 8.0)))
    bad = of(causes, BAD_CONNECTION)
    first, *others = bad.speaks_for
    assert first.startswith("run 2 loses 0.846 V at 8 A against 0.526 V computed, 0.320 ± ")
    assert first.endswith(" V more")
    assert any(said.startswith("run 1 loses 0.67") and ", as computed: " in said for said in others)


def test_one_run_alone_tells_no_joint_from_a_length(chains: ModuleType) -> None:
    volts = chains.drops((12.0,), 8.0, extra=(0.045,))
    causes = told(chains.chain((12.0,), chains.read(("way", "p1"), volts, 8.0)))
    bad = of(causes, BAD_CONNECTION)
    assert bad.speaks_for
    assert bad.speaks_against[0].startswith("no reading tells it from ")


def test_against_says_what_the_cause_would_make_of_it(chains: ModuleType) -> None:
    """All three runs lose 1.45 times what is computed but one of them less: a loop entered as one way would be 2."""
    volts = chains.drops(LENGTHS, 8.0, factor=1.75)
    causes = told(chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), volts, 8.0)))
    assert any("; this cause would make it " in said for row in causes for said in row.speaks_against)
    longer = of(causes, LONGER)
    assert longer.speaks_for[0].startswith("the conductors show 1.75 times the computed resistance; ")


def test_two_rounds_show_an_offset_that_stays(chains: ModuleType) -> None:
    """0.5 V more in run 1 at 8 A and at 4 A."""
    # (2 × 9 m × 4.61 mΩ/m + 1.206 mΩ) × 8 A + 0.5 V = 1.1735 V, read to 1 mV as 24.000 − 22.827 V
    rows = []
    for number, amps in enumerate((8.0, 4.0)):
        volts = chains.drops(LENGTHS, amps, offset=0.5)
        rows += chains.read(("way", "p1", "p2", "p3"), volts, amps, str(number + 1))
    offset = of(told(chains.chain(LENGTHS, rows)), SEMICONDUCTOR)
    first = offset.speaks_for[0]
    assert first.startswith("run 1 loses 1.173 V at 8 A and 0.837 V at 4 A, 0.50")
    assert first.endswith(" more than computed")


def test_three_rounds_are_a_line_over_the_current(chains: ModuleType) -> None:
    """0.5 V whatever the current, and the resistance of the cable: 2 × 9 m × 4.61 mΩ/m + 1.206 mΩ = 84.2 mΩ."""
    rows = []
    for number, amps in enumerate((8.0, 4.0, 2.0)):
        volts = chains.drops(LENGTHS, amps, offset=0.5)
        rows += chains.read(("way", "p1", "p2", "p3"), volts, amps, str(number + 1))
    offset = of(told(chains.chain(LENGTHS, rows)), SEMICONDUCTOR)
    said = offset.speaks_for[1]
    assert said.startswith("through 3 rounds run 1 loses 0.500")
    assert said.endswith(" times its current, 84.2 mΩ computed")
    assert " V and 84." in said


def test_a_slip_is_named_with_what_was_meant(chains: ModuleType) -> None:
    volts = chains.drops(LENGTHS, 8.0)
    volts[2] /= 10
    row = of(told(chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), volts, 8.0))), DOUBTFUL)
    assert row.speaks_for[0].startswith("voltage at p2, round 1: 2.28 V was entered, about 22.8 V would fit")
    assert "(a decimal place)" in row.speaks_for[0]


@pytest.mark.parametrize(
    ("factor", "words"),
    [
        (0.5, "the length recorded as one way is that of the loop"),
        (0.3048, "the length recorded in metres is in feet"),
    ],
)
def test_less_than_computed_names_what_the_record_would_be(chains: ModuleType, factor: float, words: str) -> None:
    """Method, section 3: a length entered as loop, metres for feet."""
    volts = chains.drops(LENGTHS, 8.0, factor=factor)
    row = of(told(chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), volts, 8.0))), DOUBTFUL)
    assert row.speaks_for[0] == words
    assert row.speaks_for[1].startswith(f"the conductors show {factor:.2f} ")
    assert row.speaks_for[1].endswith(f" times the computed resistance; this makes {factor:.2f}")


def test_as_recorded_names_what_agrees(chains: ModuleType) -> None:
    volts = chains.drops(LENGTHS, 8.0)
    first, *_ = told(chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), volts, 8.0)))
    assert first.cause == AS_RECORDED
    assert ", as computed: " in first.speaks_for[0]


def test_nothing_is_explained_unless_asked(chains: ModuleType) -> None:
    site = chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), chains.drops(LENGTHS, 8.0), 8.0))
    (result,) = assess(site, limits.of(site)).circuits
    assert result.causes
    assert all(not row.speaks_for and not row.speaks_against for row in result.causes)


def test_a_place_that_the_readings_no_longer_know_stays_without_facts(chains: ModuleType) -> None:
    """A screen may show what was judged before the record changed."""
    site = chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), chains.drops(LENGTHS, 8.0), 8.0))
    context = prepare(site, limits.of(site))
    (circuit,) = site.circuits
    causes = (Place(BAD_CONNECTION, "run 9", 0.7), *context.diagnoses[circuit.id].causes)
    gone, *known = causes_with_facts(context, circuit, causes)
    assert gone == causes[0]
    assert known[0].speaks_for


def test_a_batch_says_what_each_circuit_alone_says(chains: ModuleType) -> None:
    problems, causes = [], []
    for extra in (0.0, 0.02, 0.2):
        volts = chains.drops(LENGTHS, 8.0, extra=(0.0, extra))
        site = chains.chain(LENGTHS, chains.read(("way", "p1", "p2", "p3"), volts, 8.0))
        context = prepare(site, limits.of(site))
        problem = posed_by(context, context.measured[site.circuits[0].id])
        assert problem is not None
        problems.append(problem)
        causes.append(context.diagnoses[site.circuits[0].id].causes)
    together = explained(problems, causes, context.limits)
    for problem, rows, said in zip(problems, causes, together, strict=True):
        (alone,) = explained([problem], [rows], context.limits)
        assert [(row.speaks_for, row.speaks_against) for row in alone] == [
            (row.speaks_for, row.speaks_against) for row in said
        ]
        assert [replace_facts(row) for row in said] == list(rows)


def replace_facts(row: Place) -> Place:
    return row._replace(speaks_for=(), speaks_against=())


def test_of_legs_each_is_a_fact(chains: ModuleType) -> None:
    """30 mΩ in the positive leg: 0.24 V more there at 8 A, the negative leg as computed."""
    # a leg of run 1: (9 m × 4.61 mΩ/m + 0.603 mΩ) × 8 A = 0.337 V
    leg = (9 * chains.OHM_PER_M + chains.JOINTS / 2) * 8
    rows = [
        {"circuit": "C1", "round": "1", "quantity": "drop", "at": "way", "to": "p1", "leg": name, "instrument": "M1",
         "value": f"{leg + extra:.4f}"}
        for name, extra in (("positive", 0.24), ("negative", 0.0))
    ]  # fmt: skip
    rows.append({"circuit": "C1", "round": "1", "quantity": "current", "at": "run 1", "value": "8", "instrument": "K1"})
    site = chains.chain(LENGTHS, rows)
    bad = of(told(replace(site)), BAD_CONNECTION)
    assert bad.speaks_for[0].startswith(
        "the positive leg of run 1 loses 0.577 V at 8 A against 0.337 V computed, 0.240 ± "
    )
    assert bad.speaks_for[1].startswith("the negative leg of run 1 loses 0.337 V at 8 A, as computed: 0.337 ± ")
