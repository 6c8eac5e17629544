"""Connected parts of the candidate graph (tracks on one side, detections on the other)."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray


class Components(NamedTuple):
    """Components numbered from 0 in order of their first row; lone columns come last."""

    of_row: NDArray[np.int64]  # (n,) component of each row
    of_column: NDArray[np.int64]  # (m,) component of each column
    row_start: NDArray[np.int64]  # (C + 1,) first member of each component in `row`
    row: NDArray[np.int64]  # (n,) rows by component, increasing within one
    column_start: NDArray[np.int64]  # (C + 1,) likewise
    column: NDArray[np.int64]  # (m,)
    candidates: NDArray[np.int64]  # (C,) how many candidates each has


@njit(cache=True)
def _root(parent: NDArray[np.int64], node: int) -> int:
    """Root of `node`, halving the path on the way."""
    while parent[node] != node:
        parent[node] = parent[parent[node]]
        node = parent[node]
    return node


@njit(cache=True)
def _members(label: NDArray[np.int64], count: int) -> tuple[NDArray, NDArray]:
    """Group indices by label: (count + 1,) starts, and the indices."""
    start = np.zeros(count + 1, np.int64)
    for k in range(len(label)):
        start[label[k] + 1] += 1
    for c in range(count):
        start[c + 1] += start[c]
    fill = start[:count].copy()
    member = np.empty(len(label), np.int64)
    for k in range(len(label)):
        member[fill[label[k]]] = k
        fill[label[k]] += 1
    return start, member


@njit(cache=True)
def label_components(
    start: NDArray[np.int64], column: NDArray[np.int64], columns: int
) -> Components:
    """Find the connected components of a sparse row-column graph.

    start : (n + 1,) first candidate of each row.   column : (E,) column of each candidate.
    columns : number of columns m.
    """
    rows = len(start) - 1
    parent = np.arange(rows + columns)
    for i in range(rows):
        for e in range(start[i], start[i + 1]):
            a = _root(parent, i)
            b = _root(parent, rows + column[e])
            # The smaller index becomes the root, so that a row is root wherever there is one.
            if a < b:
                parent[b] = a
            elif b < a:
                parent[a] = b
    label = np.full(rows + columns, -1, np.int64)
    count = 0
    of_row = np.empty(rows, np.int64)
    of_column = np.empty(columns, np.int64)
    for node in range(rows + columns):
        root = _root(parent, node)
        if label[root] < 0:
            label[root] = count
            count += 1
        if node < rows:
            of_row[node] = label[root]
        else:
            of_column[node - rows] = label[root]
    candidates = np.zeros(count, np.int64)
    for i in range(rows):
        candidates[of_row[i]] += start[i + 1] - start[i]
    row_start, row = _members(of_row, count)
    column_start, column_member = _members(of_column, count)
    return Components(of_row, of_column, row_start, row, column_start, column_member, candidates)
