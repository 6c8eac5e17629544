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
    rows: NDArray[np.int64]  # (C,) how many rows each has
    columns: NDArray[np.int64]  # (C,) how many columns
    candidates: NDArray[np.int64]  # (C,) how many candidates


@njit(cache=True)
def _root(parent: NDArray[np.int64], node: int) -> int:
    """Root of `node`, halving the path on the way."""
    while parent[node] != node:
        parent[node] = parent[parent[node]]
        node = parent[node]
    return node


@njit(cache=True)
def members(label: NDArray[np.int64], count: int) -> tuple[NDArray, NDArray]:
    """Group indices by label 0 … count − 1; those labelled -1 are left out.

    Returns (count + 1,) starts, and the indices, increasing within a label.
    """
    start = np.zeros(count + 1, np.int64)
    for k in range(len(label)):
        if label[k] >= 0:
            start[label[k] + 1] += 1
    for c in range(count):
        start[c + 1] += start[c]
    fill = start[:count].copy()
    member = np.empty(start[count], np.int64)
    for k in range(len(label)):
        if label[k] >= 0:
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
    row_count = np.zeros(count, np.int64)
    column_count = np.zeros(count, np.int64)
    for i in range(rows):
        row_count[of_row[i]] += 1
        candidates[of_row[i]] += start[i + 1] - start[i]
    for j in range(columns):
        column_count[of_column[j]] += 1
    return Components(of_row, of_column, row_count, column_count, candidates)
