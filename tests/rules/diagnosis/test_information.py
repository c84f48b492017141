"""Expected falls in entropy: closed forms, scipy's quadrature, drawn outcomes, and what always holds."""

from __future__ import annotations

import math

import numpy as np
import pytest
import scipy.integrate
import scipy.stats
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from rules.diagnosis.information import SAMPLES, entropy, fall_by_one, fall_by_several, normal_points
from rules.diagnosis.shape import Floats


def mixture(rng: np.random.Generator, atoms: int, groups: int) -> tuple[Floats, Floats]:
    """Weights and groups of one problem."""
    weight = rng.dirichlet(np.full(atoms, 0.5))
    member = np.eye(groups)[rng.integers(0, groups, atoms)]
    return weight, member


def test_one_of_four_joints_tells_itself_from_the_other_three() -> None:
    """Four equal joints, one is read without doubt: ln 4 before; ln 3 left in three of four cases."""
    weight, member = np.full(4, 0.25), np.eye(4)
    mean = np.array([[1.0, 0.0, 0.0, 0.0]])
    found = fall_by_one(weight, member, mean, np.full((1, 4), 1e-6))
    assert_allclose(found, [math.log(4) - 0.75 * math.log(3)], atol=0.01)


def test_a_leg_halves_four_joints() -> None:
    weight, member = np.full(4, 0.25), np.eye(4)
    mean = np.array([[1.0, 0.0, 1.0, 0.0]])
    assert_allclose(fall_by_one(weight, member, mean, np.full((1, 4), 1e-6)), [math.log(2)], atol=0.005)


@pytest.mark.parametrize("apart", [0.5, 1.0, 2.0, 4.0])
def test_two_gaussians_against_scipys_quadrature(apart: float) -> None:
    share = np.array([0.7, 0.3])

    def told(z: float) -> float:
        density = share * scipy.stats.norm.pdf(z, [0.0, apart], 1.0)
        after = density / density.sum()
        return float(density.sum() * (entropy(share) - entropy(after)))

    expected, _ = scipy.integrate.quad(told, -12, 12 + apart, limit=200)
    found = fall_by_one(share, np.eye(2), np.array([[0.0, apart]]), np.ones((1, 2)))
    assert_allclose(found, [expected], atol=0.004)


@pytest.mark.parametrize("seed", range(4))
def test_one_row_against_drawn_outcomes(seed: int) -> None:
    rng = np.random.default_rng(seed)
    weight, member = mixture(rng, 40, 7)
    mean, variance = rng.normal(size=(3, 40)) * 2, rng.uniform(0.02, 0.5, (3, 40))
    found = fall_by_one(weight, member, mean, variance)
    atom = rng.choice(40, 40_000, p=weight)
    for row in range(3):
        outcome = rng.normal(mean[row, atom], np.sqrt(variance[row, atom]))
        density = scipy.stats.norm.pdf(outcome[:, None], mean[row], np.sqrt(variance[row])) * weight
        after = density @ member
        expected = entropy(weight @ member) - entropy(after / after.sum(axis=1, keepdims=True)).mean()
        assert_allclose(found[row], expected, atol=0.03)


@pytest.mark.parametrize("seed", range(3))
def test_several_rows_against_drawn_outcomes(seed: int) -> None:
    rng = np.random.default_rng(seed)
    weight, member = mixture(rng, 20, 5)
    factor = rng.normal(size=(20, 3, 3)) * 0.4
    mean, covariance = rng.normal(size=(20, 3)), factor @ np.swapaxes(factor, -1, -2) + 0.05 * np.eye(3)
    atom = rng.choice(20, 20_000, p=weight)
    drawn = mean[atom] + (np.linalg.cholesky(covariance)[atom] @ rng.normal(size=(20_000, 3, 1)))[..., 0]
    columns = [scipy.stats.multivariate_normal(m, c).pdf(drawn) for m, c in zip(mean, covariance, strict=True)]
    after = (np.stack(columns, axis=1) * weight) @ member
    expected = entropy(weight @ member) - entropy(after / after.sum(axis=1, keepdims=True)).mean()
    assert_allclose(fall_by_several(weight, member, mean, covariance), expected, atol=0.06)


@given(seed=st.integers(0, 2**32 - 1), atoms=st.integers(2, 30), spread=st.sampled_from([1e-4, 0.3, 10.0]))
def test_a_fall_lies_between_nothing_and_everything(seed: int, atoms: int, spread: float) -> None:
    rng = np.random.default_rng(seed)
    weight, member = mixture(rng, atoms, 4)
    mean, variance = rng.normal(size=(2, atoms)), np.full((2, atoms), spread**2)
    most = entropy(weight @ member) + 0.1  # so few outcomes miss a tenth of a nat at the worst
    for found in (
        fall_by_one(weight, member, mean, variance),
        fall_by_several(weight, member, mean.T, np.broadcast_to(spread**2 * np.eye(2), (atoms, 2, 2))),
    ):
        assert np.all(found >= -1e-9)
        assert np.all(found <= most)


@given(seed=st.integers(0, 2**32 - 1))
def test_what_all_causes_say_alike_tells_nothing(seed: int) -> None:
    weight, member = mixture(np.random.default_rng(seed), 12, 3)
    found = fall_by_one(weight, member, np.ones((1, 12)), np.ones((1, 12)))
    assert_allclose(found, [0.0], atol=1e-6)  # atoms of no weight are left out


def test_candidates_say_together_what_each_says_alone() -> None:
    rng = np.random.default_rng(5)
    weight, member = mixture(rng, 9, 3)
    mean, variance = rng.normal(size=(3, 9)), rng.uniform(0.1, 1, (3, 9))
    together = fall_by_one(weight, member, mean, variance)
    alone = [fall_by_one(weight, member, mean[n : n + 1], variance[n : n + 1])[0] for n in range(3)]
    assert_allclose(together, alone, rtol=1e-9)


def test_more_dimensions_than_points_still_have_points() -> None:
    assert normal_points(8, 6).shape == (8, 6)
    assert_allclose(normal_points(SAMPLES, 4).mean(axis=0), 0, atol=1e-12)
