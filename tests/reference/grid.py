"""Slow twins of kernels/grid.py."""

import numpy as np


def typical_extent(low, high, axis):
    """Median extent of all rectangles (the kernel may look at a sample)."""
    extent = np.sort(high[:, axis] - low[:, axis])
    return extent[len(extent) // 2] if len(extent) else 0.0


def meeting_pairs(low, high, other_low, other_high):
    """For each rectangle the indices of the others that it meets."""
    return [
        [
            j
            for j in range(len(other_low))
            if np.all(other_low[j] <= high[i]) and np.all(other_high[j] >= low[i])
        ]
        for i in range(len(low))
    ]
