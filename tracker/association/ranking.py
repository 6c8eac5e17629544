"""The k best assignments: what else the detections might have meant, and how much dearer."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tracker.association.problem import checked_count, checked_problem
from tracker.errors import UsageError
from tracker.kernels import ranking as kernel
from tracker.kernels.assignment import Problem
from tracker.kernels.components import label_components
from tracker.kernels.murty import rank_component
from tracker.kernels.part import part_of
from tracker.log.model import Floats, Ints


@dataclass(frozen=True, slots=True, eq=False)
class RankedAssignments:
    """The cheapest joint assignments, all different, cheapest first.

    row, column : (n,), (m,) which rows and columns of the problem are meant: all, or one
    component's.   cost : (r,) nats, misses and new detections included.
    row_column : (r, n) column of each row in each assignment, -1 for a miss; the columns that do
    not appear are new.
    left_out : upper bound of the share that all other assignments have in Σ exp(−cost). It is
    an exact sum's error bound, not an estimate, and can be far above the truth.
    """

    row: Ints
    column: Ints
    cost: Floats
    row_column: Ints
    left_out: float

    def __len__(self) -> int:
        return len(self.cost)


def k_best(problem: Problem, k: int, *, component: int | None = None) -> RankedAssignments:
    """The k cheapest distinct assignments of a problem or of one of its components (Murty 1968).

    Parameters
    ----------
    problem : an optional assignment problem, such as `TierDecision.problem`.
    k : how many at most; there may be fewer assignments than that. Memory is of order k (n + m).
    component : number of the component, as in `TierDecision.components`; all if None.

    The first is the optimum. Equal costs come in an order that depends on nothing but the
    problem. With costs in nats, exp(cost[0] - cost[r]) are the odds of assignment r against the
    best.

    Raises UsageError for a problem that is not one, a k below 1 or a component that is not there.

    >>> problem = Problem(
    ...     start=np.array([0, 2, 4]), column=np.array([0, 1, 0, 1]),
    ...     cost=np.array([0.0, 1.0, 2.0, 0.5]), miss=np.full(2, 3.0), new=np.zeros(2),
    ... )
    >>> best = k_best(problem, 3)
    >>> best.cost
    array([0.5, 3. , 3. ])
    >>> best.row_column
    array([[ 0,  1],
           [ 1,  0],
           [ 0, -1]])
    """
    problem = checked_problem(problem)
    k = checked_count("k", k)
    components = label_components(problem.start, problem.column, len(problem.new))
    if component is None:
        row, column = np.arange(len(problem.miss)), np.arange(len(problem.new))
        ranking = kernel.k_best(problem, components, k)
        source = np.arange(len(problem.column))
    else:
        count = len(components.candidates)
        if not 0 <= component < count:
            raise UsageError(f"there is no component {component}, the problem has {count}")
        row = np.flatnonzero(components.of_row == component)
        column = np.flatnonzero(components.of_column == component)
        part, source = part_of(problem, row, column)
        ranking = rank_component(part, k)
    paired = ranking.row_candidate >= 0
    row_column = np.full(paired.shape, -1, np.int64)
    row_column[paired] = problem.column[source[ranking.row_candidate[paired]]]
    listed = np.exp(ranking.cost[0] - ranking.cost).sum()
    return RankedAssignments(
        row=row,
        column=column,
        cost=ranking.cost,
        row_column=row_column,
        left_out=float(1.0 - listed / (listed + ranking.rest)),
    )
