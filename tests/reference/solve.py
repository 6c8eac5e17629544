"""Slow twins of kernels/solve.py: its parts one after the other, in plain numpy."""

import numpy as np

from tests.reference.assignment import assign
from tests.reference.margin import margins


def solve(allowed, cost, miss, new, row_column, column_row):
    """Optimal cost, and the margins of a given optimal answer."""
    return assign(allowed, cost, miss, new), margins(
        allowed, cost, miss, new, row_column, column_row
    )


def worst_proof(gap, violation, scale):
    """Index of the component with the largest gap or violation relative to its scale."""
    if not len(gap):
        return -1
    return int(np.argmax(np.maximum(np.abs(gap), violation) / np.maximum(1.0, scale)))
