"""Slow twins of kernels/assignment.py: dense matrices, scipy as the solver, no prices needed."""

import numpy as np
from scipy.optimize import linear_sum_assignment


def square(allowed, cost, miss, new):
    """The optional problem as a square one: private miss columns, private new rows."""
    n, m = allowed.shape
    full = np.full((n + m, n + m), np.inf)
    full[:n, :m] = np.where(allowed, cost, np.inf)
    for i in range(n):
        full[i, m + i] = miss[i]
    for j in range(m):
        full[n + j, j] = new[j]
    full[n:, m:] = 0.0
    return full


def best(full):
    """Cost of the cheapest perfect matching, inf if there is none."""
    if not len(full):
        return 0.0
    try:
        rows, columns = linear_sum_assignment(full)
    except ValueError:  # scipy's word for 'infeasible'
        return np.inf
    return full[rows, columns].sum()


def assign(allowed, cost, miss, new):
    """Optimal cost of the optional assignment problem."""
    return best(square(allowed, cost, miss, new))


def certify(allowed, cost, miss, new, row_price, column_price, total):
    """(gap, violation) of prices for an answer of that total cost, over the whole frame."""
    violation = 0.0
    for i in range(len(miss)):
        violation = max(violation, row_price[i] - miss[i])
        for j in range(len(new)):
            if allowed[i, j]:
                violation = max(violation, row_price[i] + column_price[j] - cost[i, j])
    for j in range(len(new)):
        violation = max(violation, column_price[j] - new[j])
    return total - sum(row_price) - sum(column_price), violation
