"""Stacked densities against scipy and numpy, one matrix at a time."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.stats
from hypothesis import given
from hypothesis import strategies as st
from numpy.testing import assert_allclose

from rules.diagnosis.gaussian import along, cholesky, forward, log_density, log_determinant
from rules.diagnosis.shape import Floats


def positive(rng: np.random.Generator, *shape: int) -> Floats:
    """Random covariances (..., n, n)."""
    factor = rng.normal(size=(*shape, shape[-1] + 2))
    return np.asarray(factor @ np.swapaxes(factor, -1, -2) + 0.1 * np.eye(shape[-1]))


@given(seed=st.integers(0, 2**32 - 1), n=st.integers(1, 9), scale=st.sampled_from([1e-3, 1.0, 50.0]))
def test_log_density_is_scipys(seed: int, n: int, scale: float) -> None:
    rng = np.random.default_rng(seed)
    covariance = positive(rng, 3, n) * scale**2
    residual = rng.normal(size=(3, n)) * scale
    expected = [scipy.stats.multivariate_normal(None, c).logpdf(r) for r, c in zip(residual, covariance, strict=True)]
    assert_allclose(log_density(residual, covariance), expected, rtol=1e-10, atol=1e-10)


@given(seed=st.integers(0, 2**32 - 1), n=st.integers(1, 8))
def test_forward_solves_triangles(seed: int, n: int) -> None:
    rng = np.random.default_rng(seed)
    lower = cholesky(positive(rng, 4, n))
    right = rng.normal(size=(4, n, 3))
    assert_allclose(forward(lower, right), np.linalg.solve(lower, right), rtol=1e-9, atol=1e-12)
    assert_allclose(log_determinant(lower), 2 * np.linalg.slogdet(lower)[1], rtol=1e-12, atol=1e-12)


@given(seed=st.integers(0, 2**32 - 1), n=st.integers(1, 7))
def test_along_a_size_it_is_numpys_at_every_node(seed: int, n: int) -> None:
    rng = np.random.default_rng(seed)
    constant, square = positive(rng, 2, 3, n), positive(rng, 2, 3, n)
    linear = rng.normal(size=(2, 3, n, n)) * 0.05
    linear = linear + np.swapaxes(linear, -1, -2)
    vectors = rng.normal(size=(3, 2, 3, n))
    size = rng.uniform(0, 2, size=(2, 3, 5))
    determinants, quadratics = along(size, (constant, linear, square), (vectors[0], vectors[1], vectors[2]))
    x = size[..., None]
    matrix = constant[:, :, None] + x[..., None] * (linear[:, :, None] + x[..., None] * square[:, :, None])
    vector = vectors[0][:, :, None] + x * (vectors[1][:, :, None] + x * vectors[2][:, :, None])
    assert_allclose(determinants, np.linalg.slogdet(matrix)[1], rtol=1e-9, atol=1e-9)
    solved = np.linalg.solve(matrix, vector[..., None])[..., 0]
    assert_allclose(quadratics, (vector * solved).sum(axis=-1), rtol=1e-9, atol=1e-9)


def test_along_without_columns_adds_nothing() -> None:
    """A place that no reading reaches."""
    matrix, vector = np.zeros((2, 0, 0)), np.zeros((2, 0))
    determinants, quadratics = along(np.ones((2, 4)), (matrix,) * 3, (vector,) * 3)
    assert determinants.tolist() == quadratics.tolist() == np.zeros((2, 4)).tolist()


def test_a_covariance_that_is_none_is_refused() -> None:
    with pytest.raises(np.linalg.LinAlgError):
        log_density(np.zeros(2), np.array([[1.0, 2.0], [2.0, 1.0]]))
