"""Fixed-interval smoothing, one step back in time: batches of states, changed in place.

Rauch, Tung and Striebel 1965; Bar-Shalom, Li and Kirubarajan 2001, section 8.6 (from memory).
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

SMOOTH_OK = -1  # otherwise the status is the number of the first state that failed


@njit(cache=True)
def smooth_step(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    predicted_mean: NDArray[np.float64],
    predicted_covariance: NDArray[np.float64],
    transition: NDArray[np.float64],
    later_mean: NDArray[np.float64],
    later_covariance: NDArray[np.float64],
) -> int:
    """Turn filtered states into smoothed ones, given the smoothed states one scan later, in place.

    mean, covariance : (n, s), (n, s, s) filtered.   predicted_mean, predicted_covariance : what
    the filter predicted from them for the later scan.   transition : (n, s, s) F.
    later_mean, later_covariance : smoothed, at the later scan.

    Returns SMOOTH_OK, or the number of the first state whose prediction is not positive definite;
    that one and those behind it are left as they were.
    """
    s = mean.shape[1]
    root = np.empty((s, s))
    gain = np.empty((s, s))
    change = np.empty((s, s))
    for i in range(len(mean)):
        # P⁻ = L Lᵀ
        for a in range(s):
            for b in range(a + 1):
                value = predicted_covariance[i, a, b]
                for k in range(b):
                    value -= root[a, k] * root[b, k]
                if a == b:
                    if not (0.0 < value < np.inf):
                        return i
                    root[a, a] = np.sqrt(value)
                else:
                    root[a, b] = value / root[b, b]
        # G = P Fᵀ (P⁻)⁻¹, row by row: L Lᵀ gᵀ = F pᵀ
        for r in range(s):
            for a in range(s):
                value = 0.0
                for k in range(s):
                    value += transition[i, a, k] * covariance[i, r, k]
                gain[r, a] = value
            for a in range(s):
                for k in range(a):
                    gain[r, a] -= root[a, k] * gain[r, k]
                gain[r, a] /= root[a, a]
            for a in range(s - 1, -1, -1):
                for k in range(a + 1, s):
                    gain[r, a] -= root[k, a] * gain[r, k]
                gain[r, a] /= root[a, a]
        # x ← x + G (x_later − x⁻)
        for r in range(s):
            for k in range(s):
                mean[i, r] += gain[r, k] * (later_mean[i, k] - predicted_mean[i, k])
        # P ← P + G (P_later − P⁻) Gᵀ
        for r in range(s):
            for a in range(s):
                value = 0.0
                for k in range(s):
                    value += gain[r, k] * (
                        later_covariance[i, k, a] - predicted_covariance[i, k, a]
                    )
                change[r, a] = value
        for r in range(s):
            for c in range(r + 1):
                value = 0.0
                for k in range(s):
                    value += change[r, k] * gain[c, k]
                covariance[i, r, c] += value
                covariance[i, c, r] = covariance[i, r, c]
    return SMOOTH_OK
