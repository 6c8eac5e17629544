"""Which rectangles meet: a join of two sets through a hashed grid, without looking at all pairs.

The grid has no border, so one stray rectangle far away costs nothing; rectangles that would fill
many cells are kept in a list of their own.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

SAMPLE = 17  # rectangles looked at, about, for the typical size
FAR = 1e15  # cell coordinates are clipped here, far inside int64
# Up to this many pairs a plain double loop is faster than building a grid.
SMALL_PRODUCT = 4096


@njit(cache=True)
def typical_extent(low: NDArray[np.float64], high: NDArray[np.float64], axis: int) -> float:
    """Median extent of (a sample of) rectangles; 0 if there are none."""
    count = len(low)
    if count == 0:
        return 0.0
    step = max(1, count // SAMPLE)
    sample = np.empty((count + step - 1) // step)
    for k in range(len(sample)):
        extent = high[k * step, axis] - low[k * step, axis]
        hole = k
        while hole > 0 and sample[hole - 1] > extent:
            sample[hole] = sample[hole - 1]
            hole -= 1
        sample[hole] = extent
    return sample[len(sample) // 2]


@njit(cache=True)
def _cell_of(value: float, inverse: float) -> int:
    """Cell coordinate along one axis; `inverse` is one over the cell size."""
    return int(np.floor(min(max(value * inverse, -FAR), FAR)))


@njit(cache=True)
def _bucket_of(x: int, y: int, mask: int) -> int:
    """Bucket of a cell: neighbours along y lie side by side, rows are scattered."""
    return (x * 73856093 + y) & mask


@njit(cache=True)
def meeting_pairs(
    low: NDArray[np.float64],
    high: NDArray[np.float64],
    other_low: NDArray[np.float64],
    other_high: NDArray[np.float64],
    limit: int,
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """All pairs of a rectangle of the first set and one of the second that meet.

    low, high : (n, 2) corners, low ≤ high.   other_low, other_high : (m, 2).
    limit : stop after that many pairs.

    Returns (n + 1,) starts and the second's indices, increasing within each of the first. If the
    limit was reached there are `limit` pairs or more and the last rectangles have none.
    """
    if len(low) * len(other_low) <= SMALL_PRODUCT:
        return _by_double_loop(low, high, other_low, other_high)
    inverse = np.ones(2)
    for axis in range(2):
        reach = typical_extent(low, high, axis) + typical_extent(other_low, other_high, axis)
        if not reach < np.inf:
            return _by_double_loop(low, high, other_low, other_high)
        if reach > 0.0:
            inverse[axis] = 0.5 / reach
    return _by_grid(low, high, other_low, other_high, inverse, limit)


@njit(cache=True)
def _by_double_loop(
    low: NDArray, high: NDArray, other_low: NDArray, other_high: NDArray
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    start = np.zeros(len(low) + 1, np.int64)
    found = np.empty(max(16, 4 * len(low)), np.int64)
    count = 0
    for i in range(len(low)):
        if count + len(other_low) > len(found):
            found = _grown(found, count + len(other_low))
        for j in range(len(other_low)):
            found[count] = j
            count += (
                (other_low[j, 0] <= high[i, 0])
                & (other_high[j, 0] >= low[i, 0])
                & (other_low[j, 1] <= high[i, 1])
                & (other_high[j, 1] >= low[i, 1])
            )
        start[i + 1] = count
    return start, found[:count]


@njit(cache=True)
def _by_grid(
    low: NDArray,
    high: NDArray,
    other_low: NDArray,
    other_high: NDArray,
    inverse: NDArray,
    limit: int,
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """The join through a grid whose cells are about twice as large as rectangles reach.

    A pair that shares several cells is reported once: from the cell that holds the lower corner
    of the intersection (Dittrich and Seeger 2000).
    """
    per_x, per_y = inverse
    bucket_start, member, cell, corner, oversized = _fill_grid(other_low, other_high, per_x, per_y)
    mask = len(bucket_start) - 2
    start = np.zeros(len(low) + 1, np.int64)
    found = np.empty(max(16, 4 * len(low)), np.int64)
    count = 0
    for i in range(len(low)):
        first = count
        left, top, right, bottom = low[i, 0], low[i, 1], high[i, 0], high[i, 1]
        x0, x1 = _cell_of(left, per_x), _cell_of(right, per_x)
        y0, y1 = _cell_of(top, per_y), _cell_of(bottom, per_y)
        if (x1 - x0 + 1.0) * (y1 - y0 + 1.0) >= len(other_low):
            # So large that looking at all is cheaper than looking at its cells.
            if count + len(other_low) > len(found):
                found = _grown(found, count + len(other_low))
            for j in range(len(other_low)):
                if (
                    other_low[j, 0] <= right
                    and other_high[j, 0] >= left
                    and other_low[j, 1] <= bottom
                    and other_high[j, 1] >= top
                ):
                    found[count] = j
                    count += 1
        else:
            if count + len(oversized) > len(found):
                found = _grown(found, count + len(oversized))
            for j in oversized:
                if (
                    other_low[j, 0] <= right
                    and other_high[j, 0] >= left
                    and other_low[j, 1] <= bottom
                    and other_high[j, 1] >= top
                ):
                    found[count] = j
                    count += 1
            for x in range(x0, x1 + 1):
                for y in range(y0, y1 + 1):
                    bucket = _bucket_of(x, y, mask)
                    for k in range(bucket_start[bucket], bucket_start[bucket + 1]):
                        if (
                            corner[k, 0] > right
                            or corner[k, 2] < left
                            or corner[k, 1] > bottom
                            or corner[k, 3] < top
                            or cell[k, 0] != x  # another cell that shares the bucket
                            or cell[k, 1] != y
                        ):
                            continue
                        corner_x = max(x0, _cell_of(corner[k, 0], per_x))
                        corner_y = max(y0, _cell_of(corner[k, 1], per_y))
                        if corner_x == x and corner_y == y:
                            if count == len(found):
                                found = _grown(found, count + 1)
                            found[count] = member[k]
                            count += 1
            _sort_between(found, first, count)
        start[i + 1] = count
        if count >= limit:
            start[i + 2 :] = count
            break
    return start, found[:count]


@njit(cache=True)
def _fill_grid(
    low: NDArray, high: NDArray, per_x: float, per_y: float
) -> tuple[NDArray, NDArray, NDArray, NDArray, NDArray]:
    """Sort rectangles into hashed cells.

    Returns (buckets + 1,) starts; of each entry the rectangle's number, its (x, y) cell and its
    (left, top, right, bottom), side by side so that a bucket is read in one go; and the
    rectangles that would fill too many cells and are in none.
    """
    count = len(low)
    buckets = 1
    while buckets < 2 * count:
        buckets *= 2
    span = np.empty((count, 4), np.int64)
    start = np.zeros(buckets + 1, np.int64)
    oversized = np.empty(count, np.int64)
    too_large = 0
    most = max(16.0, np.sqrt(count))
    for j in range(count):
        span[j, 0], span[j, 1] = _cell_of(low[j, 0], per_x), _cell_of(high[j, 0], per_x)
        span[j, 2], span[j, 3] = _cell_of(low[j, 1], per_y), _cell_of(high[j, 1], per_y)
        if (span[j, 1] - span[j, 0] + 1.0) * (span[j, 3] - span[j, 2] + 1.0) > most:
            oversized[too_large] = j
            too_large += 1
            span[j, 1] = span[j, 0] - 1  # in no cell
            continue
        for x in range(span[j, 0], span[j, 1] + 1):
            for y in range(span[j, 2], span[j, 3] + 1):
                start[_bucket_of(x, y, buckets - 1) + 1] += 1
    for b in range(1, buckets + 1):
        start[b] += start[b - 1]
    member = np.empty(start[buckets], np.int64)
    cell = np.empty((start[buckets], 2), np.int64)
    corner = np.empty((start[buckets], 4))
    fill = start[:buckets].copy()
    for j in range(count):
        for x in range(span[j, 0], span[j, 1] + 1):
            for y in range(span[j, 2], span[j, 3] + 1):
                bucket = _bucket_of(x, y, buckets - 1)
                k = fill[bucket]
                fill[bucket] = k + 1
                member[k] = j
                cell[k, 0] = x
                cell[k, 1] = y
                corner[k, 0], corner[k, 1] = low[j, 0], low[j, 1]
                corner[k, 2], corner[k, 3] = high[j, 0], high[j, 1]
    return start, member, cell, corner, oversized[:too_large].copy()


@njit(cache=True)
def _grown(values: NDArray[np.int64], needed: int) -> NDArray[np.int64]:
    larger = np.empty(max(needed, 2 * len(values)), np.int64)
    larger[: len(values)] = values
    return larger


@njit(cache=True)
def _sort_between(values: NDArray[np.int64], first: int, last: int) -> None:
    """Sort values[first:last] in place; short lists by insertion."""
    if last - first > 32:
        values[first:last] = np.sort(values[first:last])
        return
    for k in range(first + 1, last):
        value = values[k]
        hole = k
        while hole > first and values[hole - 1] > value:
            values[hole] = values[hole - 1]
            hole -= 1
        values[hole] = value
