"""Gating: which track-detection pairs are considered, in time linear in how many there are."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.grid import build_grid, meeting, typical_extent
from tracker.kernels.kalman import squared_mahalanobis
from tracker.kernels.overlap import SMALLEST_SIZE, box_overlap

# Up to this many pairs a plain double loop is faster than building a grid.
SMALL_PRODUCT = 1024

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
    limit: int,
) -> tuple[int, int, Candidates]:
    """Find all pairs with d² ≤ threshold and IoU ≥ overlap_floor.

    Parameters
    ----------
    mean, covariance : (n, s), (n, s, s) predicted states, measured components first.
    z, variance : (m, d) detections and their measurement variances (diagonal R).
    threshold : gate on d², inf for none.   overlap_floor : IoU above 0, or 0 for none.
    boxes : whether components are (cx, cy, w, h).   limit : most candidates.

    Returns
    -------
    status (GATE_OK, …), the row it concerns, Candidates.

    A pair can only pass if the axis-aligned rectangles around track and detection meet: half
    extents √(γ P_kk) and √(γ R_kk), since |Δ_k| ≤ √(γ (P_kk + R_kk)); or the boxes themselves
    where an overlap is required.
    """
    tracks = len(mean)
    detections = len(z)
    low, high = _rectangles(mean, covariance, threshold, overlap_floor)
    other_low, other_high = _detection_rectangles(z, variance, threshold, overlap_floor)
    use_grid = tracks * detections > SMALL_PRODUCT
    cell = np.ones(2)
    for k in range(2):
        reach = typical_extent(low, high, k) + typical_extent(other_low, other_high, k)
        cell[k] = reach if 0.0 < reach < np.inf else 1.0
    use_grid = use_grid and (threshold < np.inf or overlap_floor > 0.0)
    grid = build_grid(other_low if use_grid else other_low[:0], other_high, cell)
    d = z.shape[1]
    scratch = np.empty((d + 1, d))
    start = np.zeros(tracks + 1, np.int64)
    capacity = max(16, 4 * max(tracks, detections))
    column = np.empty(capacity, np.int64)
    distance = np.empty(capacity)
    log_volume = np.empty(capacity)
    overlap = np.empty(capacity)
    found = np.empty(detections, np.int64)
    count = 0
    for i in range(tracks):
        near = detections
        if use_grid:
            near = meeting(low[i], high[i], grid, found)
        for k in range(near):
            j = k
            if use_grid:
                j = found[k]
            elif (
                other_low[j, 0] > high[i, 0]
                or other_high[j, 0] < low[i, 0]
                or other_low[j, 1] > high[i, 1]
                or other_high[j, 1] < low[i, 1]
            ):
                continue
            shared = box_overlap(mean[i], z[j]) if boxes else 0.0
            if shared < overlap_floor:
                continue
            d2, log_det = squared_mahalanobis(mean[i], covariance[i], z[j], variance[j], scratch)
            if not d2 < np.inf:
                return GATE_NOT_POSITIVE, i, _no_candidates(tracks)
            if d2 > threshold:
                continue
            if count == limit:
                return GATE_TOO_MANY, i, _no_candidates(tracks)
            if count == capacity:
                capacity *= 2
                column = _grown(column, capacity)
                distance = _grown(distance, capacity)
                log_volume = _grown(log_volume, capacity)
                overlap = _grown(overlap, capacity)
            column[count] = j
            distance[count] = d2
            log_volume[count] = log_det
            overlap[count] = shared
            count += 1
        start[i + 1] = count
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
def _grown(values: NDArray, capacity: int) -> NDArray:
    larger = np.empty(capacity, values.dtype)
    larger[: len(values)] = values
    return larger


@njit(cache=True)
def _rectangles(
    mean: NDArray, covariance: NDArray, threshold: float, overlap_floor: float
) -> tuple[NDArray, NDArray]:
    """Corners of the tracks' rectangles: their boxes if an overlap is required, else gates."""
    low = np.empty((len(mean), 2))
    high = np.empty((len(mean), 2))
    for i in range(len(mean)):
        for k in range(2):
            half = np.sqrt(threshold * covariance[i, k, k])
            if overlap_floor > 0.0:
                half = 0.5 * max(mean[i, 2 + k], SMALLEST_SIZE)
            low[i, k] = mean[i, k] - half
            high[i, k] = mean[i, k] + half
    return low, high


@njit(cache=True)
def _detection_rectangles(
    z: NDArray, variance: NDArray, threshold: float, overlap_floor: float
) -> tuple[NDArray, NDArray]:
    """The same for detections."""
    low = np.empty((len(z), 2))
    high = np.empty((len(z), 2))
    for j in range(len(z)):
        for k in range(2):
            half = np.sqrt(threshold * variance[j, k])
            if overlap_floor > 0.0:
                half = 0.5 * max(z[j, 2 + k], SMALLEST_SIZE)
            low[j, k] = z[j, k] - half
            high[j, k] = z[j, k] + half
    return low, high
