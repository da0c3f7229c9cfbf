"""Compiled kernel: eigenvalues and vectors of a stack of small real symmetric matrices of different sizes.

LAPACK would do as well, but it starts threads on matrices that need none, which on a busy machine costs tens of
times the work itself, and it is called once per matrix. The reference it is tested against is `numpy.linalg.eigh`.
"""

from __future__ import annotations

import numpy as np
from numba import njit

__all__ = ["eigen_stack"]

_EPSILON = float(np.finfo(np.float64).eps)


@njit("void(f8[:,::1], i8, f8[::1], f8[::1], f8[:,::1])", cache=True, nogil=True)
def _tridiagonalise(a, n, diagonal, beside, rows):  # type: ignore[no-untyped-def]
    """Householder's reduction of `a` (destroyed); ``rows`` becomes the transpose of the orthogonal matrix.

    Golub and Van Loan, Matrix Computations (1996), algorithm 8.3.1.
    """
    v, w, scales = np.zeros(n), np.zeros(n), np.zeros(n)
    for k in range(n - 2):
        norm = 0.0
        for i in range(k + 1, n):
            norm += a[k, i] * a[k, i]
        norm = np.sqrt(norm)
        diagonal[k] = a[k, k]
        beside[k] = -norm if a[k, k + 1] > 0 else norm
        if norm == 0.0:
            continue
        a[k, k + 1] -= beside[k]
        square = 0.0
        for i in range(k + 1, n):
            v[i] = a[k, i]  # the row keeps v for the accumulation below
            square += v[i] * v[i]
        scales[k] = 2.0 / square
        overlap = 0.0
        for i in range(k + 1, n):
            total = 0.0
            for j in range(k + 1, n):
                total += a[i, j] * v[j]
            w[i] = scales[k] * total
            overlap += w[i] * v[i]
        overlap *= 0.5 * scales[k]
        for i in range(k + 1, n):
            w[i] -= overlap * v[i]
        for i in range(k + 1, n):
            for j in range(k + 1, n):
                a[i, j] -= v[i] * w[j] + w[i] * v[j]
    for k in range(max(0, n - 2), n):
        diagonal[k] = a[k, k]
    if n > 1:
        beside[n - 2] = a[n - 2, n - 1]
    for i in range(n):
        for j in range(n):
            rows[i, j] = 1.0 if i == j else 0.0
    for k in range(n - 3, -1, -1):
        for i in range(k + 1, n):
            total = 0.0
            for j in range(k + 1, n):
                total += rows[i, j] * a[k, j]
            total *= scales[k]
            for j in range(k + 1, n):
                rows[i, j] -= total * a[k, j]


@njit("void(i8, f8[::1], f8[::1], f8[:,::1])", cache=True, nogil=True)
def _diagonalise(n, diagonal, beside, rows):  # type: ignore[no-untyped-def]
    """Implicit QL steps with Wilkinson's shift; rows of ``rows`` end as eigenvectors, ``diagonal`` as eigenvalues.

    Dubrulle, Martin and Wilkinson (1968), Numerische Mathematik 12, 377.
    """
    for first in range(n):
        while True:
            last = first
            while last < n - 1:
                if abs(beside[last]) <= _EPSILON * (abs(diagonal[last]) + abs(diagonal[last + 1])):
                    break
                last += 1
            if last == first:
                break
            half = (diagonal[first + 1] - diagonal[first]) / (2.0 * beside[first])
            root = np.sqrt(half * half + 1.0)
            bulge = diagonal[last] - diagonal[first] + beside[first] / (half + (root if half >= 0 else -root))
            sine, cosine, lowered, split = 1.0, 1.0, 0.0, False
            for i in range(last - 1, first - 1, -1):
                f, b = sine * beside[i], cosine * beside[i]
                root = np.sqrt(f * f + bulge * bulge)
                beside[i + 1] = root
                if root == 0.0:
                    diagonal[i + 1] -= lowered
                    split = True
                    break
                sine, cosine = f / root, bulge / root
                bulge = diagonal[i + 1] - lowered
                root = (diagonal[i] - bulge) * sine + 2.0 * cosine * b
                lowered = sine * root
                diagonal[i + 1] = bulge + lowered
                bulge = cosine * root - b
                for j in range(n):
                    f = rows[i + 1, j]
                    rows[i + 1, j] = sine * rows[i, j] + cosine * f
                    rows[i, j] = cosine * rows[i, j] - sine * f
            if last < n - 1:
                beside[last] = 0.0
            if not split:
                diagonal[first] -= lowered
                beside[first] = bulge


@njit("void(f8[:,:,::1], i8[::1], f8[:,::1], f8[:,:,::1])", cache=True, nogil=True)
def eigen_stack(matrices, sizes, values, rows):  # type: ignore[no-untyped-def]
    """Fill ``values`` (stack, n) and ``rows`` (stack, n, n; eigenvectors as rows), in no particular order.

    Of matrix i only the first ``sizes[i]`` rows and columns count, and of the outputs only as many are written;
    ``matrices`` is destroyed.
    """
    for i in range(sizes.size):
        n = sizes[i]
        if n > 0:
            beside = np.zeros(n)
            _tridiagonalise(matrices[i], n, values[i], beside, rows[i])
            _diagonalise(n, values[i], beside, rows[i])
