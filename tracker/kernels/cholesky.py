"""Small dense systems with a positive definite matrix, by Cholesky's factorisation."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray


@njit(cache=True)
def factorise(matrix: NDArray) -> NDArray:
    """Cholesky factor L of a positive definite matrix, L Lᵀ."""
    n = len(matrix)
    out = np.zeros((n, n))
    for a in range(n):
        for b in range(a + 1):
            value = matrix[a, b]
            for k in range(b):
                value -= out[a, k] * out[b, k]
            out[a, b] = np.sqrt(value) if a == b else value / out[b, b]
    return out


@njit(cache=True)
def solve_factored(factor: NDArray, right: NDArray) -> NDArray:
    """x of L Lᵀ x = right."""
    n = len(right)
    out = right.copy()
    for a in range(n):
        for k in range(a):
            out[a] -= factor[a, k] * out[k]
        out[a] /= factor[a, a]
    for a in range(n - 1, -1, -1):
        for k in range(a + 1, n):
            out[a] -= factor[k, a] * out[k]
        out[a] /= factor[a, a]
    return out
