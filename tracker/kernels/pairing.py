"""Which annotated rows and which track rows of each frame are close enough to be paired."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.grid import meeting_pairs
from tracker.kernels.overlap import box_overlap

EVERY = 2**62  # as a limit: all pairs


@njit(cache=True)
def pair_boxes(
    truth_start: NDArray[np.int64],
    truth_z: NDArray[np.float64],
    track_start: NDArray[np.int64],
    track_z: NDArray[np.float64],
    least: float,
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.float64]]:
    """Pairs of boxes (cx, cy, w, h) with an IoU of `least` > 0 or more, frame by frame.

    truth_start, track_start : (F + 1,) first row of each frame.

    Returns (T + 1,) first pair of each annotated row, (E,) track rows, (E,) their IoU.
    """
    start = np.zeros(len(truth_z) + 1, np.int64)
    column = np.empty(2 * len(truth_z) + 16, np.int64)
    overlap = np.empty(len(column))
    count = 0
    truth_low, truth_high = truth_z[:, :2].copy(), truth_z[:, :2].copy()
    track_low, track_high = track_z[:, :2].copy(), track_z[:, :2].copy()
    truth_low -= 0.5 * truth_z[:, 2:4]
    truth_high += 0.5 * truth_z[:, 2:4]
    track_low -= 0.5 * track_z[:, 2:4]
    track_high += 0.5 * track_z[:, 2:4]
    for f in range(len(truth_start) - 1):
        a, b = truth_start[f], truth_start[f + 1]
        c, d = track_start[f], track_start[f + 1]
        first, other = meeting_pairs(
            truth_low[a:b], truth_high[a:b], track_low[c:d], track_high[c:d], EVERY
        )
        column = _room(column, count, len(other))
        overlap = _room(overlap, count, len(other))
        for i in range(b - a):
            for e in range(first[i], first[i + 1]):
                value = box_overlap(truth_z, a + i, track_z, c + other[e])
                if value >= least:
                    column[count] = c + other[e]
                    overlap[count] = value
                    count += 1
            start[a + i + 1] = count
    return start, column[:count].copy(), overlap[:count].copy()


@njit(cache=True)
def pair_points(
    truth_start: NDArray[np.int64],
    truth_z: NDArray[np.float64],
    track_start: NDArray[np.int64],
    track_z: NDArray[np.float64],
    most: float,
) -> tuple[NDArray[np.int64], NDArray[np.int64], NDArray[np.float64]]:
    """Pairs of points (x, y) that are at most `most` apart; as `pair_boxes`, with distances."""
    start = np.zeros(len(truth_z) + 1, np.int64)
    column = np.empty(2 * len(truth_z) + 16, np.int64)
    distance = np.empty(len(column))
    count = 0
    # A little more than needed, so that rounding of the borders loses no pair.
    reach = most * (1.0 + 1e-12)
    low, high = truth_z[:, :2] - reach, truth_z[:, :2] + reach
    place = track_z[:, :2].copy()
    for f in range(len(truth_start) - 1):
        a, b = truth_start[f], truth_start[f + 1]
        c, d = track_start[f], track_start[f + 1]
        first, other = meeting_pairs(low[a:b], high[a:b], place[c:d], place[c:d], EVERY)
        column = _room(column, count, len(other))
        distance = _room(distance, count, len(other))
        for i in range(b - a):
            for e in range(first[i], first[i + 1]):
                j = c + other[e]
                dx = truth_z[a + i, 0] - track_z[j, 0]
                dy = truth_z[a + i, 1] - track_z[j, 1]
                value = np.sqrt(dx * dx + dy * dy)
                if value <= most:
                    column[count] = j
                    distance[count] = value
                    count += 1
            start[a + i + 1] = count
    return start, column[:count].copy(), distance[:count].copy()


@njit(cache=True)
def _room(values: NDArray, used: int, more: int) -> NDArray:
    """The array, twice as long if `more` do not fit behind those in use."""
    if used + more <= len(values):
        return values
    grown = np.empty(max(2 * len(values), used + more), values.dtype)
    grown[:used] = values[:used]
    return grown
