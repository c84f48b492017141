"""Stacked Gaussian densities: small matrices, many of them, in the last axes of arrays."""

from __future__ import annotations

import math

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
    lower = cholesky(covariance)
    white = forward(lower, residual[..., None])[..., 0]
    squares = (white**2).sum(axis=-1) + residual.shape[-1] * LOG_2PI
    found: Floats = -0.5 * (squares + log_determinant(lower))
    return found


def along(
    size: Floats, matrix: tuple[Floats, Floats, Floats], vector: tuple[Floats, Floats, Floats]
) -> tuple[Floats, Floats]:
    """
    Log determinant and quadratic form along a size on which matrix and vector depend as polynomials.

    Parameters
    ----------
    size : array (..., nodes)
    matrix : three arrays (..., n, n)
        Symmetric; what stands before 1, size and size². Their sum is positive definite at every node.
    vector : three arrays (..., n)
        The same of the vector.

    Returns
    -------
    tuple of arrays (..., nodes)
        ``log det M`` and ``vᵀ M⁻¹ v``.

    Notes
    -----
    A Cholesky factor by columns, each entry of which is an array over all problems and nodes: for the few rows
    of a circuit this is several times quicker than one call of LAPACK a matrix. The vector stands as a further row.

    Examples
    --------
    >>> zero, one = np.zeros((1, 1)), np.ones((1, 1))
    >>> log_determinant_, quadratic = along(np.array([2.0]), (one, zero, one), (one[0], one[0], zero[0]))
    >>> round(float(np.exp(log_determinant_[0])), 6), round(float(quadratic[0]), 6)
    (5.0, 1.8)
    """
    n = vector[0].shape[-1]
    if not n:
        return np.zeros(size.shape), np.zeros(size.shape)
    log_determinant_, quadratic = np.zeros(size.size), np.zeros(size.size)
    bordered = [
        np.moveaxis(np.concatenate([m, v[..., None, :]], axis=-2), (-2, -1), (0, 1))[..., None]
        for m, v in zip(matrix, vector, strict=True)
    ]
    constant, linear, square = bordered
    lower = np.empty((n + 1, n, size.size))
    for j in range(n):
        column = square[j:, j] * size
        column += linear[j:, j]
        column *= size
        column += constant[j:, j]
        column = column.reshape(n + 1 - j, -1)
        if j:
            column -= np.einsum("ikm,km->im", lower[j:, :j], lower[j, :j])
        log_determinant_ += np.log(column[0])
        column /= np.sqrt(column[0])
        lower[j:, j] = column
        quadratic += column[-1] ** 2
    return log_determinant_.reshape(size.shape), quadratic.reshape(size.shape)
