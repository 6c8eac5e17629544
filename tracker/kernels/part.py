"""One component of a problem as a problem of its own, and the weights of its joint events.

A joint event pairs some rows with some columns, each at most once; its weight is exp(−cost).
With the prices u, v of the optimum,

    cost − optimum = Σ pairs (c_ij − u_i − v_j) + Σ missed (a_i − u_i) + Σ new (b_j − v_j),

a sum of terms that are never negative. So weights relative to the optimum are products of factors
between 0 and 1, and their total is at least 1: it can neither overflow nor vanish.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.assignment import Problem


class Weights(NamedTuple):
    """Factors whose products are the weights of joint events, the optimum's being 1."""

    start: NDArray[np.int64]  # (n + 1,) first candidate of each row (CSR)
    column: NDArray[np.int64]  # (E,)
    pair: NDArray[np.float64]  # (E,) exp(−(c − u − v))
    miss: NDArray[np.float64]  # (n,) exp(−(a − u))
    new: NDArray[np.float64]  # (m,) exp(−(b − v))


@njit(cache=True)
def part_of(
    problem: Problem, rows: NDArray[np.int64], columns: NDArray[np.int64]
) -> tuple[Problem, NDArray[np.int64]]:
    """Cut one component out.

    rows, columns : all of the component's, increasing.

    Returns the problem numbered from 0, and the (E',) candidate of `problem` that each of its
    candidates is.
    """
    count = 0
    for i in rows:
        count += problem.start[i + 1] - problem.start[i]
    start = np.zeros(len(rows) + 1, np.int64)
    column = np.empty(count, np.int64)
    cost = np.empty(count)
    source = np.empty(count, np.int64)
    miss = np.empty(len(rows))
    new = np.empty(len(columns))
    at = 0
    for k in range(len(rows)):
        i = rows[k]
        miss[k] = problem.miss[i]
        for e in range(problem.start[i], problem.start[i + 1]):
            column[at] = np.searchsorted(columns, problem.column[e])
            cost[at] = problem.cost[e]
            source[at] = e
            at += 1
        start[k + 1] = at
    for k in range(len(columns)):
        new[k] = problem.new[columns[k]]
    return Problem(start, column, cost, miss, new), source


@njit(cache=True)
def event_weights(
    problem: Problem, row_price: NDArray[np.float64], column_price: NDArray[np.float64]
) -> Weights:
    """Factors of all decisions, from the (n,) and (m,) prices of the optimum."""
    start, column, cost, miss, new = problem
    pair_weight = np.empty(len(column))
    miss_weight = np.empty(len(miss))
    new_weight = np.empty(len(new))
    for i in range(len(miss)):
        u = row_price[i]
        miss_weight[i] = np.exp(-max(0.0, miss[i] - u))
        for e in range(start[i], start[i + 1]):
            pair_weight[e] = np.exp(-max(0.0, cost[e] - u - column_price[column[e]]))
    for j in range(len(new)):
        new_weight[j] = np.exp(-max(0.0, new[j] - column_price[j]))
    return Weights(start, column, pair_weight, miss_weight, new_weight)


@njit(cache=True)
def turned(weights: Weights) -> tuple[Weights, NDArray[np.int64]]:
    """Rows and columns exchanged; and the (E,) candidate of `weights` that each candidate is."""
    rows, columns = len(weights.miss), len(weights.new)
    start = np.zeros(columns + 1, np.int64)
    for j in weights.column:
        start[j + 1] += 1
    for j in range(columns):
        start[j + 1] += start[j]
    fill = start[:columns].copy()
    column = np.empty(len(weights.column), np.int64)
    pair = np.empty(len(weights.column))
    source = np.empty(len(weights.column), np.int64)
    for i in range(rows):
        for e in range(weights.start[i], weights.start[i + 1]):
            at = fill[weights.column[e]]
            fill[weights.column[e]] += 1
            column[at] = i
            pair[at] = weights.pair[e]
            source[at] = e
    return Weights(start, column, pair, weights.new, weights.miss), source
