"""Correct tracks by the probability-weighted combination of all their candidates.

Probabilistic data association (Bar-Shalom and Tse 1975; joint: Fortmann, Bar-Shalom and Scheffe
1983). With probability β_j the state was corrected by detection j, with β_0 by none; the
posterior is that mixture, replaced by the Gaussian of the same mean and covariance:

    x_j = x + K_j (z_j − H x)            P_j = (I − K_j H) P (I − K_j H)ᵀ + K_j R_j K_jᵀ
    x̂ = β_0 x + Σ β_j x_j
    P̂ = β_0 P + Σ β_j P_j + β_0 (x − x̂)(x − x̂)ᵀ + Σ β_j (x_j − x̂)(x_j − x̂)ᵀ

Where all detections share one R, and so one S and K, this is the form in the textbooks:

    ν = Σ β_j ν_j,   x̂ = x + K ν
    P̂ = β_0 P + (1 − β_0) (P − K S Kᵀ) + K (Σ β_j ν_j ν_jᵀ − ν νᵀ) Kᵀ

The first form holds for any R, and is a sum of positive terms: P̂ stays positive definite.

Known limits. Tracks that stay close share their detections, and their means are drawn together
(coalescence). What an empty gate says about where the object is not is left out: under "none" the
covariance is the prediction's. The mixture's shape is lost, two far peaks become one wide one.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.kalman import UPDATE_OK, update_constant_velocity


class Mixture(NamedTuple):
    """What may have corrected each state, and with which probability; CSR."""

    start: NDArray[np.int64]  # (n + 1,) first alternative of each state
    detection: NDArray[np.int64]  # (K,)
    weight: NDArray[np.float64]  # (K,) β_j; what is missing to 1 in a row is β_0


@njit(cache=True)
def joint_update(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    mixture: Mixture,
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
) -> int:
    """Correct states of positions and rates by mixtures of measurements, in place.

    mean, covariance : (n, 2d), (n, 2d, 2d) full matrices, d of 2 or 4; the second term in P̂
    correlates axes.   z, variance : (m, d) measurements and the diagonals of R.

    Returns UPDATE_OK, or the number of the first state with an innovation variance that is not
    positive; that state and those behind it are not touched.
    """
    s = mean.shape[1]
    start = mixture.start
    most = 0
    for i in range(len(mean)):
        most = max(most, start[i + 1] - start[i])
    x = np.empty((most, s))
    p = np.empty((most, s, s))
    beta = np.empty(most)
    pairing = np.empty(most, np.int64)
    for i in range(len(mean)):
        count = 0
        none = 1.0
        for k in range(start[i], start[i + 1]):
            if mixture.weight[k] > 0.0:
                x[count] = mean[i]
                p[count] = covariance[i]
                pairing[count] = mixture.detection[k]
                beta[count] = mixture.weight[k]
                none -= beta[count]
                count += 1
        if count == 0:
            continue
        # x_j, P_j: the ordinary correction under each alternative
        status = update_constant_velocity(x[:count], p[:count], pairing[:count], z, variance, True)
        if status != UPDATE_OK:
            return i
        _combine(mean, covariance, i, max(0.0, none), beta[:count], x, p)
    return UPDATE_OK


@njit(cache=True)
def _combine(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    i: int,
    none: float,
    beta: NDArray[np.float64],
    x: NDArray[np.float64],
    p: NDArray[np.float64],
) -> None:
    """Mean and covariance of the mixture, into state i."""
    s = mean.shape[1]
    shift = np.zeros(s)  # x̂ − x
    for j in range(len(beta)):
        for a in range(s):
            x[j, a] -= mean[i, a]  # from here on x_j − x
            shift[a] += beta[j] * x[j, a]
    for a in range(s):
        for b in range(a + 1):
            value = none * (covariance[i, a, b] + shift[a] * shift[b])
            for j in range(len(beta)):
                spread = (x[j, a] - shift[a]) * (x[j, b] - shift[b])
                value += beta[j] * (p[j, a, b] + spread)
            covariance[i, a, b] = value
            covariance[i, b, a] = value
    for a in range(s):
        mean[i, a] += shift[a]
