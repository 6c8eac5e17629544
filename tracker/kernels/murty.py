"""The k best assignments in order of cost (Murty 1968).

An event is one choice a row: a candidate or the miss. A *part* is a set of events: rows before
`first` are settled, some candidates of row `first` are barred, the rest is free; it is known by
its cheapest event. To take that event out, the part is split at each free row t in turn: rows
before t settled as in the event, row t doing anything else. "Anything but candidate e" bars e.
"Anything but the miss" is one part for each candidate that row t might take, with t settled, so
that nothing is ever forced by a large number. Parts do not overlap and leave no event out.

Two bounds save work. An event that departs from the cheapest one at row t is dearer by at least
the smallest reduced cost that row t has left (prices of the part's optimum), so a part that
cannot come among the k best is not solved. And what all parts that are never opened can weigh
together is summed up, an upper bound of the probability left out (`Ranking.rest`).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.assignment import Problem, assign, problem_frontier
from tracker.kernels.components import Components
from tracker.kernels.frontier import Frontier
from tracker.kernels.part import Weights, event_weights


class Ranking(NamedTuple):
    """The cheapest events of one component, all different; equal costs in a fixed order."""

    cost: NDArray[np.float64]  # (r,) increasing, r ≤ k
    row_candidate: NDArray[np.int64]  # (r, n) candidate of each row, -1: missed
    rest: float  # bound of Σ exp(cost[0] − cost) over all events not listed


class _Parts(NamedTuple):
    """Unopened parts: `order` sorts the slots by cost, the first found first."""

    order: NDArray[np.int64]  # (k + 1,) slots in use, then free ones
    used: NDArray[np.int64]  # (1,) how many are in use
    cost: NDArray[np.float64]  # (k + 1,) of the cheapest event
    first: NDArray[np.int64]  # (k + 1,) rows before it are settled
    barred: NDArray[np.bool_]  # (k + 1, most candidates of a row) of row `first`
    row_candidate: NDArray[np.int64]  # (k + 1, n) the cheapest event
    row_price: NDArray[np.float64]  # (k + 1, n) its prices: of free rows, …
    column_price: NDArray[np.float64]  # (k + 1, m) … of columns that no settled row has
    mass: NDArray[np.float64]  # (k + 1,) bound of the weight of all its events


@njit(cache=True)
def event_bound(problem: Problem) -> float:
    """Upper bound of the number of events: Π (1 + candidates), over rows or over columns."""
    by_row = 1.0
    for i in range(len(problem.miss)):
        by_row *= 1.0 + (problem.start[i + 1] - problem.start[i])
    count = np.zeros(len(problem.new))
    for j in problem.column:
        count[j] += 1.0
    by_column = 1.0
    for j in range(len(count)):
        by_column *= 1.0 + count[j]
    return min(by_row, by_column)


@njit(cache=True)
def event_cost(problem: Problem, row_candidate: NDArray[np.int64], event: int) -> float:
    """Cost of an event, always added up in the same order."""
    total = problem.new.sum()
    for i in range(len(problem.miss)):
        e = row_candidate[event, i]
        if e < 0:
            total += problem.miss[i]
        else:
            total += problem.cost[e] - problem.new[problem.column[e]]
    return total


@njit(cache=True)
def _mass(
    problem: Problem,
    weights: Weights,
    parts: _Parts,
    slot: int,
    free: NDArray[np.bool_],
    dearer: float,
) -> float:
    """Upper bound of the weight of all events of a part, relative to the best event of all.

    free : (m,) columns that no settled row has.   dearer : how much more than the best event its
    events cost at least.

    The smaller of two: the product of what each free row may weigh, as if rows never collided,
    and the number of events times the weight of the best.
    """
    product = 1.0
    count = 1.0
    first = parts.first[slot]
    reachable = np.zeros(len(free), np.bool_)
    for i in range(len(weights.miss)):
        if i < first:
            e = parts.row_candidate[slot, i]
            product *= weights.miss[i] if e < 0 else weights.pair[e]
            continue
        total = weights.miss[i]
        options = 1.0
        for e in range(problem.start[i], problem.start[i + 1]):
            j = problem.column[e]
            if free[j] and not (i == first and parts.barred[slot, e - problem.start[i]]):
                total += weights.pair[e]
                options += 1.0
                reachable[j] = True
        product *= total
        count *= options
    for j in range(len(free)):
        if free[j] and not reachable[j]:
            product *= weights.new[j]
    counted = count * np.exp(-max(0.0, dearer))
    if counted < product or np.isnan(product):
        return counted
    return product


@njit(cache=True)
def _solve_part(
    problem: Problem, parts: _Parts, slot: int, free: NDArray[np.bool_], frontier: Frontier
) -> None:
    """Find the cheapest event of a part and its prices: an assignment of the free rows."""
    first = parts.first[slot]
    rows = len(problem.miss) - first
    most = problem.start[-1] - problem.start[first]
    start = np.zeros(rows + 1, np.int64)
    column = np.empty(most, np.int64)
    cost = np.empty(most)
    source = np.empty(most, np.int64)
    count = 0
    for i in range(first, len(problem.miss)):
        for e in range(problem.start[i], problem.start[i + 1]):
            if not free[problem.column[e]]:
                continue
            if i == first and parts.barred[slot, e - problem.start[i]]:
                continue
            column[count] = problem.column[e]
            cost[count] = problem.cost[e]
            source[count] = e
            count += 1
        start[i - first + 1] = count
    left = Problem(start, column[:count], cost[:count], problem.miss[first:], problem.new)
    answer = assign(left, _whole(left), frontier)
    for i in range(rows):
        e = answer.row_candidate[i]
        parts.row_candidate[slot, first + i] = source[e] if e >= 0 else -1
        parts.row_price[slot, first + i] = answer.row_price[i]
    parts.column_price[slot] = answer.column_price
    parts.cost[slot] = event_cost(problem, parts.row_candidate, slot)


@njit(cache=True)
def _whole(problem: Problem) -> Components:
    """A problem taken as one component, connected or not."""
    return Components(
        np.zeros(len(problem.miss), np.int64),
        np.zeros(len(problem.new), np.int64),
        np.full(1, len(problem.miss)),
        np.full(1, len(problem.new)),
        np.full(1, len(problem.column)),
    )


@njit(cache=True)
def _insert(parts: _Parts, room: int) -> float:
    """Put the part in the first free slot in its place; returns the mass of what falls out.

    room : most parts that are still of use.
    """
    count = parts.used[0]
    slot = parts.order[count]
    at = count
    while at > 0 and parts.cost[slot] < parts.cost[parts.order[at - 1]]:
        parts.order[at] = parts.order[at - 1]
        at -= 1
    parts.order[at] = slot
    parts.used[0] = count + 1
    return _trim(parts, room)


@njit(cache=True)
def _trim(parts: _Parts, room: int) -> float:
    """Let go of the dearest parts beyond `room`; returns their mass."""
    lost = 0.0
    while parts.used[0] > room:
        parts.used[0] -= 1
        lost += parts.mass[parts.order[parts.used[0]]]
    return lost


@njit(cache=True)
def _dearest(parts: _Parts, room: int) -> float:
    """Cost that a new part must stay below to be of use."""
    if parts.used[0] < room:
        return np.inf
    return parts.cost[parts.order[parts.used[0] - 1]] if room > 0 else -np.inf


@njit(cache=True)
def _without(
    problem: Problem,
    parts: _Parts,
    opened: int,
    row: int,
    candidate: int,
    slot: int,
    free: NDArray[np.bool_],
) -> float:
    """Part in which a row does not take a candidate; returns how much dearer it is at least.

    That is the smallest reduced cost of what the row may do instead.
    """
    parts.first[slot] = row
    parts.row_candidate[slot, :row] = parts.row_candidate[opened, :row]
    if row == parts.first[opened]:
        parts.barred[slot] = parts.barred[opened]
    else:
        parts.barred[slot] = False
    parts.barred[slot, candidate - problem.start[row]] = True
    u = parts.row_price[opened, row]
    least = problem.miss[row] - u
    for e in range(problem.start[row], problem.start[row + 1]):
        j = problem.column[e]
        if free[j] and not parts.barred[slot, e - problem.start[row]]:
            least = min(least, problem.cost[e] - u - parts.column_price[opened, j])
    return max(0.0, least)


@njit(cache=True)
def _with(
    problem: Problem, parts: _Parts, opened: int, row: int, candidate: int, slot: int
) -> float:
    """Part in which a row takes a candidate instead of its miss; returns the reduced cost."""
    parts.first[slot] = row + 1
    parts.row_candidate[slot, :row] = parts.row_candidate[opened, :row]
    parts.row_candidate[slot, row] = candidate
    parts.barred[slot] = False
    price = parts.row_price[opened, row]
    price += parts.column_price[opened, problem.column[candidate]]
    return max(0.0, problem.cost[candidate] - price)


@njit(cache=True)
def _consider(
    problem: Problem,
    weights: Weights,
    parts: _Parts,
    at_least: float,
    best: float,
    free: NDArray[np.bool_],
    room: int,
    frontier: Frontier,
) -> float:
    """Solve the part in the first free slot and keep it, or let it go; returns the mass lost.

    at_least : what its events cost at least.   best : cost of the best event of all.
    """
    slot = parts.order[parts.used[0]]
    if at_least >= _dearest(parts, room):
        return _mass(problem, weights, parts, slot, free, at_least - best)
    _solve_part(problem, parts, slot, free, frontier)
    parts.mass[slot] = _mass(problem, weights, parts, slot, free, parts.cost[slot] - best)
    return _insert(parts, room)


@njit(cache=True)
def _split(
    problem: Problem,
    weights: Weights,
    parts: _Parts,
    opened: int,
    best: float,
    room: int,
    frontier: Frontier,
) -> float:
    """Split an opened part into all its events but the cheapest; returns the mass let go of."""
    lost = 0.0
    free = np.ones(len(problem.new), np.bool_)
    first = parts.first[opened]
    for t in range(len(problem.miss)):
        taken = parts.row_candidate[opened, t]
        if t >= first:
            for e in range(problem.start[t], problem.start[t + 1]):
                barred = t == first and parts.barred[opened, e - problem.start[t]]
                # Either bar the candidate that was taken, or take one instead of the miss.
                if barred or not free[problem.column[e]] or (taken >= 0 and e != taken):
                    continue
                slot = parts.order[parts.used[0]]
                if taken >= 0:
                    more = _without(problem, parts, opened, t, e, slot, free)
                else:
                    more = _with(problem, parts, opened, t, e, slot)
                    free[problem.column[e]] = False
                at_least = parts.cost[opened] + more
                lost += _consider(problem, weights, parts, at_least, best, free, room, frontier)
                free[problem.column[e]] = True
        if taken >= 0:
            free[problem.column[taken]] = False
    return lost


@njit(cache=True)
def _room_for_parts(problem: Problem, k: int) -> _Parts:
    rows, columns = len(problem.miss), len(problem.new)
    degree = 0
    for i in range(rows):
        degree = max(degree, problem.start[i + 1] - problem.start[i])
    size = k + 2  # unopened parts, the one being opened, one on trial
    return _Parts(
        np.arange(size),
        np.zeros(1, np.int64),
        np.empty(size),
        np.zeros(size, np.int64),
        np.zeros((size, degree), np.bool_),
        np.full((size, rows), -1),
        np.empty((size, rows)),
        np.empty((size, columns)),
        np.zeros(size),
    )


@njit(cache=True)
def _take_first(parts: _Parts) -> int:
    """Slot of the cheapest part; it moves behind all others, where no new part overwrites it."""
    opened = parts.order[0]
    for at in range(len(parts.order) - 1):
        parts.order[at] = parts.order[at + 1]
    parts.order[-1] = opened
    parts.used[0] -= 1
    return opened


@njit(cache=True)
def rank_component(problem: Problem, k: int) -> Ranking:
    """The k cheapest events of one component, numbered as `part_of` does."""
    k = int(min(float(k), event_bound(problem)))
    frontier = problem_frontier(problem)
    parts = _room_for_parts(problem, k)
    all_free = np.ones(len(problem.new), np.bool_)
    _solve_part(problem, parts, 0, all_free, frontier)
    weights = event_weights(problem, parts.row_price[0], parts.column_price[0])
    _insert(parts, k)
    cost = np.empty(k)
    row_candidate = np.empty((k, len(problem.miss)), np.int64)
    found = 0
    rest = 0.0
    while parts.used[0] > 0:
        opened = _take_first(parts)
        cost[found] = parts.cost[opened]
        row_candidate[found] = parts.row_candidate[opened]
        found += 1
        rest += _trim(parts, k - found)
        rest += _split(problem, weights, parts, opened, cost[0], k - found, frontier)
    by_cost = np.argsort(cost[:found], kind="mergesort")  # rounding may have swapped equals
    return Ranking(cost[by_cost], row_candidate[by_cost], rest)
