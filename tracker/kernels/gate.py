"""Gating: which track-detection pairs are considered, in time linear in how many there are."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.grid import SAMPLE, meeting_pairs
from tracker.kernels.kalman import squared_mahalanobis
from tracker.kernels.overlap import SMALLEST_SIZE, box_overlap

GATE_OK = 0
GATE_TOO_MANY = 1  # more candidates than the limit
GATE_NOT_POSITIVE = 2  # an innovation covariance is not positive definite


class Candidates(NamedTuple):
    """Pairs inside the gate, row by row (CSR); columns increase within a row."""

    start: NDArray[np.int64]  # (n + 1,) first candidate of each track
    column: NDArray[np.int64]  # (E,) detection
    distance: NDArray[np.float64]  # (E,) d², squared Mahalanobis distance
    log_volume: NDArray[np.float64]  # (E,) ln det S
    overlap: NDArray[np.float64]  # (E,) IoU of boxes, else 0


@njit(cache=True)
def gate_candidates(
    mean: NDArray[np.float64],
    covariance: NDArray[np.float64],
    z: NDArray[np.float64],
    variance: NDArray[np.float64],
    threshold: float,
    overlap_floor: float,
    boxes: bool,
    coupled: bool,
    limit: int,
) -> tuple[int, int, Candidates]:
    """Find all pairs with d² ≤ threshold and IoU ≥ overlap_floor.

    Parameters
    ----------
    mean, covariance : (n, s), (n, s, s) predicted states, measured components first.
    z, variance : (m, d) detections and their measurement variances (diagonal R).
    threshold : gate on d², inf for none.   overlap_floor : IoU above 0, or 0 for none.
    boxes : whether components are (cx, cy, w, h).   coupled : whether axes may be correlated.
    limit : most candidates.

    Returns
    -------
    status (GATE_OK, …), the row it concerns, Candidates.

    A pair can only pass if the axis-aligned rectangles around track and detection meet: half
    extents √(γ P_kk) and √(γ R_kk), since |Δ_k| ≤ √(γ (P_kk + R_kk)); or the boxes themselves
    where an overlap is required. Either bound holds on its own, so each axis takes the tighter.
    """
    by_box = np.zeros(2, np.bool_)
    for axis in range(2):
        if overlap_floor > 0.0:
            by_box[axis] = _box_is_tighter(mean, covariance, z, variance, threshold, axis)
    low, high = _rectangles(mean, covariance, threshold, by_box)
    other_low, other_high = _detection_rectangles(z, variance, threshold, by_box)
    near_start, near = meeting_pairs(low, high, other_low, other_high, 8 * limit)
    d = z.shape[1]
    scratch = np.empty((d + 2, d))
    start = np.zeros(len(mean) + 1, np.int64)
    column = np.empty(len(near), np.int64)
    distance = np.empty(len(near))
    log_volume = np.empty(len(near))
    overlap = np.empty(len(near))
    count = 0
    for i in range(len(mean)):
        for k in range(near_start[i], near_start[i + 1]):
            j = near[k]
            shared = box_overlap(mean, i, z, j) if boxes else 0.0
            if shared < overlap_floor:
                continue
            d2, log_det = squared_mahalanobis(mean, covariance, i, z, variance, j, scratch, coupled)
            if not d2 < np.inf:
                return GATE_NOT_POSITIVE, i, _no_candidates(len(mean))
            if d2 > threshold:
                continue
            if count == limit:
                return GATE_TOO_MANY, i, _no_candidates(len(mean))
            column[count] = j
            distance[count] = d2
            log_volume[count] = log_det
            overlap[count] = shared
            count += 1
        start[i + 1] = count
    if len(near) >= 8 * limit:
        return GATE_TOO_MANY, -1, _no_candidates(len(mean))
    return (
        GATE_OK,
        -1,
        Candidates(start, column[:count], distance[:count], log_volume[:count], overlap[:count]),
    )


@njit(cache=True)
def _no_candidates(tracks: int) -> Candidates:
    nothing = np.empty(0)
    return Candidates(
        np.zeros(tracks + 1, np.int64), np.empty(0, np.int64), nothing, nothing, nothing
    )


@njit(cache=True)
def _half_extent(threshold: float, variance: float) -> float:
    """√(γ P_kk); a variance that is none leaves the pair to the test that reports it."""
    return np.sqrt(threshold * variance) if variance >= 0.0 else np.inf


@njit(cache=True)
def _box_is_tighter(
    mean: NDArray,
    covariance: NDArray,
    z: NDArray,
    variance: NDArray,
    threshold: float,
    axis: int,
) -> bool:
    """Whether boxes reach less far than gates along an axis, by a sample of both sides."""
    box = 0.0
    gate = 0.0
    step = max(1, len(mean) // SAMPLE)
    for i in range(0, len(mean), step):
        box += 0.5 * mean[i, 2 + axis] / (len(mean) // step)
        gate += _half_extent(threshold, covariance[i, axis, axis]) / (len(mean) // step)
    step = max(1, len(z) // SAMPLE)
    for j in range(0, len(z), step):
        box += 0.5 * z[j, 2 + axis] / (len(z) // step)
        gate += _half_extent(threshold, variance[j, axis]) / (len(z) // step)
    return not gate < box


@njit(cache=True)
def _rectangles(
    mean: NDArray, covariance: NDArray, threshold: float, by_box: NDArray
) -> tuple[NDArray, NDArray]:
    """Corners of the tracks' rectangles: their boxes or gates, as chosen for each axis."""
    low = np.empty((len(mean), 2))
    high = np.empty((len(mean), 2))
    for i in range(len(mean)):
        for k in range(2):
            if by_box[k]:
                half = 0.5 * max(mean[i, 2 + k], SMALLEST_SIZE)
            else:
                half = _half_extent(threshold, covariance[i, k, k])
            low[i, k] = mean[i, k] - half
            high[i, k] = mean[i, k] + half
    return low, high


@njit(cache=True)
def _detection_rectangles(
    z: NDArray, variance: NDArray, threshold: float, by_box: NDArray
) -> tuple[NDArray, NDArray]:
    """The same for detections."""
    low = np.empty((len(z), 2))
    high = np.empty((len(z), 2))
    for j in range(len(z)):
        for k in range(2):
            if by_box[k]:
                half = 0.5 * max(z[j, 2 + k], SMALLEST_SIZE)
            else:
                half = _half_extent(threshold, variance[j, k])
            low[j, k] = z[j, k] - half
            high[j, k] = z[j, k] + half
    return low, high
