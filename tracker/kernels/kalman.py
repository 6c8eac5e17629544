"""Kalman filter for positions and their rates: batches of states, updated in place.

The state of d measured components is (p_1 … p_d, v_1 … v_d), so H = [I 0] and
F = [[I, T I], [0, I]]. The covariance is a full matrix of blocks, exactly symmetric after every step:

    P = [ A   B ]     A: positions,  B: positions by rates,  C: rates
        [ Bᵀ  C ]

F, H and Q are never formed: their structure is in the loops.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

UPDATE_OK = -1  # otherwise the status is the number of the first measurement that failed


@njit(cache=True)
def predict_constant_velocity(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    step_seconds: float,
    spectral_density: NDArray[np.float64],
) -> None:
    """Move states forward by a time step, in place.

    mean, covariance : (n, 2d), (n, 2d, 2d).   spectral_density : (n, d) q of the continuous
    white-noise acceleration (Bar-Shalom, Li and Kirubarajan 2001, ch. 6).
    """
    d = mean.shape[1] // 2
    t = step_seconds
    for i in range(len(mean)):
        x = mean[i]
        p = covariance[i]
        # x ← F x
        for a in range(d):
            x[a] += t * x[d + a]
        # A ← A + T (B + Bᵀ) + T² C
        for a in range(d):
            for b in range(a, d):
                block = p[a, b] + t * (p[a, d + b] + p[b, d + a]) + t * t * p[d + a, d + b]
                p[a, b] = block
                p[b, a] = block
        # B ← B + T C
        for a in range(d):
            for b in range(d):
                block = p[a, d + b] + t * p[d + a, d + b]
                p[a, d + b] = block
                p[d + b, a] = block
        # P ← P + Q,  Q = q [T³/3, T²/2; T²/2, T] on each axis
        for a in range(d):
            q = spectral_density[i, a]
            p[a, a] += q * t * t * t / 3.0
            p[a, d + a] += q * t * t / 2.0
            p[d + a, a] = p[a, d + a]
            p[d + a, d + a] += q * t


@njit(cache=True)
def factor_innovation(
    covariance: NDArray[np.float64], variance: NDArray[np.float64], lower: NDArray[np.float64]
) -> bool:
    """Cholesky factor of S = A + R into `lower` (d, d); False if S is not positive definite."""
    d = len(variance)
    for a in range(d):
        for b in range(a):
            s = covariance[a, b]
            for k in range(b):
                s -= lower[a, k] * lower[b, k]
            lower[a, b] = s / lower[b, b]
        pivot = covariance[a, a] + variance[a]
        for k in range(a):
            pivot -= lower[a, k] * lower[a, k]
        if not (0.0 < pivot < np.inf):
            return False
        lower[a, a] = np.sqrt(pivot)
    return True


@njit(cache=True)
def squared_mahalanobis(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
    scratch: NDArray[np.float64],
) -> tuple[float, float]:
    """d² and ln det S of one state and one measurement; (inf, inf) if S is not positive definite.

    mean, covariance : (2d,), (2d, 2d).   z, variance : (d,), (d,) diagonal of R.
    scratch : (d + 1, d).
    """
    d = len(z)
    if not factor_innovation(covariance, variance, scratch):
        return np.inf, np.inf
    # L y = z − H x,  d² = yᵀ y,  ln det S = 2 Σ ln L_aa
    y = scratch[d]
    d2 = 0.0
    determinant = 1.0
    for a in range(d):
        w = z[a] - mean[a]
        for k in range(a):
            w -= scratch[a, k] * y[k]
        y[a] = w / scratch[a, a]
        d2 += y[a] * y[a]
        determinant *= scratch[a, a]
    return d2, 2.0 * np.log(determinant)


@njit(cache=True)
def update_constant_velocity(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    rows: NDArray[np.int64],
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
) -> int:
    """Correct states by measurements, in place, in Joseph form.

    mean, covariance : (n, 2d), (n, 2d, 2d).   rows : (k,) the state that each measurement
    corrects.   z, variance : (k, d) measurements and the diagonals of R.

    Returns UPDATE_OK, or the number of the first measurement whose S is not positive definite;
    that one and those behind it are not applied.
    """
    s = mean.shape[1]
    d = s // 2
    lower = np.empty((d, d))
    gain = np.empty((s, d))
    left = np.empty((s, s))
    innovation = np.empty(d)
    for k in range(len(rows)):
        x = mean[rows[k]]
        p = covariance[rows[k]]
        r = variance[k]
        if not factor_innovation(p, r, lower):
            return k
        _gain(p, lower, gain)
        # x ← x + K (z − H x)
        for a in range(d):
            innovation[a] = z[k, a] - x[a]
        for a in range(s):
            for b in range(d):
                x[a] += gain[a, b] * innovation[b]
        # P ← (I − K H) P (I − K H)ᵀ + K R Kᵀ  (Joseph): a sum of squares, so rounding cannot make
        # it indefinite as it can P − K S Kᵀ
        for a in range(s):
            for b in range(s):
                value = p[a, b]
                for c in range(d):
                    value -= gain[a, c] * p[c, b]
                left[a, b] = value
        for a in range(s):
            for b in range(a, s):
                value = left[a, b]
                for c in range(d):
                    value += (gain[a, c] * r[c] - left[a, c]) * gain[b, c]
                p[a, b] = value
                p[b, a] = value
    return UPDATE_OK


@njit(cache=True)
def _gain(p: NDArray[np.float64], lower: NDArray[np.float64], gain: NDArray[np.float64]) -> None:
    """K = P Hᵀ S⁻¹ by two triangular solves per row, S = L Lᵀ."""
    d = len(lower)
    for a in range(len(gain)):
        for b in range(d):
            value = p[a, b]
            for c in range(b):
                value -= lower[b, c] * gain[a, c]
            gain[a, b] = value / lower[b, b]
        for b in range(d - 1, -1, -1):
            value = gain[a, b]
            for c in range(b + 1, d):
                value -= lower[c, b] * gain[a, c]
            gain[a, b] = value / lower[b, b]


@njit(cache=True)
def initiate_constant_velocity(
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
    rate_variance: NDArray[np.float64],
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
) -> None:
    """States of new tracks: at the measurement, at rest, with the rates' prior variance.

    z, variance, rate_variance : (k, d).   mean, covariance : (k, 2d), (k, 2d, 2d), overwritten.
    """
    d = z.shape[1]
    mean[:] = 0.0
    covariance[:] = 0.0
    for k in range(len(z)):
        for a in range(d):
            mean[k, a] = z[k, a]
            covariance[k, a, a] = variance[k, a]
            covariance[k, d + a, d + a] = rate_variance[k, a]
