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
    truth_low, truth_high = _corners(truth_z)
    track_low, track_high = _corners(track_z)
    start, column = _meeting_rows(
        truth_start, truth_low, truth_high, track_start, track_low, track_high
    )
    overlap = np.empty(len(column))
    count = 0
    first = 0
    for t in range(len(truth_z)):
        last = start[t + 1]
        for e in range(first, last):
            value = box_overlap(truth_z, t, track_z, column[e])
            if value >= least:
                column[count] = column[e]
                overlap[count] = value
                count += 1
        first = last
        start[t + 1] = count
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
    # A little more than needed, so that rounding of the borders loses no pair.
    reach = most * (1.0 + 1e-12)
    place = track_z[:, :2].copy()
    start, column = _meeting_rows(
        truth_start, truth_z[:, :2] - reach, truth_z[:, :2] + reach, track_start, place, place
    )
    distance = np.empty(len(column))
    count = 0
    first = 0
    for t in range(len(truth_z)):
        last = start[t + 1]
        for e in range(first, last):
            dx = truth_z[t, 0] - track_z[column[e], 0]
            dy = truth_z[t, 1] - track_z[column[e], 1]
            value = np.sqrt(dx * dx + dy * dy)
            if value <= most:
                column[count] = column[e]
                distance[count] = value
                count += 1
        first = last
        start[t + 1] = count
    return start, column[:count].copy(), distance[:count].copy()


@njit(cache=True)
def _corners(z: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    low, high = np.empty((len(z), 2)), np.empty((len(z), 2))
    for i in range(len(z)):
        for axis in range(2):
            low[i, axis] = z[i, axis] - 0.5 * z[i, axis + 2]
            high[i, axis] = z[i, axis] + 0.5 * z[i, axis + 2]
    return low, high


@njit(cache=True)
def _meeting_rows(
    truth_start: NDArray[np.int64],
    truth_low: NDArray[np.float64],
    truth_high: NDArray[np.float64],
    track_start: NDArray[np.int64],
    track_low: NDArray[np.float64],
    track_high: NDArray[np.float64],
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """(T + 1,) starts and (E,) track rows of the rectangles of each frame that meet."""
    start = np.zeros(len(truth_low) + 1, np.int64)
    column = np.empty(3 * len(truth_low) + 16, np.int64)
    count = 0
    for f in range(len(truth_start) - 1):
        a, b = truth_start[f], truth_start[f + 1]
        c, d = track_start[f], track_start[f + 1]
        first, other = meeting_pairs(
            truth_low[a:b], truth_high[a:b], track_low[c:d], track_high[c:d], EVERY
        )
        column = _room(column, count, len(other))
        for e in range(len(other)):
            column[count + e] = c + other[e]
        for i in range(b - a):
            start[a + i + 1] = count + first[i + 1]
        count += len(other)
    return start, column[:count].copy()


@njit(cache=True)
def _room(values: NDArray, used: int, more: int) -> NDArray:
    """The array, twice as long if `more` do not fit behind those in use."""
    if used + more <= len(values):
        return values
    grown = np.empty(max(2 * len(values), used + more), values.dtype)
    grown[:used] = values[:used]
    return grown
