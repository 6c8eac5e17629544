"""Kalman filter for positions and their rates: batches of states, updated in place.

The state of d measured components is (p_1 … p_d, v_1 … v_d), so H = [I 0] and
F = [[I, T I], [0, I]]. The covariance is a full matrix, kept exactly symmetric, in blocks:

    P = [ A   B ]     A: positions,  B: positions by rates,  C: rates
        [ Bᵀ  C ]

F, H and Q are never formed: their structure is in the loops. As long as nothing has mixed the
axes (no rotation, no correlated noise), A, B and C are diagonal; `coupled` False says so, and the
kernels then touch nothing but the diagonals. The results are the same to the last bit.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numba import njit
from numpy.typing import NDArray

Update = Callable[[NDArray, NDArray, NDArray, NDArray, NDArray, bool], int]

UPDATE_OK = -1  # otherwise the status is the number of the first state that failed


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
        # x ← F x
        for a in range(d):
            x[a] += t * x[d + a]
        if coupled:
            _spread_blocks(p, t, d)
        else:
            for a in range(d):
                v = d + a
                p[a, a] = p[a, a] + t * (p[a, v] + p[a, v]) + t * t * p[v, v]
                p[a, v] = p[a, v] + t * p[v, v]
        # P ← P + Q,  Q = q [T³/3, T²/2; T²/2, T] on each axis
        for a in range(d):
            q = spectral_density[i, a]
            p[a, a] += q * t * t * t / 3.0
            p[a, d + a] += q * t * t / 2.0
            p[d + a, a] = p[a, d + a]
            p[d + a, d + a] += q * t


@njit(cache=True)
def _spread_blocks(p: NDArray[np.float64], t: float, d: int) -> None:
    """P ← F P Fᵀ:  A ← A + T (B + Bᵀ) + T² C,  B ← B + T C."""
    for a in range(d):
        for b in range(a, d):
            block = p[a, b] + t * (p[a, d + b] + p[b, d + a]) + t * t * p[d + a, d + b]
            p[a, b] = block
            p[b, a] = block
    for a in range(d):
        for b in range(d):
            block = p[a, d + b] + t * p[d + a, d + b]
            p[a, d + b] = block
            p[d + b, a] = block


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
    scratch : (d + 2, d).

    S = H P Hᵀ + R is factored as L D Lᵀ, which needs no roots. Rows are given by number, not as
    slices: a slice costs more than the arithmetic.
    """
    d = z.shape[1]
    d2 = 0.0
    determinant = 1.0
    for a in range(d):
        # (L D) into scratch[a], 1 / D into scratch[d], y = L⁻¹ (z − H x) into scratch[d + 1]
        y = z[j, a] - mean[i, a]
        before = a if coupled else 0
        for b in range(before):
            entry = covariance[i, a, b]
            for k in range(b):
                entry -= scratch[a, k] * scratch[b, k] * scratch[d, k]
            scratch[a, b] = entry
            y -= entry * scratch[d, b] * scratch[d + 1, b]
        pivot = covariance[i, a, a] + variance[j, a]
        for k in range(before):
            pivot -= scratch[a, k] * scratch[a, k] * scratch[d, k]
        if not (0.0 < pivot < np.inf):
            return np.inf, np.inf
        scratch[d, a] = 1.0 / pivot
        scratch[d + 1, a] = y
        determinant *= pivot
        d2 += y * y / pivot  # d² = yᵀ D⁻¹ y,  det S = Π D
    return d2, np.log(determinant)


@njit(cache=True)
def _correct_axis(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    i: int,
    c: int,
    z: float,
    r: float,
) -> bool:
    """Joseph update of one axis of state i by its measured component; False if s ≤ 0."""
    v = mean.shape[1] // 2 + c
    p_cc = covariance[i, c, c]
    p_cv = covariance[i, c, v]
    p_vv = covariance[i, v, v]
    innovation_variance = p_cc + r
    if not (0.0 < innovation_variance < np.inf):
        return False
    inverse = 1.0 / innovation_variance
    gain_c = p_cc * inverse
    gain_v = p_cv * inverse
    innovation = z - mean[i, c]
    mean[i, c] += gain_c * innovation
    mean[i, v] += gain_v * innovation
    rest_c = p_cc - gain_c * p_cc - gain_c * r
    rest_v = p_cv - gain_v * p_cc - gain_v * r
    # Both halves of the symmetric entry, averaged as in the coupled update.
    upper = (p_cv - gain_c * p_cv) - rest_c * gain_v
    lower = (p_cv - gain_v * p_cc) - rest_v * gain_c
    cross = 0.5 * (lower + upper)
    covariance[i, c, c] = (p_cc - gain_c * p_cc) - rest_c * gain_c
    covariance[i, c, v] = cross
    covariance[i, v, c] = cross
    covariance[i, v, v] = (p_vv - gain_v * p_cv) - rest_v * gain_v
    return True


def _update_kernel(d: int) -> Update:
    """Build the update kernel for d measured components; a fixed d lets the compiler unroll."""
    s = 2 * d

    @njit(cache=True)
    def update(
        mean: NDArray[np.float64],
        covariance: NDArray[np.float64],
        pairing: NDArray[np.int64],
        z: NDArray[np.float64],
        variance: NDArray[np.float64],
        coupled: bool,
    ) -> int:
        """Correct states by measurements, in place, in Joseph form.

        mean, covariance : (n, 2d), (n, 2d, 2d).   pairing : (n,) the measurement that corrects
        each state, -1 for none.   z, variance : (m, d) measurements and the diagonals of R.

        R is diagonal, so the components are taken one after the other as scalars (Bierman 1977),
        which gives the same posterior without factoring S.

        Returns UPDATE_OK, or the number of the first state whose innovation variance is not
        positive; that state is left half-corrected and those behind it are not touched.
        """
        p = np.empty((s, s))
        column = np.empty(s)
        gain = np.empty(s)
        rest = np.empty(s)
        for i in range(len(pairing)):
            j = pairing[i]
            if j < 0:
                continue
            if not coupled:
                for c in range(d):
                    if not _correct_axis(mean, covariance, i, c, z[j, c], variance[j, c]):
                        return i
                continue
            for a in range(s):
                for b in range(s):
                    p[a, b] = covariance[i, a, b]
            for c in range(d):
                r = variance[j, c]
                innovation_variance = p[c, c] + r
                if not (0.0 < innovation_variance < np.inf):
                    return i
                # K = P hᵀ / s
                inverse = 1.0 / innovation_variance
                for a in range(s):
                    column[a] = p[c, a]
                    gain[a] = column[a] * inverse
                # x ← x + K (z − h x)
                innovation = z[j, c] - mean[i, c]
                for a in range(s):
                    mean[i, a] += gain[a] * innovation
                # P ← (I − K h) P (I − K h)ᵀ + K r Kᵀ (Joseph): a sum of squares, so rounding
                # cannot make it indefinite as it can P − K s Kᵀ
                for a in range(s):
                    rest[a] = column[a] - gain[a] * column[c] - gain[a] * r
                for a in range(s):
                    for b in range(s):
                        p[a, b] = (p[a, b] - gain[a] * column[b]) - rest[a] * gain[b]
            for a in range(s):
                covariance[i, a, a] = p[a, a]
                for b in range(a):
                    value = 0.5 * (p[a, b] + p[b, a])
                    covariance[i, a, b] = value
                    covariance[i, b, a] = value
        return UPDATE_OK

    return update


update_two = _update_kernel(2)
update_four = _update_kernel(4)
UPDATE_OF_DIMENSION = {2: update_two, 4: update_four}


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
