"""The compiled eigenvalue kernel against numpy's LAPACK."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.spectroscopy.lists.eigen_kernel import eigen_stack


def solve(matrices, sizes):
    """Values, ascending, and vectors, in columns, of a stack."""
    values, rows = np.full(matrices.shape[:2], np.inf), np.zeros(matrices.shape)
    eigen_stack(np.array(matrices, order="C"), np.asarray(sizes, dtype=np.int64), values, rows)
    order = np.argsort(values, axis=1, kind="stable")
    rows = np.take_along_axis(rows, order[:, :, np.newaxis], axis=1)
    return np.take_along_axis(values, order, axis=1), rows.swapaxes(1, 2)


@given(st.integers(1, 24), st.integers(0, 10_000))
@settings(max_examples=60, deadline=None, derandomize=True)
def test_eigen_stack_random(size, seed):
    """Random symmetric matrices: values as LAPACK's, vectors orthonormal and diagonalising."""
    matrix = np.random.default_rng(seed).normal(size=(size, size))
    matrix = matrix + matrix.T
    (values,), (vectors,) = solve(matrix[np.newaxis], [size])
    np.testing.assert_allclose(values, np.linalg.eigvalsh(matrix), atol=1e-12 * size)
    np.testing.assert_allclose(vectors.T @ vectors, np.eye(size), atol=1e-12)
    np.testing.assert_allclose(matrix @ vectors, vectors * values, atol=1e-11 * size)


@pytest.mark.parametrize(
    "matrix",
    [
        np.zeros((4, 4)),
        np.eye(5),
        np.ones((6, 6)),
        np.diag([3.0, 1.0, 2.0]),
        np.kron(np.eye(3), [[0.0, 1.0], [1.0, 0.0]]),
    ],
    ids=["zero", "unit", "rank one", "diagonal", "degenerate pairs"],
)
def test_eigen_stack_special(matrix):
    """Matrices whose reduction divides by nothing, and degenerate ones."""
    (values,), (vectors,) = solve(matrix[np.newaxis], [len(matrix)])
    np.testing.assert_allclose(values, np.linalg.eigvalsh(matrix), atol=1e-14)
    np.testing.assert_allclose(vectors @ np.diag(values) @ vectors.T, matrix, atol=1e-14)


def test_eigen_stack_sizes():
    """Only the leading block counts; the padding of the outputs is left alone."""
    matrices = np.random.default_rng(0).normal(size=(4, 5, 5))
    matrices = matrices + matrices.swapaxes(1, 2)
    values, vectors = solve(matrices, [0, 1, 3, 5])
    for matrix, size, value, vector in zip(matrices, (0, 1, 3, 5), values, vectors, strict=True):
        np.testing.assert_allclose(value[:size], np.linalg.eigvalsh(matrix[:size, :size]), atol=1e-13)
        assert np.isinf(value[size:]).all()
        assert not vector[size:].any()
        assert not vector[:, size:].any()
