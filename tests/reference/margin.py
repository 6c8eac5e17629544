"""Slow twins of kernels/margin.py: solve again with the decision forbidden or forced."""

import numpy as np

from tests.reference.assignment import best, square


def margins(allowed, cost, miss, new, row_column, column_row):
    """Margins of all rows and columns by solving again."""
    full = square(allowed, cost, miss, new)
    n, m = allowed.shape
    optimum = best(full)
    of_row = np.empty(n)
    of_column = np.empty(m)
    for i in range(n):
        other = full.copy()
        other[i, row_column[i] if row_column[i] >= 0 else m + i] = np.inf
        of_row[i] = best(other) - optimum
    for j in range(m):
        other = full.copy()
        other[column_row[j] if column_row[j] >= 0 else n + j, j] = np.inf
        of_column[j] = best(other) - optimum
    return of_row, of_column


def hub_distances(allowed, cost, miss, new, row_column, column_row):
    """G of missed rows and H of new columns are their margins; nan where they are not that."""
    of_row, of_column = margins(allowed, cost, miss, new, row_column, column_row)
    return (
        np.where(np.asarray(row_column) < 0, of_row, np.nan),
        np.where(np.asarray(column_row) < 0, of_column, np.nan),
    )


def force_costs(allowed, cost, miss, new):
    """(n, m) force costs by solving again, nan where there is no candidate."""
    full = square(allowed, cost, miss, new)
    optimum = best(full)
    out = np.full(allowed.shape, np.nan)
    for i, j in zip(*np.nonzero(allowed), strict=True):
        other = full.copy()
        other[i, :] = np.inf
        other[:, j] = np.inf
        other[i, j] = full[i, j]
        out[i, j] = best(other) - optimum
    return out
