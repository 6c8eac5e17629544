"""How much likelier a track's detections are as the continuation of an earlier track.

The detections of the later track say exp(−½ xᵀ J x + hᵀ x) of its first state x (the two-filter
form of smoothing: Fraser and Potter 1969; from memory). Integrated against the state that the
earlier track predicts, and against that of a new object, this gives a ratio of evidences.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

LINK_OK = -1  # otherwise the status is the number of the first pair that failed


@njit(cache=True)
def link_evidence(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    later: NDArray[np.int64],
    origin: NDArray[np.float64],
    information: NDArray[np.float64],
    weighted: NDArray[np.float64],
    start_covariance: NDArray[np.float64],
    evidence: NDArray[np.float64],
    distance: NDArray[np.float64],
) -> int:
    """ln ∫ N(x; mean, covariance) exp(−½ xᵀ J x + hᵀ x) dx and d² of pairs.

    mean, covariance : (E, s), (E, s, s) what the earlier track of each pair predicts.
    later : (E,) its later track.   origin : (P, d) where each later track starts; positions count
    from there, so that large coordinates spoil nothing.   information, weighted : (P, s, s) J and
    (P, s) h.   start_covariance : (P, d, d) of `origin`.
    evidence, distance : (E,), overwritten: the integral's logarithm; squared Mahalanobis distance
    of the predicted position from `origin`.

    Returns LINK_OK, or the number of the first pair with a matrix that is not positive definite.
    """
    s = mean.shape[1]
    d = origin.shape[1]
    root = np.empty((s, s))
    inverse = np.empty((s, s))
    total = np.empty((s, s))
    f = np.empty(s)
    y = np.empty(s)
    for e in range(len(later)):
        j = later[e]
        for a in range(s):
            f[a] = mean[e, a] - (origin[j, a] if a < d else 0.0)
        for a in range(d):
            y[a] = f[a]
            for b in range(d):
                total[a, b] = covariance[e, a, b] + start_covariance[j, a, b]
        if not _factor(total, d, root):
            return e
        distance[e] = _squares(root, y, d)
        # F⁻¹ f, fᵀ F⁻¹ f and ln |F|
        for a in range(s):
            y[a] = f[a]
            for b in range(s):
                total[a, b] = covariance[e, a, b]
        if not _factor(total, s, root):
            return e
        value = -_log_determinant(root, s) - _squares(root, y, s)
        _invert(root, s, inverse)
        # M = F⁻¹ + J,  y = F⁻¹ f + h
        for a in range(s):
            y[a] = weighted[j, a]
            for b in range(s):
                y[a] += inverse[a, b] * f[b]
                total[a, b] = inverse[a, b] + information[j, a, b]
        if not _factor(total, s, root):
            return e
        evidence[e] = 0.5 * (value - _log_determinant(root, s) + _squares(root, y, s))
    return LINK_OK


@njit(cache=True)
def _factor(matrix: NDArray[np.float64], s: int, root: NDArray[np.float64]) -> bool:
    """Lower L with L Lᵀ = matrix; False if it is not positive definite."""
    for a in range(s):
        for b in range(a + 1):
            value = matrix[a, b]
            for k in range(b):
                value -= root[a, k] * root[b, k]
            if a == b:
                if not (0.0 < value < np.inf):
                    return False
                root[a, a] = np.sqrt(value)
            else:
                root[a, b] = value / root[b, b]
    return True


@njit(cache=True)
def _squares(root: NDArray[np.float64], y: NDArray[np.float64], s: int) -> float:
    """yᵀ (L Lᵀ)⁻¹ y; y is overwritten."""
    total = 0.0
    for a in range(s):
        for k in range(a):
            y[a] -= root[a, k] * y[k]
        y[a] /= root[a, a]
        total += y[a] * y[a]
    return total


@njit(cache=True)
def _log_determinant(root: NDArray[np.float64], s: int) -> float:
    total = 0.0
    for a in range(s):
        total += np.log(root[a, a])
    return 2.0 * total


@njit(cache=True)
def _invert(root: NDArray[np.float64], s: int, inverse: NDArray[np.float64]) -> None:
    """(L Lᵀ)⁻¹, column by column."""
    for c in range(s):
        for a in range(s):
            inverse[a, c] = 1.0 if a == c else 0.0
            for k in range(a):
                inverse[a, c] -= root[a, k] * inverse[k, c]
            inverse[a, c] /= root[a, a]
        for a in range(s - 1, -1, -1):
            for k in range(a + 1, s):
                inverse[a, c] -= root[k, a] * inverse[k, c]
            inverse[a, c] /= root[a, a]
