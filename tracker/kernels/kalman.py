"""Kalman filter for positions and their rates: batches of states, changed in place.

The state of d measured components is (p_1 … p_d, v_1 … v_d), so H = [I 0] and
F = [[I, T I], [0, I]]. The covariance is a full matrix, symmetric to the last bit, in blocks:

    P = [ A   B ]     A: positions,  B: positions by rates,  C: rates
        [ Bᵀ  C ]

F, H and Q are never formed: their structure is in the loops. As long as nothing has mixed the
axes (no rotation, no correlated noise), A, B and C are diagonal; `coupled` False says so, and the
kernels then touch nothing but the diagonals. The results are the same to the last bit.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

UPDATE_OK = -1  # otherwise the status is the number of the first state that failed

# Where a position is known far better than what a coast adds to it (to 1e-6, then 1000 s at a
# speed known to 1), P_pp is T² P_vv plus something below its last bit, and rounding alone makes P
# indefinite. A prediction therefore grows variances by this part: many times what rounding can
# take, yet not 2e-8 in a million predictions.
ROUNDING_ALLOWANCE = 64 * 2.0**-52

# Covariances between axes that die away are cut here, before their products become subnormal
# numbers, with which the processor is fifty times slower.
NEGLIGIBLE = 1e-150


@njit(cache=True)
def predict_constant_velocity(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    step_seconds: float,
    spectral_density: NDArray[np.float64],
    coupled: bool,
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
        for a in range(d):
            # x ← F x
            x[a] += t * x[d + a]
            # P ← F P Fᵀ:  A ← A + T (B + Bᵀ + T C),  B ← B + T C,  Bᵀ ← Bᵀ + T C
            for b in range(0 if coupled else a, d if coupled else a + 1):
                c = t * p[d + a, d + b]
                p[a, b] += t * (p[a, d + b] + p[d + a, b] + c)
                p[a, d + b] += c
                p[d + a, b] += c
        # P ← P + Q,  Q = q [T³/3, T²/2; T²/2, T] on each axis
        for a in range(d):
            q = spectral_density[i, a] * t
            p[a, a] += q * t * t / 3.0 + ROUNDING_ALLOWANCE * p[a, a]
            p[a, d + a] += q * t / 2.0
            p[d + a, a] = p[a, d + a]
            p[d + a, d + a] += q + ROUNDING_ALLOWANCE * p[d + a, d + a]


@njit(cache=True)
def bound_shrinking(mean: NDArray[np.float64], first: int, step_seconds: float) -> None:
    """Let no size of a predicted box fall below half of what it was, in place.

    mean : (n, 2d) just predicted; components from `first` on are sizes. A size that would shrink
    further is held at half and its rate becomes 0: a box that coasts does not turn inside out.
    """
    d = mean.shape[1] // 2
    for i in range(len(mean)):
        for a in range(first, d):
            half = 0.5 * (mean[i, a] - step_seconds * mean[i, d + a])
            if mean[i, a] < half:
                mean[i, a] = half
                mean[i, d + a] = 0.0


@njit(cache=True)
def update_constant_velocity(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    pairing: NDArray[np.int64],
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
    coupled: bool,
) -> int:
    """Correct states by measurements, in place, in Joseph form.

    mean, covariance : (n, 2d), (n, 2d, 2d).   pairing : (n,) the measurement that corrects each
    state, -1 for none.   z, variance : (m, d) measurements and the diagonals of R.

    Returns UPDATE_OK, or the number of the first state whose S is not positive definite; that
    one is then half corrected, those behind it not at all.

    As R is diagonal, the components of a measurement can be taken one after the other (Bierman
    1977; from memory): same result, no matrix to invert. The s of component c is the c-th pivot
    of S, so S is positive definite if and only if all of them are positive.
    """
    states = mean.shape[1]
    d = states // 2
    pc = np.zeros(states)
    for i in range(len(pairing)):
        j = pairing[i]
        if j < 0:
            continue
        for c in range(d):
            # h = e_c,  s = hᵀ P h + r,  gain = P h / s
            r = variance[j, c]
            s = covariance[i, c, c] + r
            if not (0.0 < s < np.inf):
                return i
            inverse = 1.0 / s
            # x ← x + gain (z − hᵀ x)
            step = (z[j, c] - mean[i, c]) * inverse
            # P ← (I − gain hᵀ) P (I − gain hᵀ)ᵀ + gain r gainᵀ  (Joseph), multiplied out:
            # P_ab ← P_ab − P_ac P_cb / s  off row and column c, and on them
            # P_cb ← (r / s) P_cb,  as 1 − gain_c = r / s, which no subtraction can spoil
            keep = r * inverse
            if coupled:
                for a in range(states):
                    pc[a] = covariance[i, c, a] if abs(covariance[i, c, a]) > NEGLIGIBLE else 0.0
                for a in range(states):
                    mean[i, a] += pc[a] * step
                for a in range(states):
                    for b in range(states):
                        covariance[i, a, b] -= pc[a] * pc[b] * inverse
                for a in range(states):
                    covariance[i, a, c] = pc[a] * keep
                    covariance[i, c, a] = covariance[i, a, c]
            else:
                v = d + c
                cross = covariance[i, c, v]
                mean[i, c] += covariance[i, c, c] * step
                mean[i, v] += cross * step
                covariance[i, v, v] -= cross * cross * inverse
                covariance[i, c, c] *= keep
                covariance[i, c, v] = cross * keep
                covariance[i, v, c] = cross * keep
    return UPDATE_OK


@njit(cache=True)
def squared_mahalanobis(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    i: int,
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
    j: int,
    scratch: NDArray[np.float64],
    coupled: bool,
) -> tuple[float, float]:
    """d² and ln det S of state i and measurement j; (inf, inf) if S is not positive definite.

    mean, covariance : (n, s), (n, s, s).   z, variance : (m, d), (m, d) diagonals of R.
    scratch : (d + 2, d).   Rows are given by number: a slice costs more than the arithmetic.
    """
    d = z.shape[1]
    d2 = 0.0
    determinant = 1.0
    log_determinant = 0.0
    for a in range(d):
        # S = A + R = L D Lᵀ, L unit lower: the Cholesky factorisation without its roots.
        # L y = z − H x,  d² = Σ y_a² / D_a,  ln det S = Σ ln D_a
        # scratch: L in the first d rows, then 1 / D, then y
        before = a if coupled else 0
        for b in range(before):
            scaled = covariance[i, a, b]  # L_ab D_b
            for k in range(b):
                scaled -= scratch[a, k] * scratch[b, k]
            scratch[a, b] = scaled
        y = z[j, a] - mean[i, a]
        pivot = covariance[i, a, a] + variance[j, a]
        for b in range(before):
            scaled = scratch[a, b]
            scratch[a, b] = scaled * scratch[d, b]
            pivot -= scratch[a, b] * scaled
            y -= scratch[a, b] * scratch[d + 1, b]
        if not (0.0 < pivot < np.inf):
            return np.inf, np.inf
        inverse = 1.0 / pivot
        scratch[d, a] = inverse
        scratch[d + 1, a] = y
        d2 += y * y * inverse
        determinant *= pivot
        if not (1e-150 < determinant < 1e150):  # one logarithm as a rule, more at the extremes
            log_determinant += np.log(determinant)
            determinant = 1.0
    return d2, log_determinant + np.log(determinant)


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
