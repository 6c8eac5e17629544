"""Margins and force costs: what it would cost to decide otherwise.

The margin of a decision is the increase of the optimum if it is forbidden, the force cost of an
unchosen candidate the increase if it is imposed. Both are shortest paths in the residual graph
of the optimum (the alternating paths of Kuhn 1955), with the reduced costs r_ij = c_ij − u_i − v_j
≥ 0 as lengths. From a row one may step to any candidate column that is not its own, at r_ij; from
a paired column to its row, at 0. All private options meet in one node, the *hub*:

    paired row i → hub           a_i − u_i    row i is missed instead
    unpaired column → hub        0            its private 'new' is given up
    hub → paired column j        b_j − v_j    column j is left to its private 'new'
    hub → missed row             0            its private 'miss' is given up

    margin of pair (i, j)        distance from row i to column j
    margin of missing row i      distance from row i to the hub
    margin of new column j       distance from the hub to column j
    force cost of candidate e    r_e + distance from what holds its column to what its row holds

A decision that nothing could replace has margin inf.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.assignment import Assignment, Problem
from tracker.kernels.components import Components, members
from tracker.kernels.frontier import Frontier, clear, nearest, offer, prefers_heap


@njit(cache=True)
def _offer_candidates(
    row: int,
    at: float,
    limit: float,
    problem: Problem,
    answer: Assignment,
    frontier: Frontier,
    use_heap: bool,
) -> None:
    """Step from a row that is `at` away to its candidate columns, if nearer than `limit`."""
    price = answer.row_price[row]
    for e in range(problem.start[row], problem.start[row + 1]):
        if e == answer.row_candidate[row]:
            continue
        j = problem.column[e]
        step = max(0.0, problem.cost[e] - price - answer.column_price[j])
        if at + step < limit:
            offer(frontier, j, at + step, row, e, use_heap)


@njit(cache=True)
def _from_hub(
    rows: NDArray[np.int64],
    columns: NDArray[np.int64],
    problem: Problem,
    answer: Assignment,
    frontier: Frontier,
    use_heap: bool,
    hub_distance: NDArray[np.float64],
) -> None:
    """Distance from the hub to every column of a component, written into `hub_distance`.

    rows, columns : the component's.
    """
    for j in columns:
        if answer.column_row[j] >= 0:
            leave = max(0.0, problem.new[j] - answer.column_price[j])
            offer(frontier, j, leave, -1, -1, use_heap)
    for i in rows:
        if answer.row_candidate[i] < 0:
            _offer_candidates(i, 0.0, np.inf, problem, answer, frontier, use_heap)
    while True:
        j = nearest(frontier, use_heap)
        if j < 0:
            break
        frontier.done[j] = True
        i = answer.column_row[j]
        if i >= 0:
            _offer_candidates(i, frontier.distance[j], np.inf, problem, answer, frontier, use_heap)
    for j in columns:
        hub_distance[j] = frontier.distance[j]
    clear(frontier)


@njit(cache=True)
def _from_row(
    row: int,
    target: int,
    problem: Problem,
    answer: Assignment,
    frontier: Frontier,
    use_heap: bool,
    onward: float,
) -> float:
    """Distance from a row to the column `target`, or to the hub if that is −1.

    `onward` is the distance from the hub to the target, so that the hub need not be expanded.
    The search stops as soon as nothing nearer can follow.
    """
    best = np.inf
    if answer.row_candidate[row] >= 0:
        best = max(0.0, problem.miss[row] - answer.row_price[row]) + onward
    _offer_candidates(row, 0.0, best, problem, answer, frontier, use_heap)
    while True:
        j = nearest(frontier, use_heap)
        if j < 0 or frontier.distance[j] >= best:
            break
        here = frontier.distance[j]
        if j == target:
            best = here
            break
        frontier.done[j] = True
        i = answer.column_row[j]
        if i < 0:
            best = min(best, here + onward)
            continue
        best = min(best, here + max(0.0, problem.miss[i] - answer.row_price[i]) + onward)
        _offer_candidates(i, here, best, problem, answer, frontier, use_heap)
    clear(frontier)
    return best


@njit(cache=True)
def margins(
    problem: Problem, components: Components, answer: Assignment, frontier: Frontier
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Exact margin of every decision.

    frontier : scratch of `problem_frontier`, clear before and after.

    Returns
    -------
    (n,) margin of what was decided for each row: its pair, or being missed.
    (m,) margin of what was decided for each column: its pair, or being new.
    """
    row_margin = np.full(len(problem.miss), np.inf)
    column_margin = np.full(len(problem.new), np.inf)
    # Most components hold one candidate and are done at once; the others are grouped.
    group = np.full(len(components.candidates), -1, np.int64)
    groups = 0
    for c in range(len(components.candidates)):
        if components.candidates[c] > 1:
            group[c] = groups
            groups += 1
    row_group = np.empty(len(problem.miss), np.int64)
    for i in range(len(problem.miss)):
        c = components.of_row[i]
        row_group[i] = group[c]
        if components.candidates[c] == 1 and problem.start[i] < problem.start[i + 1]:
            _lone_candidate(i, problem, row_margin, column_margin)
    if groups == 0:
        return row_margin, column_margin
    column_group = np.empty(len(problem.new), np.int64)
    for j in range(len(problem.new)):
        column_group[j] = group[components.of_column[j]]
    hub_distance = np.empty(len(problem.new))
    row_start, row = members(row_group, groups)
    column_start, column = members(column_group, groups)
    for k in range(groups):
        rows = row[row_start[k] : row_start[k + 1]]
        columns = column[column_start[k] : column_start[k + 1]]
        candidates = components.candidates[components.of_row[rows[0]]]
        use_heap = prefers_heap(len(rows), len(columns), candidates)
        _from_hub(rows, columns, problem, answer, frontier, use_heap, hub_distance)
        for i in rows:
            j = answer.row_column[i]
            onward = hub_distance[j] if j >= 0 else 0.0
            row_margin[i] = _from_row(i, j, problem, answer, frontier, use_heap, onward)
            if j >= 0:
                column_margin[j] = row_margin[i]
        for j in columns:
            if answer.column_row[j] < 0:
                column_margin[j] = hub_distance[j]
    return row_margin, column_margin


