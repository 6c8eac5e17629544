"""Which rectangles meet: a join of two sets through a hashed grid, without looking at all pairs.

The grid has no border, so one stray rectangle far away costs nothing; rectangles that would fill
more cells than there are rectangles are kept in a list of their own.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

SAMPLE = 65  # rectangles looked at for the typical size
FAR = 1e15  # cell coordinates are clipped here, far inside int64


class Grid(NamedTuple):
    """A set of rectangles, sorted into buckets by the cells that they touch."""

    low: NDArray[np.float64]  # (m, 2) corners of the rectangles
    high: NDArray[np.float64]  # (m, 2)
    cell: NDArray[np.float64]  # (2,) cell sizes
    start: NDArray[np.int64]  # (buckets + 1,) first entry of each bucket
    member: NDArray[np.int64]  # rectangle of each entry, increasing within a bucket
    cell_x: NDArray[np.int64]  # cell of each entry
    cell_y: NDArray[np.int64]
    oversized: NDArray[np.int64]  # rectangles that are in no cell, increasing


@njit(cache=True)
def typical_extent(low: NDArray[np.float64], high: NDArray[np.float64], axis: int) -> float:
    """Median extent of (a sample of) rectangles; 0 if there are none."""
    count = len(low)
    if count == 0:
        return 0.0
    step = max(1, count // SAMPLE)
    sample = np.empty((count + step - 1) // step)
    for k in range(len(sample)):
        sample[k] = high[k * step, axis] - low[k * step, axis]
    return np.sort(sample)[len(sample) // 2]


@njit(cache=True)
def _cell_of(value: float, size: float) -> int:
    """Cell coordinate along one axis."""
    return int(np.floor(min(max(value / size, -FAR), FAR)))


@njit(cache=True)
def _bucket_of(x: int, y: int, mask: int) -> int:
    """Bucket of a cell (Teschner et al. 2003)."""
    return ((x * 73856093) ^ (y * 19349663)) & mask


@njit(cache=True)
def _cells_of(
    low: NDArray[np.float64], high: NDArray[np.float64], cell: NDArray[np.float64]
) -> tuple[int, int, int, int, float]:
    """First and last cell along both axes, and how many cells that makes."""
    x0 = _cell_of(low[0], cell[0])
    x1 = _cell_of(high[0], cell[0])
    y0 = _cell_of(low[1], cell[1])
    y1 = _cell_of(high[1], cell[1])
    return x0, x1, y0, y1, (x1 - x0 + 1.0) * (y1 - y0 + 1.0)


@njit(cache=True)
def build_grid(
    low: NDArray[np.float64], high: NDArray[np.float64], cell: NDArray[np.float64]
) -> Grid:
    """Sort rectangles into the cells they touch.

    low, high : (m, 2) corners, low ≤ high, finite.   cell : (2,) positive cell sizes, about the
    distance over which rectangles meet.
    """
    count = len(low)
    buckets = 1
    while buckets < 2 * count:
        buckets *= 2
    start = np.zeros(buckets + 1, np.int64)
    oversized = np.empty(count, np.int64)
    too_large = 0
    most = max(16.0, np.sqrt(count))
    for j in range(count):
        x0, x1, y0, y1, cells = _cells_of(low[j], high[j], cell)
        if cells > most:
            oversized[too_large] = j
            too_large += 1
            continue
        for x in range(x0, x1 + 1):
            for y in range(y0, y1 + 1):
                start[_bucket_of(x, y, buckets - 1) + 1] += 1
    for b in range(1, buckets + 1):
        start[b] += start[b - 1]
    entries = start[buckets]
    member = np.empty(entries, np.int64)
    cell_x = np.empty(entries, np.int64)
    cell_y = np.empty(entries, np.int64)
    fill = start[:buckets].copy()
    for j in range(count):
        x0, x1, y0, y1, cells = _cells_of(low[j], high[j], cell)
        if cells > most:
            continue
        for x in range(x0, x1 + 1):
            for y in range(y0, y1 + 1):
                k = fill[_bucket_of(x, y, buckets - 1)]
                fill[_bucket_of(x, y, buckets - 1)] += 1
                member[k] = j
                cell_x[k] = x
                cell_y[k] = y
    return Grid(low, high, cell, start, member, cell_x, cell_y, oversized[:too_large].copy())


@njit(cache=True)
def _meet(low: NDArray, high: NDArray, grid: Grid, j: int) -> bool:
    return (
        grid.low[j, 0] <= high[0]
        and grid.high[j, 0] >= low[0]
        and grid.low[j, 1] <= high[1]
        and grid.high[j, 1] >= low[1]
    )


@njit(cache=True)
def meeting(
    low: NDArray[np.float64], high: NDArray[np.float64], grid: Grid, found: NDArray[np.int64]
) -> int:
    """List, in increasing order, the grid's rectangles that meet one rectangle.

    low, high : (2,) its corners.   found : (m,) receives the indices.   Returns how many.

    A rectangle in several cells is reported once: from the cell that holds the lower corner of
    the intersection (Dittrich and Seeger 2000).
    """
    x0, x1, y0, y1, cells = _cells_of(low, high, grid.cell)
    count = 0
    if cells >= len(grid.low):
        for j in range(len(grid.low)):
            if _meet(low, high, grid, j):
                found[count] = j
                count += 1
        return count
    for j in grid.oversized:
        if _meet(low, high, grid, j):
            found[count] = j
            count += 1
    mask = len(grid.start) - 2
    for x in range(x0, x1 + 1):
        for y in range(y0, y1 + 1):
            bucket = _bucket_of(x, y, mask)
            for k in range(grid.start[bucket], grid.start[bucket + 1]):
                j = grid.member[k]
                if grid.cell_x[k] != x or grid.cell_y[k] != y or not _meet(low, high, grid, j):
                    continue
                corner_x = _cell_of(max(low[0], grid.low[j, 0]), grid.cell[0])
                corner_y = _cell_of(max(low[1], grid.low[j, 1]), grid.cell[1])
                if corner_x == x and corner_y == y:
                    found[count] = j
                    count += 1
    _sort_first(found, count)
    return count


@njit(cache=True)
def _sort_first(values: NDArray[np.int64], count: int) -> None:
    """Sort the first `count` values in place; short lists by insertion."""
    if count > 32:
        values[:count] = np.sort(values[:count])
        return
    for k in range(1, count):
        value = values[k]
        hole = k
        while hole > 0 and values[hole - 1] > value:
            values[hole] = values[hole - 1]
            hole -= 1
        values[hole] = value
