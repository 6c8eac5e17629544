"""The k best assignments of a whole problem: each component's, and their cheapest sums."""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.assignment import Problem
from tracker.kernels.components import Components, members
from tracker.kernels.murty import Ranking, event_bound, event_cost, rank_component
from tracker.kernels.part import part_of


@njit(cache=True)
def _cheapest_sums(
    one: NDArray[np.float64], other: NDArray[np.float64], k: int
) -> tuple[NDArray[np.float64], NDArray[np.int64], NDArray[np.int64]]:
    """The k smallest sums of two increasing lists, and which two entries make each.

    Entries a and b can only be among them if (a + 1) (b + 1) ≤ k: so many are no larger.
    """
    count = 0
    for a in range(len(one)):
        count += min(len(other), k // (a + 1))
    total = np.empty(count)
    first = np.empty(count, np.int64)
    second = np.empty(count, np.int64)
    at = 0
    for a in range(len(one)):
        for b in range(min(len(other), k // (a + 1))):
            total[at] = one[a] + other[b]
            first[at] = a
            second[at] = b
            at += 1
    chosen = np.argsort(total, kind="mergesort")[:k]
    return total[chosen], first[chosen], second[chosen]


@njit(cache=True)
def k_best(problem: Problem, components: Components, k: int) -> Ranking:
    """The k cheapest events of a whole problem: each component's, and their cheapest sums."""
    rows = len(problem.miss)
    k = int(min(float(k), event_bound(problem)))
    count = len(components.candidates)
    row_start, row = members(components.of_row, count)
    column_start, column = members(components.of_column, count)
    listed = np.full((k, rows), -1)  # [r, i]: what row i does in the r-th event of its component
    before = np.zeros((count, k), np.int64)  # [c, r]: which event of the components before c …
    within = np.zeros((count, k), np.int64)  # … and which of c make the r-th event of both
    so_far = np.zeros(1)
    log_total = 0.0
    for c in range(count):
        if components.candidates[c] == 0:
            before[c] = np.arange(k)
            continue
        members_of = row[row_start[c] : row_start[c + 1]]
        part, source = part_of(problem, members_of, column[column_start[c] : column_start[c + 1]])
        ranking = rank_component(part, k)
        for r in range(len(ranking.cost)):
            for i in range(len(members_of)):
                e = ranking.row_candidate[r, i]
                if e >= 0:
                    listed[r, members_of[i]] = source[e]
        so_far, first, second = _cheapest_sums(so_far, ranking.cost, k)
        before[c, : len(so_far)] = first
        within[c, : len(so_far)] = second
        log_total += np.log(np.exp(ranking.cost[0] - ranking.cost).sum() + ranking.rest)
    cost = np.empty(len(so_far))
    row_candidate = np.full((len(so_far), rows), -1)
    for r in range(len(so_far)):
        at = r
        for c in range(count - 1, -1, -1):
            for i in row[row_start[c] : row_start[c + 1]]:
                row_candidate[r, i] = listed[within[c, at], i]
            at = before[c, at]
        cost[r] = event_cost(problem, row_candidate, r)
    by_cost = np.argsort(cost, kind="mergesort")
    cost = cost[by_cost]
    rest = max(0.0, np.exp(log_total) - np.exp(cost[0] - cost).sum())
    return Ranking(cost, row_candidate[by_cost], rest)
