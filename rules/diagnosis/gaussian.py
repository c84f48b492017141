"""Stacked Gaussian densities: small matrices, many of them, in the last axes of arrays."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from rules.diagnosis.shape import Floats

LOG_2PI = math.log(2 * math.pi)


def cholesky(matrix: Floats) -> Floats:
    """Lower Cholesky factors of stacked positive-definite matrices (..., n, n)."""
    return np.asarray(np.linalg.cholesky(matrix), dtype=np.float64)


def forward(lower: Floats, right: Floats) -> Floats:
    """
    Solve ``lower @ z = right`` for stacked triangular matrices.

    Parameters
    ----------
    lower : array (..., n, n)
        Lower triangles, as of ``numpy.linalg.cholesky``.
    right : array (..., n, k)
        Right-hand sides.

    Returns
    -------
    array (..., n, k)

    Examples
    --------
    >>> forward(np.array([[2.0, 0.0], [1.0, 4.0]]), np.array([[2.0], [9.0]])).ravel().tolist()
    [1.0, 2.0]
    """
    solved = np.empty(np.broadcast_shapes(lower.shape[:-2], right.shape[:-2]) + right.shape[-2:])
    for row in range(lower.shape[-1]):
        before = right[..., row, :]
        if row:
            before = before - (lower[..., row, None, :row] @ solved[..., :row, :])[..., 0, :]
        solved[..., row, :] = before / lower[..., row, row, None]
    return solved


def log_determinant(lower: Floats) -> Floats:
    """Log determinant (...) of the matrices whose Cholesky factors (..., n, n) are given."""
    found: Floats = 2 * np.log(np.diagonal(lower, axis1=-2, axis2=-1)).sum(axis=-1)
    return found


@dataclass(frozen=True, slots=True, eq=False)
class Whitener:
    """Stacked covariances, factored once for all that is asked of them."""

    inverse: Floats
    """(..., n, n): of the lower Cholesky factors; what it multiplies becomes white."""
    log_scale: Floats
    """(...): log of the Gaussian's density at its mean."""

    def log_density(self, residual: Floats) -> Floats:
        """Log density (...) of what lies so far from the mean (..., n)."""
        found: Floats = self.log_scale - 0.5 * ((self.inverse @ residual[..., None]) ** 2).sum(axis=(-2, -1))
        return found

    @property
    def precision(self) -> Floats:
        """(..., n, n): inverses of the covariances."""
        found: Floats = np.swapaxes(self.inverse, -1, -2) @ self.inverse
        return found


def whitener(covariance: Floats) -> Whitener:
    """Covariances (..., n, n), positive definite, as what makes their Gaussians white."""
    lower = cholesky(covariance)
    rows = lower.shape[-1]
    scale = -0.5 * (log_determinant(lower) + rows * LOG_2PI)
    return Whitener(forward(lower, np.broadcast_to(np.eye(rows), lower.shape)), scale)


def log_density(residual: Floats, covariance: Floats) -> Floats:
    """
    Log density of Gaussians with mean zero.

    Parameters
    ----------
    residual : array (..., n)
    covariance : array (..., n, n)
        Positive definite.

    Returns
    -------
    array (...)

    Examples
    --------
    >>> round(float(log_density(np.array([0.0]), np.array([[1.0]]))), 6)
    -0.918939
    """
    return whitener(covariance).log_density(residual)


def along(size: Floats, matrix: Sequence[Floats], vector: Sequence[Floats]) -> tuple[Floats, Floats]:
    """
    Log determinant and quadratic form along a size on which matrix and vector depend as polynomials.

    Parameters
    ----------
    size : array (..., nodes)
    matrix : arrays (..., n, n)
        Symmetric; what stands before 1, size, size² and so on. Their sum is positive definite at every node.
    vector : arrays (..., n)
        The same of the vector.

    Returns
    -------
    tuple of arrays (..., nodes)
        ``log det M`` and ``vᵀ M⁻¹ v``.

    Notes
    -----
    Elimination by columns, each entry of which is an array over all problems and nodes: for the few rows of a circuit
    this is several times quicker than one call of LAPACK a matrix. The vector stands as a further row.

    Examples
    --------
    >>> zero, one = np.zeros((1, 1)), np.ones((1, 1))
    >>> log_determinant_, quadratic = along(np.array([2.0]), (one, zero, one), (one[0], one[0]))
    >>> round(float(np.exp(log_determinant_[0])), 6), round(float(quadratic[0]), 6)
    (5.0, 1.8)
    """
    n = vector[0].shape[-1]
    if not n:
        return np.zeros(size.shape), np.zeros(size.shape)
    stack = range(vector[0].ndim - 1)
    matrix = [entry.transpose(-2, -1, *stack)[..., None] for entry in matrix]
    vector = [entry.transpose(-1, *stack)[..., None] for entry in vector]
    columns, pivots = np.empty((n, n + 1, size.size)), np.empty((n, size.size))
    for j in range(n):
        column = columns[j, j:]
        shaped = column.reshape(n + 1 - j, *size.shape)
        _polynomial(size, [entry[j:, j] for entry in matrix], shaped[:-1])
        _polynomial(size, [entry[j] for entry in vector], shaped[-1])
        if j:
            column -= np.einsum("kim,km->im", columns[:j, j:], columns[:j, j] / pivots[:j])
        pivots[j] = column[0]
    quadratic = (columns[:, -1] ** 2 / pivots).sum(axis=0)
    return np.log(pivots, out=pivots).sum(axis=0).reshape(size.shape), quadratic.reshape(size.shape)


def _polynomial(size: Floats, coefficients: Sequence[Floats], out: Floats) -> None:
    """A polynomial in the size by Horner's rule, lowest order first."""
    *lower, first, highest = coefficients
    np.multiply(size, highest, out=out)
    out += first
    for coefficient in reversed(lower):
        out *= size
        out += coefficient
