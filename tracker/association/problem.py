"""Checks of a problem that comes from outside: compiled code looks at no bounds."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from tracker.errors import UsageError
from tracker.kernels.assignment import Problem


def checked_problem(problem: Problem) -> Problem:
    """The problem as contiguous 64-bit arrays.

    Raises UsageError where shapes do not fit, a column does not exist or is out of order, or a
    cost is not finite (an absent candidate is left out, not given a large cost).
    """
    start = _row("start", problem.start, np.int64)
    column = _row("column", problem.column, np.int64)
    cost = _row("cost", problem.cost, np.float64)
    miss = _row("miss", problem.miss, np.float64)
    new = _row("new", problem.new, np.float64)
    if len(start) != len(miss) + 1:
        raise UsageError(
            f"start must have one entry more than miss, found {len(start)} and {len(miss)}"
        )
    if start[0] != 0 or start[-1] != len(column) or np.any(np.diff(start) < 0):
        raise UsageError(
            f"start must rise from 0 to the number of candidates, {len(column)}; "
            f"found {start[0]} to {start[-1]}"
        )
    if len(cost) != len(column):
        raise UsageError(
            f"each candidate needs one column and one cost, found {len(column)} and {len(cost)}"
        )
    wrong = np.flatnonzero((column < 0) | (column >= len(new)))
    if len(wrong):
        raise UsageError(
            f"candidate {wrong[0]} has column {column[wrong[0]]}, but there are {len(new)} columns"
        )
    rising = np.ones(len(column), np.bool_)
    rising[1:] = np.diff(column) > 0
    rising[start[:-1][np.diff(start) > 0]] = True  # the first of each row may be anything
    if not rising.all():
        raise UsageError(
            f"columns must increase within a row; candidate {np.argmin(rising)} does not"
        )
    for name, values in (("cost", cost), ("miss", miss), ("new", new)):
        wrong = np.flatnonzero(~np.isfinite(values))
        if len(wrong):
            raise UsageError(
                f"{name}[{wrong[0]}] is {values[wrong[0]]}; all costs must be finite, "
                "and a pair that is not allowed left out"
            )
    return Problem(start, column, cost, miss, new)


def checked_count(name: str, value: int, largest: int | None = None) -> int:
    """A whole number of at least 1. Raises UsageError for anything else."""
    whole = not isinstance(value, bool) and isinstance(value, (int, np.integer))
    if not whole or value < 1 or (largest is not None and value > largest):
        upper = "" if largest is None else f" and at most {largest}"
        raise UsageError(f"{name} must be a whole number of at least 1{upper}, found {value!r}")
    return int(value)


def _row(name: str, values: NDArray, kind: type[np.generic]) -> NDArray:
    array = np.asarray(values)
    if array.ndim != 1:
        raise UsageError(f"{name} must be one row of numbers, found shape {array.shape}")
    if len(array) and not np.can_cast(array.dtype, kind, "same_kind"):
        raise UsageError(f"{name} must hold {np.dtype(kind).name} numbers, found {array.dtype}")
    return np.ascontiguousarray(array, kind)
