"""Slow twins of kernels/grid.py."""

import numpy as np


def typical_extent(low, high, axis):
    """Median extent of all rectangles (the kernel may look at a sample)."""
    extent = np.sort(high[:, axis] - low[:, axis])
    return extent[len(extent) // 2] if len(extent) else 0.0


def build_grid(low, high, cell):
    """Cells (x, y) → rectangles that touch them."""
    cells = {}
    for j in range(len(low)):
        first = np.floor(low[j] / cell).astype(int)
        last = np.floor(high[j] / cell).astype(int)
        for x in range(first[0], last[0] + 1):
            for y in range(first[1], last[1] + 1):
                cells.setdefault((x, y), []).append(j)
    return cells


def meeting(low, high, other_low, other_high):
    """Indices of the other rectangles that meet one."""
    return [
        j
        for j in range(len(other_low))
        if np.all(other_low[j] <= high) and np.all(other_high[j] >= low)
    ]