@njit(cache=True)
def _lone_candidate(
    row: int,
    problem: Problem,
    row_margin: NDArray[np.float64],
    column_margin: NDArray[np.float64],
) -> None:
    """One row, one column: paired or apart, the other is |c − a − b| dearer."""
    e = problem.start[row]
    j = problem.column[e]
    apart = problem.miss[row] + problem.new[j]
    margin = abs(apart - problem.cost[e])
    row_margin[row] = margin
    column_margin[j] = margin


@njit(cache=True)
def _spread(
    row: int, problem: Problem, answer: Assignment, frontier: Frontier, use_heap: bool
) -> float:
    """Distances from a paired row to all columns, left in `frontier`; returns that to the hub."""
    to_hub = max(0.0, problem.miss[row] - answer.row_price[row])
    _offer_candidates(row, 0.0, np.inf, problem, answer, frontier, use_heap)
    while True:
        j = nearest(frontier, use_heap)
        if j < 0:
            break
        frontier.done[j] = True
        here = frontier.distance[j]
        i = answer.column_row[j]
        if i < 0:
            to_hub = min(to_hub, here)
            continue
        to_hub = min(to_hub, here + max(0.0, problem.miss[i] - answer.row_price[i]))
        _offer_candidates(i, here, np.inf, problem, answer, frontier, use_heap)
    return to_hub


@njit(cache=True)
def force_costs(
    problem: Problem,
    components: Components,
    answer: Assignment,
    wanted: NDArray[np.bool_],
    frontier: Frontier,
) -> NDArray[np.float64]:
    """Exact force cost of every unchosen candidate.

    wanted : (C,) for which components; the others stay nan.   frontier : as in `margins`.

    Returns (E,) nats; 0 for chosen candidates.
    """
    force = np.full(len(problem.column), np.nan)
    hub_distance = np.empty(len(problem.new))
    count = len(components.candidates)
    row_start, row = members(components.of_row, count)
    column_start, column = members(components.of_column, count)
    for c in range(count):
        if not wanted[c] or components.candidates[c] == 0:
            continue
        use_heap = prefers_heap(components.rows[c], components.columns[c], components.candidates[c])
        rows = row[row_start[c] : row_start[c + 1]]
        columns = column[column_start[c] : column_start[c + 1]]
        _from_hub(rows, columns, problem, answer, frontier, use_heap, hub_distance)
        start, entry = _by_column(rows, columns, components.candidates[c], problem)
        for k in range(len(columns)):
            j = columns[k]
            holder = answer.column_row[j]
            to_hub = 0.0
            if holder >= 0 and start[k + 1] - start[k] > 1:
                to_hub = _spread(holder, problem, answer, frontier, use_heap)
            for at in range(start[k], start[k + 1]):
                i = entry[at, 0]
                e = entry[at, 1]
                if e == answer.row_candidate[i]:
                    force[e] = 0.0
                    continue
                left = answer.row_column[i]
                way = to_hub + (hub_distance[left] if left >= 0 else 0.0)
                if holder >= 0 and left >= 0:
                    way = min(way, frontier.distance[left])
                reduced = problem.cost[e] - answer.row_price[i] - answer.column_price[j]
                force[e] = max(0.0, reduced) + way
            clear(frontier)
    return force


@njit(cache=True)
def _by_column(
    rows: NDArray[np.int64], columns: NDArray[np.int64], candidates: int, problem: Problem
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """A component's candidates grouped by its columns: starts, and (row, candidate) of each."""
    start = np.zeros(len(columns) + 1, np.int64)
    for i in rows:
        for e in range(problem.start[i], problem.start[i + 1]):
            start[np.searchsorted(columns, problem.column[e]) + 1] += 1
    for k in range(len(columns)):
        start[k + 1] += start[k]
    fill = start[: len(columns)].copy()
    entry = np.empty((candidates, 2), np.int64)
    for i in rows:
        for e in range(problem.start[i], problem.start[i + 1]):
            at = np.searchsorted(columns, problem.column[e])
            entry[fill[at], 0] = i
            entry[fill[at], 1] = e
            fill[at] += 1
    return start, entry
