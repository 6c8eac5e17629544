"""Exact optional assignment on a sparse candidate graph, with prices that prove it.

    minimise  Σ c_ij x_ij + Σ_i a_i (1 − Σ_j x_ij) + Σ_j b_j (1 − Σ_i x_ij)

Rows (tracks) enter one at a time along a shortest augmenting path in reduced costs (Jonker and
Volgenant 1987; Crouse 2016 for the rectangular case). Subtracting a_i + b_j from every candidate
makes both private options free, so they stay implicit: a path may end in a free column or in the
private miss of any row it reaches. Absent candidates are absent, never a large number.

With c' = c − a − b the invariants are u' ≤ 0, v' ≤ 0, u'_i + v'_j ≤ c'_ij, equality on pairs,
u'_i = 0 for a missed row, v'_j = 0 for an unpaired column. The prices returned are u = u' + a and
v = v' + b.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.components import Components
from tracker.kernels.frontier import Frontier, clear, nearest, new_frontier, offer, prefers_heap


class Problem(NamedTuple):
    """One frame's optional assignment problem; columns increase within a row."""

    start: NDArray[np.int64]  # (n + 1,) first candidate of each row (CSR)
    column: NDArray[np.int64]  # (E,) column of each candidate
    cost: NDArray[np.float64]  # (E,) c_ij, finite, of either sign
    miss: NDArray[np.float64]  # (n,) a_i
    new: NDArray[np.float64]  # (m,) b_j


class Assignment(NamedTuple):
    """The optimum and its proof."""

    row_candidate: NDArray[np.int64]  # (n,) index of the chosen candidate, -1: missed
    row_column: NDArray[np.int64]  # (n,) its column, -1: missed
    column_row: NDArray[np.int64]  # (m,) the row, -1: unpaired
    row_price: NDArray[np.float64]  # (n,) u
    column_price: NDArray[np.float64]  # (m,) v


class Certificate(NamedTuple):
    """How well the prices prove the answer, per component; all about 0 up to rounding.

    A pairing that is not one-to-one has gap inf.
    """

    gap: NDArray[np.float64]  # (C,) cost of the answer minus the sum of prices
    violation: NDArray[np.float64]  # (C,) largest u + v − c, u − a, v − b above 0
    scale: NDArray[np.float64]  # (C,) sum of absolute costs and prices, measure of rounding


@njit(cache=True)
def _augment(
    row: int,
    problem: Problem,
    reduced: NDArray[np.float64],
    answer: Assignment,
    frontier: Frontier,
    use_heap: bool,
) -> None:
    """Bring one row into the matching along the cheapest path; prices stay feasible.

    `reduced` holds c' = c − a − b; the prices in `answer` are u' and v' here.
    """
    best = 0.0  # length of the best complete path: at first the row's own miss, which is free
    end_column = -1  # it ends in this free column, or …
    end_row = row  # … in the private miss of this row
    here = row
    here_distance = 0.0
    here_price = 0.0
    while True:
        for e in range(problem.start[here], problem.start[here + 1]):
            j = problem.column[e]
            step = reduced[e] - here_price - answer.column_price[j]
            if here != row:
                step = max(0.0, step)  # below 0 only by rounding; the new row has no price yet
            if here_distance + step < best:
                offer(frontier, j, here_distance + step, here, e, use_heap)
        j = nearest(frontier, use_heap)
        if j < 0 or frontier.distance[j] >= best:
            break
        here_distance = frontier.distance[j]
        here = answer.column_row[j]
        if here < 0:
            best = here_distance
            end_column = j
            break
        frontier.done[j] = True
        here_price = answer.row_price[here]
        if here_distance - here_price < best:
            best = here_distance - here_price
            end_row = here
    _move_prices(row, best, answer, frontier)
    if end_column < 0 and end_row != row:
        end_column = answer.row_column[end_row]
        answer.row_column[end_row] = -1
        answer.row_candidate[end_row] = -1
        answer.row_price[end_row] = 0.0  # exactly, not up to rounding
    # Flip the path, from its end back to `row`.
    while end_column >= 0:
        i = frontier.from_row[end_column]
        before = answer.row_column[i]
        answer.row_column[i] = end_column
        answer.row_candidate[i] = frontier.from_candidate[end_column]
        answer.column_row[end_column] = i
        end_column = before
    clear(frontier)


