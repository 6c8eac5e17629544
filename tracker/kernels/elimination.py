"""Exact probabilities of all decisions of a component, by a sum over all its joint events.

Rows are taken one after the other; what must be remembered of the past is only which of the
*open* columns are used: those that an earlier row and a later row both have as a candidate. With
F_t(S) the total weight of what rows before step t may do so that exactly the open columns S are
used, and B_t(S) the total weight of what may follow,

    F_{t+1}(S′) = Σ F_t(S) · weight of the row's choice, S → S′
    P(choice)   = Σ_S F_t(S) · weight of the choice · B_{t+1}(S′) / Σ_S F_t(S) B_t(S)

(variable elimination; the forward-backward recursion of Baum et al. 1970 on sets). Columns that
close are summed over, unused ones with their own weight. Work is Σ_t 2^(open columns) · choices,
so a long chain of tracks is as easy as a short one, and a dense component costs
2^min(rows, columns), since rows and columns may change places. All terms are positive: nothing
cancels.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.part import Weights, turned


class Plan(NamedTuple):
    """In which order rows are taken, and which bit of a set stands for which column."""

    order: NDArray[np.int64]  # (n,) row of each step
    slot: NDArray[np.int64]  # (m,) bit of each column while it is open
    closes: NDArray[np.int64]  # (m,) step after which the column closes, -1: no row has it
    before: NDArray[np.int64]  # (n + 1,) bits in use before each step …
    during: NDArray[np.int64]  # (n,) … and in it
    width: int  # most bits in any step; above the limit: the plan was given up


@njit(cache=True)
def _next_row(
    fresh: NDArray[np.int64],
    left: NDArray[np.int64],
    weights: Weights,
    taken: NDArray[np.bool_],
) -> int:
    """Row that opens the fewest columns; of those the one that closes most; then the first.

    fresh : (n,) columns of each row that are not open yet.   left : (m,) rows of each column that
    have not been taken.
    """
    best = -1
    best_closing = -1
    for i in range(len(fresh)):
        if taken[i] or (best >= 0 and fresh[i] > fresh[best]):
            continue
        closing = 0
        for e in range(weights.start[i], weights.start[i + 1]):
            closing += left[weights.column[e]] == 1
        if best < 0 or fresh[i] < fresh[best] or closing > best_closing:
            best = i
            best_closing = closing
    return best


@njit(cache=True)
def _plan(weights: Weights, across: Weights, limit: int) -> Plan:
    """Choose the order greedily. across : the same weights, turned."""
    rows, columns = len(weights.miss), len(weights.new)
    order = np.full(rows, -1, np.int64)
    slot = np.full(columns, -1, np.int64)
    closes = np.full(columns, -1, np.int64)
    before = np.zeros(rows + 1, np.int64)
    during = np.zeros(rows, np.int64)
    fresh = weights.start[1:] - weights.start[:-1]
    left = across.start[1:] - across.start[:-1]
    taken = np.zeros(rows, np.bool_)
    busy = np.zeros(limit + 1, np.bool_)  # slots
    width = 0
    for t in range(rows):
        i = _next_row(fresh, left, weights, taken)
        order[t] = i
        taken[i] = True
        top = before[t]
        for e in range(weights.start[i], weights.start[i + 1]):
            j = weights.column[e]
            left[j] -= 1
            if slot[j] >= 0:
                continue
            for other in range(across.start[j], across.start[j + 1]):
                fresh[across.column[other]] -= 1
            s = 0
            while busy[s]:
                s += 1
            if s == limit:
                return Plan(order, slot, closes, before, during, limit + 1)
            slot[j] = s
            busy[s] = True
            top = max(top, s + 1)
        during[t] = top
        width = max(width, top)
        for e in range(weights.start[i], weights.start[i + 1]):
            j = weights.column[e]
            if left[j] == 0:
                closes[j] = t
                busy[slot[j]] = False
        while top > 0 and not busy[top - 1]:
            top -= 1
        before[t + 1] = top
    return Plan(order, slot, closes, before, during, width)


@njit(cache=True)
def _choose(
    weights: Weights,
    plan: Plan,
    t: int,
    forward: NDArray[np.float64],
    at: int,
    work: NDArray[np.float64],
) -> None:
    """Weights of the sets after the choice of step t, before any column closes, into `work`.

    at : where F_t begins in `forward`.
    """
    i = plan.order[t]
    size = 1 << plan.before[t]
    work[: 1 << plan.during[t]] = 0.0
    for used in range(size):
        work[used] = forward[at + used] * weights.miss[i]
    for e in range(weights.start[i], weights.start[i + 1]):
        bit = 1 << plan.slot[weights.column[e]]
        weight = weights.pair[e]
        for block in range(0, size, 2 * bit):  # the sets without the bit, run by run
            for used in range(block, min(block + bit, size)):
                work[used + bit] += forward[at + used] * weight


@njit(cache=True)
def _forward(weights: Weights, plan: Plan) -> tuple[NDArray[np.int64], NDArray[np.float64]]:
    """F of all steps, one behind the other: where each begins, and the values.

    Each F_t is scaled to a largest value of 1, and each B_t so that Σ F_t B_t = 1: probabilities
    are ratios within a step, and a chain of a thousand tracks has more events than fit a float.
    """
    rows = len(weights.miss)
    at = np.zeros(rows + 2, np.int64)
    for t in range(rows + 1):
        at[t + 1] = at[t] + (1 << plan.before[t])
    forward = np.zeros(at[rows + 1])
    forward[0] = 1.0
    work = np.zeros(1 << plan.width)
    for t in range(rows):
        _choose(weights, plan, t, forward, at[t], work)
        i = plan.order[t]
        size = 1 << plan.during[t]
        for e in range(weights.start[i], weights.start[i + 1]):
            j = weights.column[e]
            if plan.closes[j] != t:
                continue
            bit = 1 << plan.slot[j]
            for block in range(0, size, 2 * bit):
                for used in range(block, block + bit):
                    work[used] = work[used] * weights.new[j] + work[used + bit]
                    work[used + bit] = 0.0
        size = 1 << plan.before[t + 1]
        largest = work[:size].max()
        for used in range(size):
            forward[at[t + 1] + used] = work[used] / largest
    return at, forward


@njit(cache=True)
def _reopen(weights: Weights, plan: Plan, t: int, after: NDArray[np.float64]) -> bool:
    """B_{t+1} as a function of the sets in step t, in place; whether any column closes there."""
    i = plan.order[t]
    size = 1 << plan.during[t]
    after[1 << plan.before[t + 1] : size] = 0.0
    closing = False
    for e in range(weights.start[i], weights.start[i + 1]):
        j = weights.column[e]
        if plan.closes[j] != t:
            continue
        closing = True
        bit = 1 << plan.slot[j]
        for block in range(0, size, 2 * bit):
            for used in range(block, block + bit):
                after[used + bit] = after[used]
                after[used] *= weights.new[j]
    return closing


@njit(cache=True)
def _backward(
    weights: Weights,
    plan: Plan,
    at: NDArray[np.int64],
    forward: NDArray[np.float64],
    pair: NDArray[np.float64],
    miss: NDArray[np.float64],
    new: NDArray[np.float64],
) -> None:
    """Probabilities of all choices, from the last step back to the first, into the outputs."""
    after = np.zeros(1 << plan.width)
    after[0] = 1.0
    work = np.zeros(1 << plan.width)
    for t in range(len(weights.miss) - 1, -1, -1):
        i = plan.order[t]
        first, last = weights.start[i], weights.start[i + 1]
        closing = _reopen(weights, plan, t, after)
        if closing:
            _choose(weights, plan, t, forward, at[t], work)
            for e in range(first, last):
                if plan.closes[weights.column[e]] == t:
                    bit = 1 << plan.slot[weights.column[e]]
                    unused = 0.0
                    for block in range(0, 1 << plan.during[t], 2 * bit):
                        for used in range(block, block + bit):
                            unused += work[used] * after[used]
                    new[weights.column[e]] = unused
        size = 1 << plan.before[t]
        total = 0.0
        for used in range(size):
            work[used] = weights.miss[i] * after[used]
            total += forward[at[t] + used] * work[used]
        miss[i] = total
        for e in range(first, last):
            bit = 1 << plan.slot[weights.column[e]]
            weight = weights.pair[e]
            share = 0.0
            for block in range(0, size, 2 * bit):
                for used in range(block, min(block + bit, size)):
                    follow = weight * after[used + bit]
                    work[used] += follow
                    share += forward[at[t] + used] * follow
            pair[e] = share
            total += share
        after[:size] = work[:size] / total
        miss[i] /= total
        for e in range(first, last):
            pair[e] /= total
            if plan.closes[weights.column[e]] == t:
                new[weights.column[e]] /= total


@njit(cache=True)
def exact_marginals(
    weights: Weights, limit: int
) -> tuple[int, NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Probability of every pair, of every miss and of every column being new.

    weights : of `event_weights`.   limit : most columns (or rows) that may be open at once; work
    and memory double with each.

    Returns the number that were open at once, and the (E,), (n,), (m,) probabilities; if the
    number is above the limit they mean nothing.
    """
    across, source = turned(weights)
    by_row = _plan(weights, across, limit)
    by_column = _plan(across, weights, min(limit, by_row.width))
    pair = np.zeros(len(weights.pair))
    miss = np.ones(len(weights.miss))  # what has no candidates stays missed, or new
    new = np.ones(len(weights.new))
    width = min(by_row.width, by_column.width)
    if width > limit:
        return width, pair, miss, new
    if by_row.width <= by_column.width:
        at, forward = _forward(weights, by_row)
        _backward(weights, by_row, at, forward, pair, miss, new)
        return width, pair, miss, new
    at, forward = _forward(across, by_column)
    turned_pair = np.zeros(len(pair))
    _backward(across, by_column, at, forward, turned_pair, new, miss)
    for e in range(len(pair)):
        pair[source[e]] = turned_pair[e]
    return width, pair, miss, new
