"""Intersection over union of axis-aligned boxes given by centre and size."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

# Sizes below this are treated as this, so that a degenerate prediction has an area.
SMALLEST_SIZE = 1e-9


@njit(cache=True)
def box_overlap(a: NDArray[np.float64], i: int, b: NDArray[np.float64], j: int) -> float:
    """IoU in [0, 1] of boxes a[i] and b[j], both (cx, cy, w, h, …)."""
    aw = max(a[i, 2], SMALLEST_SIZE)
    ah = max(a[i, 3], SMALLEST_SIZE)
    bw = max(b[j, 2], SMALLEST_SIZE)
    bh = max(b[j, 3], SMALLEST_SIZE)
    width = min(a[i, 0] + 0.5 * aw, b[j, 0] + 0.5 * bw) - max(
        a[i, 0] - 0.5 * aw, b[j, 0] - 0.5 * bw
    )
    height = min(a[i, 1] + 0.5 * ah, b[j, 1] + 0.5 * bh) - max(
        a[i, 1] - 0.5 * ah, b[j, 1] - 0.5 * bh
    )
    if width <= 0.0 or height <= 0.0:
        return 0.0
    shared = width * height
    return min(1.0, shared / (aw * ah + bw * bh - shared))


@njit(cache=True)
def overlap_matrix(a: NDArray[np.float64], b: NDArray[np.float64]) -> NDArray[np.float64]:
    """(n, m) IoU of all pairs of (n, 4) and (m, 4) boxes (cx, cy, w, h)."""
    out = np.empty((len(a), len(b)))
    for i in range(len(a)):
        for j in range(len(b)):
            out[i, j] = box_overlap(a, i, b, j)
    return out