@njit(cache=True)
def _move_prices(row: int, best: float, answer: Assignment, frontier: Frontier) -> None:
    """Move the prices of everything final by what is left of the path's length."""
    answer.row_price[row] = best
    for k in range(frontier.used[0]):
        j = frontier.touched[k]
        if frontier.done[j]:
            answer.row_price[answer.column_row[j]] += best - frontier.distance[j]
            answer.column_price[j] += frontier.distance[j] - best


@njit(cache=True)
def problem_frontier(problem: Problem) -> Frontier:
    """Scratch for the searches that a problem needs."""
    return new_frontier(len(problem.new), len(problem.column) + len(problem.new))


@njit(cache=True)
def assign(problem: Problem, components: Components, frontier: Frontier) -> Assignment:
    """Solve the optional assignment problem exactly.

    frontier : scratch of `problem_frontier`, clear before and after.

    Rows enter in order and equal distances are settled by the lower column, so the answer
    depends on nothing but the component it is in.
    """
    rows = len(problem.miss)
    columns = len(problem.new)
    start, column = problem.start, problem.column
    reduced = np.empty(len(column))
    for i in range(rows):
        for e in range(start[i], start[i + 1]):
            reduced[e] = problem.cost[e] - problem.miss[i] - problem.new[column[e]]
    answer = Assignment(
        np.full(rows, -1, np.int64),
        np.full(rows, -1, np.int64),
        np.full(columns, -1, np.int64),
        np.zeros(rows),
        np.zeros(columns),
    )
    for i in range(rows):
        # Most rows: the cheapest candidate leads to a free column, or nothing beats the miss.
        best = 0.0
        cheapest = -1
        for e in range(start[i], start[i + 1]):
            reach = reduced[e] - answer.column_price[column[e]]
            if reach < best:
                best = reach
                cheapest = e
        if cheapest < 0:
            continue
        j = column[cheapest]
        if answer.column_row[j] < 0:
            answer.row_candidate[i] = cheapest
            answer.row_column[i] = j
            answer.column_row[j] = i
            answer.row_price[i] = best
            continue
        c = components.of_row[i]
        use_heap = prefers_heap(components.rows[c], components.columns[c], components.candidates[c])
        _augment(i, problem, reduced, answer, frontier, use_heap)
    for i in range(rows):
        answer.row_price[i] += problem.miss[i]
    for j in range(columns):
        answer.column_price[j] += problem.new[j]
    return answer


@njit(cache=True)
def certify(problem: Problem, components: Components, answer: Assignment) -> Certificate:
    """Check the proof of optimality, from the original costs and nothing else.

    Weak duality (Kuhn 1955): feasible prices bound every assignment from below, so prices that
    reach the cost of the answer prove that nothing is cheaper. O(E).
    """
    start, column, cost, miss, new = problem
    row_candidate, row_column, column_row, row_price, column_price = answer
    count = len(components.candidates)
    gap = np.zeros(count)
    violation = np.zeros(count)
    scale = np.zeros(count)
    for i in range(len(miss)):
        c = components.of_row[i]
        e = row_candidate[i]
        part = miss[i]
        if e >= 0:
            part = cost[e]
            proper = start[i] <= e < start[i + 1] and column[e] == row_column[i]
            if not proper or column_row[row_column[i]] != i:
                gap[c] = np.inf
        gap[c] += part - row_price[i]
        scale[c] += abs(part) + abs(row_price[i]) + abs(miss[i])
        violation[c] = max(violation[c], row_price[i] - miss[i])
        for k in range(start[i], start[i + 1]):
            excess = row_price[i] + column_price[column[k]] - cost[k]
            violation[c] = max(violation[c], excess)
    for j in range(len(new)):
        c = components.of_column[j]
        i = column_row[j]
        part = 0.0
        if i < 0:
            part = new[j]
        elif row_column[i] != j:
            gap[c] = np.inf
        gap[c] += part - column_price[j]
        scale[c] += abs(part) + abs(column_price[j]) + abs(new[j])
        violation[c] = max(violation[c], column_price[j] - new[j])
    return Certificate(gap, violation, scale)
