"""States of boxes under a transform of the image."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray


@njit(cache=True)
def warp_states(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    parameters: NDArray[np.float64],
    centre: NDArray[np.float64],
    coupled: bool,
) -> None:
    """Move states of boxes (cx, cy, w, h and their rates) with the image, in place.

    mean, covariance : (n, 8), (n, 8, 8).   Centres and their rates turn and grow, sizes grow: a
    box has no angle. Where axes are kept apart, the covariance grows only: x and y have equal
    noise there, so that turning would change it by products with the square of a small angle.
    """
    zoom = 1.0 + parameters[2]
    turn = parameters[3]
    growth = zoom * zoom
    states = mean.shape[1]
    half = states // 2
    for i in range(len(mean)):
        x = mean[i, 0] - centre[0]
        y = mean[i, 1] - centre[1]
        mean[i, 0] = centre[0] + parameters[0] + zoom * x - turn * y
        mean[i, 1] = centre[1] + parameters[1] + turn * x + zoom * y
        vx = mean[i, half]
        vy = mean[i, half + 1]
        mean[i, half] = zoom * vx - turn * vy
        mean[i, half + 1] = turn * vx + zoom * vy
        for a in range(2, half):
            mean[i, a] *= zoom
            mean[i, half + a] *= zoom
        if not coupled:
            for a in range(half):
                v = half + a
                covariance[i, a, a] *= growth
                covariance[i, v, v] *= growth
                covariance[i, a, v] *= growth
                covariance[i, v, a] *= growth
            continue
        # P ← A P Aᵀ, A in blocks of two: [zoom −turn; turn zoom] on centres and their rates
        for first in (0, half):
            for b in range(states):
                p, q = covariance[i, first, b], covariance[i, first + 1, b]
                covariance[i, first, b] = zoom * p - turn * q
                covariance[i, first + 1, b] = turn * p + zoom * q
            for b in range(states):
                p, q = covariance[i, b, first], covariance[i, b, first + 1]
                covariance[i, b, first] = zoom * p - turn * q
                covariance[i, b, first + 1] = turn * p + zoom * q
        for a in range(states):
            if a % half < 2:
                continue
            for b in range(states):
                covariance[i, a, b] *= zoom
                covariance[i, b, a] *= zoom
