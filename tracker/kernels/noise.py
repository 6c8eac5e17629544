"""Noise levels of motion and measurement as arrays, one row an object, one column an axis."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

SMALLEST_SIDE = 1e-12  # a coasting box can shrink to nothing and below
SMALLEST_SIGMA, LARGEST_SIGMA = 1e-50, 1e50  # beyond any length, with squares fit to reckon with

SIGMAS_OK = -1  # otherwise the status is the number of the first row with an unusable sigma


@njit(cache=True)
def axis_squares(
    objects: NDArray[np.float64], d: int, position: float, size: float, scaled: bool
) -> NDArray[np.float64]:
    """(n, d) squared noise levels: position² on the first two axes, size² on the others.

    objects : (n, ≥ d) measurements or states.   scaled : whether levels are in box scales, the
    square root of width times height (components 2 and 3).
    """
    out = np.empty((len(objects), d))
    for i in range(len(objects)):
        area = 1.0
        if scaled:
            area = max(SMALLEST_SIDE, objects[i, 2]) * max(SMALLEST_SIDE, objects[i, 3])
        for a in range(d):
            level = position if a < 2 else size
            out[i, a] = level * level * area
    return out


@njit(cache=True)
def overwrite_variances(variance: NDArray[np.float64], sigma: NDArray[np.float64]) -> int:
    """Put σ² where a σ is given (nan: none) into `variance`, both (m, d), in place.

    Returns SIGMAS_OK, or the first row with a σ that is not positive or out of all range.
    """
    for j in range(len(sigma)):
        for a in range(sigma.shape[1]):
            level = sigma[j, a]
            if np.isnan(level):
                continue
            if not (SMALLEST_SIGMA < level < LARGEST_SIGMA):
                return j
            variance[j, a] = level * level
    return SIGMAS_OK
