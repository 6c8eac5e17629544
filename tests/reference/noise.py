"""Slow twins of kernels/noise.py."""

import math


def axis_squares(objects, d, position, size, scaled):
    """Squared noise levels as nested lists."""
    rows = []
    for one in objects:
        scale = math.sqrt(max(one[2], 1e-12) * max(one[3], 1e-12)) if scaled else 1.0
        rows.append([((position, position, size, size)[a] * scale) ** 2 for a in range(d)])
    return rows


def overwrite_variances(variance, sigma):
    """Variances where a sigma that is given replaces its variance."""
    return [
        [v if math.isnan(s) else s**2 for v, s in zip(row, levels, strict=True)]
        for row, levels in zip(variance, sigma, strict=True)
    ]
