"""Copies of the part of the state that users see."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray


@njit(cache=True)
def measured_part(
    mean: NDArray[np.float64], covariance: NDArray[np.float64], d: int
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """(n, d) measured components, (n, d) their rates, (n, d, d) covariance of the former."""
    count = len(mean)
    estimate = np.empty((count, d))
    rate = np.empty((count, d))
    spread = np.empty((count, d, d))
    for i in range(count):
        for a in range(d):
            estimate[i, a] = mean[i, a]
            rate[i, a] = mean[i, d + a]
            for b in range(d):
                spread[i, a, b] = covariance[i, a, b]
    return estimate, rate, spread
