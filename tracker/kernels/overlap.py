"""Overlap of axis-aligned boxes given by centre and size: IoU and its generalisation."""

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


@njit(cache=True)
def generalised_overlap(a: NDArray[np.float64], b: NDArray[np.float64]) -> NDArray[np.float64]:
    """(E,) generalised IoU in (-1, 1] of (E, ≥ 4) boxes, pair by pair.

    IoU minus the share of the common bounding box that neither covers (Rezatofighi et al. 2019),
    so that boxes that do not touch still differ by how far apart they are.
    """
    out = np.empty(len(a))
    for e in range(len(a)):
        aw, ah = max(a[e, 2], SMALLEST_SIZE), max(a[e, 3], SMALLEST_SIZE)
        bw, bh = max(b[e, 2], SMALLEST_SIZE), max(b[e, 3], SMALLEST_SIZE)
        shared = box_overlap(a, e, b, e)
        # IoU = s / (A + B − s), so the union is (A + B) / (1 + IoU).
        union = (aw * ah + bw * bh) / (1.0 + shared)
        width = max(a[e, 0] + 0.5 * aw, b[e, 0] + 0.5 * bw) - min(
            a[e, 0] - 0.5 * aw, b[e, 0] - 0.5 * bw
        )
        height = max(a[e, 1] + 0.5 * ah, b[e, 1] + 0.5 * bh) - min(
            a[e, 1] - 0.5 * ah, b[e, 1] - 0.5 * bh
        )
        around = width * height
        out[e] = shared - (around - union) / around
    return out
