"""The growing edge of a shortest-path search over columns (Dijkstra 1959)."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

# Up to this many columns a plain scan finds the nearest faster than a heap does.
SCAN_LIMIT = 24
# A component is dense when it holds at least this share of all its row-column pairs.
DENSE_SHARE = 0.25


class Frontier(NamedTuple):
    """Scratch of one search; everything not listed in `touched` is as new."""

    distance: NDArray[np.float64]  # (m,) shortest distance found so far, inf: none
    done: NDArray[np.bool_]  # (m,) distance is final
    from_row: NDArray[np.int64]  # (m,) row before the column on its path
    from_candidate: NDArray[np.int64]  # (m,) candidate that leads to the column
    touched: NDArray[np.int64]  # (m,) columns that have been offered
    heap_key: NDArray[np.float64]  # (E + 1,) binary heap of offers, outdated ones included
    heap_column: NDArray[np.int64]  # (E + 1,)
    used: NDArray[np.int64]  # (2,) how many touched, how many on the heap


@njit(cache=True)
def new_frontier(columns: int, offers: int) -> Frontier:
    """Scratch for that many columns and at most that many offers in one search."""
    return Frontier(
        np.full(columns, np.inf),
        np.zeros(columns, np.bool_),
        np.empty(columns, np.int64),
        np.empty(columns, np.int64),
        np.empty(columns, np.int64),
        np.empty(offers + 1),
        np.empty(offers + 1, np.int64),
        np.zeros(2, np.int64),
    )


@njit(cache=True)
def prefers_heap(rows: int, columns: int, candidates: int) -> bool:
    """Whether a component of that size is searched faster with the heap than by scans."""
    return columns > SCAN_LIMIT and candidates < DENSE_SHARE * rows * columns


@njit(cache=True)
def offer(
    frontier: Frontier, column: int, distance: float, row: int, candidate: int, use_heap: bool
) -> None:
    """Lower a column's distance, if it is lower."""
    if frontier.done[column] or not distance < frontier.distance[column]:
        return
    if frontier.distance[column] == np.inf:
        frontier.touched[frontier.used[0]] = column
        frontier.used[0] += 1
    frontier.distance[column] = distance
    frontier.from_row[column] = row
    frontier.from_candidate[column] = candidate
    if use_heap:
        _push(frontier, distance, column)


@njit(cache=True)
def nearest(frontier: Frontier, use_heap: bool) -> int:
    """Column of the smallest distance that is not final, the first of equals; -1 if none."""
    if use_heap:
        while frontier.used[1] > 0:
            column = frontier.heap_column[0]
            if not frontier.done[column] and frontier.heap_key[0] == frontier.distance[column]:
                return column
            _pop(frontier)
        return -1
    best = -1
    for k in range(frontier.used[0]):
        column = frontier.touched[k]
        if frontier.done[column]:
            continue
        if best < 0 or _before(frontier.distance[column], column, frontier.distance[best], best):
            best = column
    return best


@njit(cache=True)
def clear(frontier: Frontier) -> None:
    """Make the scratch as new, in time proportional to what was touched."""
    for k in range(frontier.used[0]):
        frontier.distance[frontier.touched[k]] = np.inf
        frontier.done[frontier.touched[k]] = False
    frontier.used[0] = 0
    frontier.used[1] = 0


@njit(cache=True)
def _before(key_a: float, column_a: int, key_b: float, column_b: int) -> bool:
    """Order of the queue: distance, then column, so that ties are settled by canonical order."""
    return key_a < key_b or (key_a == key_b and column_a < column_b)


@njit(cache=True)
def _push(frontier: Frontier, key: float, column: int) -> None:
    keys = frontier.heap_key
    columns = frontier.heap_column
    hole = frontier.used[1]
    frontier.used[1] += 1
    while hole > 0:
        up = (hole - 1) >> 1
        if not _before(key, column, keys[up], columns[up]):
            break
        keys[hole] = keys[up]
        columns[hole] = columns[up]
        hole = up
    keys[hole] = key
    columns[hole] = column


@njit(cache=True)
def _pop(frontier: Frontier) -> None:
    keys = frontier.heap_key
    columns = frontier.heap_column
    frontier.used[1] -= 1
    size = frontier.used[1]
    key = keys[size]
    column = columns[size]
    hole = 0
    while True:
        down = 2 * hole + 1
        if down >= size:
            break
        if down + 1 < size and _before(
            keys[down + 1], columns[down + 1], keys[down], columns[down]
        ):
            down += 1
        if not _before(keys[down], columns[down], key, column):
            break
        keys[hole] = keys[down]
        columns[hole] = columns[down]
        hole = down
    keys[hole] = key
    columns[hole] = column
