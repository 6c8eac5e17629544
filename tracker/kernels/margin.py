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

With G_i the distance from row i to the hub and H_j that from the hub to column j,

    margin of missing row i      G_i
    margin of new column j       H_j
    margin of pair (i, j)        distance from i to j: G_i + H_j, or a path around the hub
    force cost of candidate e    r_e + distance from what holds its column to what its row holds

A path around the hub closes a cycle of candidates, so only components with cycles are searched for
one. A decision that nothing could replace has margin inf.
"""

from __future__ import annotations

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.assignment import Assignment, Problem
from tracker.kernels.components import Components
from tracker.kernels.frontier import Frontier, clear, nearest, offer, prefers_heap


@njit(cache=True)
def hub_distances(
    problem: Problem, components: Components, answer: Assignment
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """(n,) distances G from each row to the hub, (m,) distances H from the hub to each column.

    Label correcting (Bellman 1958; Ford 1956): the rows of a component are gone through again as
    long as one of its distances fell. Few rounds are needed, since the direct way is rarely beaten
    by one of many steps.
    """
    start, column, cost, miss, new = problem
    row_candidate, row_column, column_row, row_price, column_price = answer
    to_hub = np.empty(len(miss))
    from_hub = np.empty(len(new))
    for i in range(len(miss)):
        paired = row_candidate[i] >= 0
        to_hub[i] = max(0.0, miss[i] - row_price[i]) if paired else np.inf
    for j in range(len(new)):
        paired = column_row[j] >= 0
        from_hub[j] = max(0.0, new[j] - column_price[j]) if paired else np.inf
    active = components.candidates > 0
    falling = np.empty(len(active), np.bool_)
    again = True
    while again:
        again = False
        falling[:] = False
        for i in range(len(miss)):
            c = components.of_row[i]
            if not active[c]:
                continue
            reached = from_hub[row_column[i]] if row_candidate[i] >= 0 else 0.0
            price = row_price[i]
            for e in range(start[i], start[i + 1]):
                if e == row_candidate[i]:
                    continue
                j = column[e]
                step = max(0.0, cost[e] - price - column_price[j])
                onward = to_hub[column_row[j]] if column_row[j] >= 0 else 0.0
                if step + onward < to_hub[i]:
                    to_hub[i] = step + onward
                    falling[c] = True
                if reached + step < from_hub[j]:
                    from_hub[j] = reached + step
                    falling[c] = True
            again |= falling[c]
        active[:] = falling
    return to_hub, from_hub


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
    row_margin, column_margin = hub_distances(problem, components, answer)
    for i in range(len(problem.miss)):
        if answer.row_column[i] >= 0:
            row_margin[i] += column_margin[answer.row_column[i]]
    for c in range(len(components.candidates)):
        if _has_cycle(components, c):
            _go_around(problem, components, answer, frontier, row_margin)
            break
    for j in range(len(problem.new)):
        if answer.column_row[j] >= 0:
            column_margin[j] = row_margin[answer.column_row[j]]
    return row_margin, column_margin


@njit(cache=True)
def _go_around(
    problem: Problem,
    components: Components,
    answer: Assignment,
    frontier: Frontier,
    row_margin: NDArray[np.float64],
) -> None:
    """Lower the margins of pairs in components with cycles, where a way around the hub is less."""
    leave, enter = _cheapest_steps(problem, answer)
    for i in range(len(problem.miss)):
        j = answer.row_column[i]
        # A way around the hub leaves row i by one candidate and enters column j by another.
        if (
            j >= 0
            and leave[i] + enter[j] < row_margin[i]
            and _has_cycle(components, components.of_row[i])
        ):
            row_margin[i] = _around(
                i, j, row_margin[i], enter[j], problem, components, answer, frontier
            )


@njit(cache=True)
def _has_cycle(components: Components, c: int) -> bool:
    """A connected graph without a cycle has one edge less than nodes."""
    return components.candidates[c] >= components.rows[c] + components.columns[c]


@njit(cache=True)
def _cheapest_steps(
    problem: Problem, answer: Assignment
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """(n,) and (m,) least reduced cost of an unchosen candidate of each row and column."""
    leave = np.full(len(problem.miss), np.inf)
    enter = np.full(len(problem.new), np.inf)
    for i in range(len(problem.miss)):
        for e in range(problem.start[i], problem.start[i + 1]):
            if e != answer.row_candidate[i]:
                j = problem.column[e]
                step = problem.cost[e] - answer.row_price[i] - answer.column_price[j]
                leave[i] = min(leave[i], max(0.0, step))
                enter[j] = min(enter[j], max(0.0, step))
    return leave, enter


@njit(cache=True)
def _around(
    row: int,
    target: int,
    limit: float,
    last_step: float,
    problem: Problem,
    components: Components,
    answer: Assignment,
    frontier: Frontier,
) -> float:
    """Distance from a paired row to column `target` around the hub, if below `limit`, else that.

    last_step : the least that the step into the target costs. Dijkstra 1959, cut short where
    nothing below the limit can follow.
    """
    c = components.of_row[row]
    use_heap = prefers_heap(components.rows[c], components.columns[c], components.candidates[c])
    here = row
    at = 0.0
    while True:
        for e in range(problem.start[here], problem.start[here + 1]):
            if e == answer.row_candidate[here]:
                continue
            j = problem.column[e]
            step = problem.cost[e] - answer.row_price[here] - answer.column_price[j]
            reach = at + max(0.0, step)
            if j == target:
                limit = min(limit, reach)
            elif answer.column_row[j] >= 0 and reach + last_step < limit:
                offer(frontier, j, reach, here, e, use_heap)
        j = nearest(frontier, use_heap)
        if j < 0 or frontier.distance[j] + last_step >= limit:
            break
        frontier.done[j] = True
        here = answer.column_row[j]
        at = frontier.distance[j]
    clear(frontier)
    return limit


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
    to_hub, from_hub = hub_distances(problem, components, answer)
    leave, enter = _cheapest_steps(problem, answer)
    for i in range(len(problem.miss)):
        c = components.of_row[i]
        if not wanted[c]:
            continue
        held = answer.row_column[i]
        onward = from_hub[held] if held >= 0 else 0.0
        for e in range(problem.start[i], problem.start[i + 1]):
            if e == answer.row_candidate[i]:
                force[e] = 0.0
                continue
            j = problem.column[e]
            holder = answer.column_row[j]
            step = max(0.0, problem.cost[e] - answer.row_price[i] - answer.column_price[j])
            way = onward + (to_hub[holder] if holder >= 0 else 0.0)
            # Around the hub; one step may do, from the holder straight to what this row leaves.
            if (
                holder >= 0
                and held >= 0
                and max(leave[holder], enter[held]) < way
                and _has_cycle(components, c)
            ):
                way = _around(holder, held, way, enter[held], problem, components, answer, frontier)
            force[e] = step + way
    return force
