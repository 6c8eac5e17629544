"""Noise levels of motion and measurement as arrays, one row an object, one column an axis."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

SMALLEST_AREA = 1e-12


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
            area = max(SMALLEST_AREA, objects[i, 2]) * max(SMALLEST_AREA, objects[i, 3])
        for a in range(d):
            level = position if a < 2 else size
            out[i, a] = level * level * area
    return out
