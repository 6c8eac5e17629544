"""How much of each box is to be seen, where boxes hide one another."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.grid import meeting_pairs


@njit(cache=True)
def visible_shares(
    mean: NDArray[np.float64], hides: NDArray[np.bool_], limit: int
) -> NDArray[np.float64]:
    """(n,) share of each box that no single nearer box covers.

    mean : (n, ≥ 4) boxes by their centre, y downwards.   hides : (n,) boxes that may hide others.
    limit : most pairs of boxes that are looked at; beyond, the last boxes count as seen.

    Nearer is who stands lower in the image: for upright objects on a common ground, seen from
    above it.
    """
    count = len(mean)
    low = np.empty((count, 2))
    high = np.empty((count, 2))
    for i in range(count):
        for k in range(2):
            half = 0.5 * max(mean[i, 2 + k], 0.0)
            low[i, k] = mean[i, k] - half
            high[i, k] = mean[i, k] + half
    front = np.flatnonzero(hides)
    start, other = meeting_pairs(low, high, low[front], high[front], limit)
    out = np.ones(count)
    for i in range(count):
        area = (high[i, 0] - low[i, 0]) * (high[i, 1] - low[i, 1])
        for e in range(start[i], start[i + 1]):
            j = front[other[e]]
            if j == i or high[j, 1] <= high[i, 1] or area <= 0.0:
                continue
            width = min(high[i, 0], high[j, 0]) - max(low[i, 0], low[j, 0])
            height = min(high[i, 1], high[j, 1]) - max(low[i, 1], low[j, 1])
            if width > 0.0 and height > 0.0:
                out[i] = min(out[i], 1.0 - width * height / area)
    return out
