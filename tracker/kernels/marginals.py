"""Probability of every pair, every miss and every new detection over all joint events of a frame.

P(event) ∝ exp(−cost) (Fortmann, Bar-Shalom and Scheffe 1983): that is a probability if
costs are minus log-likelihood ratios in nats. Components are independent. Each is summed exactly
if few enough columns or rows are open at once (`elimination`); else from its k best events
(Murty 1968), which leaves out some probability: `left_out` bounds it.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.assignment import Problem
from tracker.kernels.components import Components, members
from tracker.kernels.elimination import exact_marginals
from tracker.kernels.murty import rank_component
from tracker.kernels.part import event_weights, part_of


class Marginals(NamedTuple):
    """Probabilities of decisions; of one row they sum to 1, and so of one column.

    If a share L of a component's weight is left out, each of its probabilities is off by at most
    L. Say that of the weight W + R of all events R was left out, and that A of W and B of R go
    with the decision: (A + B) / (W + R) − A / W = (B − R · A / W) / (W + R), between −L and L.
    """

    pair: NDArray[np.float64]  # (E,) row i and column j belong together
    miss: NDArray[np.float64]  # (n,) row i has no column
    new: NDArray[np.float64]  # (m,) column j has no row
    left_out: NDArray[np.float64]  # (C,) upper bound of the probability of events not looked at


@njit(cache=True)
def ranked_marginals(
    problem: Problem, ranked: int
) -> tuple[float, NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Probabilities of one component from its `ranked` best events.

    Returns the bound of what is left out, and the (E,), (n,), (m,) probabilities.
    """
    ranking = rank_component(problem, ranked)
    pair = np.zeros(len(problem.column))
    miss = np.zeros(len(problem.miss))
    new = np.zeros(len(problem.new))
    weight = np.exp(ranking.cost[0] - ranking.cost)
    listed = weight.sum()
    used = np.zeros(len(new), np.bool_)
    for r in range(len(weight)):
        share = weight[r] / listed
        used[:] = False
        for i in range(len(miss)):
            e = ranking.row_candidate[r, i]
            if e < 0:
                miss[i] += share
            else:
                pair[e] += share
                used[problem.column[e]] = True
        for j in range(len(new)):
            if not used[j]:
                new[j] += share
    return 1.0 - listed / (listed + ranking.rest), pair, miss, new


@njit(cache=True)
def marginals(
    problem: Problem,
    components: Components,
    row_price: NDArray[np.float64],
    column_price: NDArray[np.float64],
    exact_limit: int,
    ranked: int,
) -> Marginals:
    """All probabilities of a frame.

    row_price, column_price : (n,), (m,) prices of the optimum.   exact_limit : most columns (or
    rows) open at once for an exact sum.   ranked : how many of the best events stand for all
    beyond it.
    """
    pair = np.zeros(len(problem.column))
    miss = np.ones(len(problem.miss))
    new = np.ones(len(problem.new))
    count = len(components.candidates)
    left_out = np.zeros(count)
    row_start, row = members(components.of_row, count)
    column_start, column = members(components.of_column, count)
    for c in range(count):
        if components.candidates[c] == 0:
            continue
        if components.candidates[c] == 1:
            _lone_candidate(row[row_start[c]], problem, pair, miss, new)
            continue
        rows = row[row_start[c] : row_start[c + 1]]
        columns = column[column_start[c] : column_start[c + 1]]
        part, source = part_of(problem, rows, columns)
        weights = event_weights(part, row_price[rows], column_price[columns])
        width, part_pair, part_miss, part_new = exact_marginals(weights, exact_limit)
        if width > exact_limit:
            left_out[c], part_pair, part_miss, part_new = ranked_marginals(part, ranked)
        pair[source] = part_pair
        miss[rows] = part_miss
        new[columns] = part_new
    return Marginals(pair, miss, new, left_out)


@njit(cache=True)
def _lone_candidate(
    row: int,
    problem: Problem,
    pair: NDArray[np.float64],
    miss: NDArray[np.float64],
    new: NDArray[np.float64],
) -> None:
    """One row, one column: two events, apart or together."""
    e = problem.start[row]
    j = problem.column[e]
    gain = problem.miss[row] + problem.new[j] - problem.cost[e]
    less = np.exp(-abs(gain))
    pair[e] = (1.0 if gain >= 0.0 else less) / (1.0 + less)
    miss[row] = (less if gain >= 0.0 else 1.0) / (1.0 + less)
    new[j] = miss[row]
