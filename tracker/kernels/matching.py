"""One-to-one matching of one frame: as many pairs as possible, and those the cheapest."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.assignment import Problem
from tracker.kernels.solve import solve


@njit(cache=True)
def cheapest_matching(
    start: NDArray[np.int64],
    column: NDArray[np.int64],
    cost: NDArray[np.float64],
    columns: int,
    reward: float,
    tolerance: float,
) -> tuple[NDArray[np.int64], bool]:
    """Minimise the sum of cost − reward over the pairs.

    start : (n + 1,) first candidate of each row.   column : (E,) increasing within a row.
    cost : (E,) all below `reward`; more pairs win if it exceeds what re-pairing can cost.

    Returns (n,) candidates chosen, -1 for none, and whether another matching is as cheap up to
    `tolerance` (never, if that is negative: then nothing is spent on finding out).
    """
    rows = len(start) - 1
    chosen = np.full(rows, -1, np.int64)
    row_count = np.zeros(rows, np.int64)  # of candidates
    column_count = np.zeros(columns, np.int64)
    for i in range(rows):
        row_count[i] = start[i + 1] - start[i]
        for e in range(start[i], start[i + 1]):
            column_count[column[e]] += 1
    # Most pairs have no rival; the others go to the exact solver, in a numbering of their own.
    hard_rows = np.empty(rows, np.int64)
    hard = 0
    hard_candidates = 0
    for i in range(rows):
        if row_count[i] == 1 and column_count[column[start[i]]] == 1:
            chosen[i] = start[i]
        elif row_count[i] > 0:
            hard_rows[hard] = i
            hard += 1
            hard_candidates += row_count[i]
    if hard == 0:
        return chosen, False
    used = np.zeros(columns, np.bool_)
    for k in range(hard):
        for e in range(start[hard_rows[k]], start[hard_rows[k] + 1]):
            used[column[e]] = True
    number = np.empty(columns, np.int64)
    hard_columns = 0
    for j in range(columns):
        if used[j]:
            number[j] = hard_columns
            hard_columns += 1
    problem = Problem(
        np.zeros(hard + 1, np.int64),
        np.empty(hard_candidates, np.int64),
        np.empty(hard_candidates),
        np.full(hard, reward),
        np.zeros(hard_columns),
    )
    origin = np.empty(hard_candidates, np.int64)
    count = 0
    for k in range(hard):
        for e in range(start[hard_rows[k]], start[hard_rows[k] + 1]):
            problem.column[count] = number[column[e]]
            problem.cost[count] = cost[e]
            origin[count] = e
            count += 1
        problem.start[k + 1] = count
    solution = solve(problem, tolerance >= 0.0)
    tied = False
    for k in range(hard):
        e = solution.answer.row_candidate[k]
        if e >= 0:
            chosen[hard_rows[k]] = origin[e]
            tied |= solution.row_margin[k] <= tolerance
    return chosen, tied
