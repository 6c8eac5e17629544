"""Components, assignment, proof and margins of one frame in one compiled call."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numba import njit
from numpy.typing import NDArray

from tracker.kernels.assignment import (
    Assignment,
    Certificate,
    Problem,
    assign,
    certify,
    problem_frontier,
)
from tracker.kernels.components import label_components
from tracker.kernels.margin import margins


class Solution(NamedTuple):
    """Everything that is known about the optimum of one frame."""

    answer: Assignment
    row_margin: NDArray[np.float64]  # (n,) nan where margins were not asked for
    column_margin: NDArray[np.float64]  # (m,)
    weakest: int  # component whose proof is worst relative to its scale, -1 in an empty frame
    gap: float  # its gap …
    violation: float  # … and its violation of feasibility, relative to its scale
    components: int  # how many there are; `label_components` says which


@njit(cache=True)
def worst_proof(certificate: Certificate) -> tuple[int, float, float]:
    """Component whose proof is worst relative to its scale, and its gap and violation.

    Returns (component, relative gap, relative violation); (-1, 0, 0) for an empty frame.
    """
    worst = -1
    largest = -1.0
    gap = 0.0
    violation = 0.0
    for c in range(len(certificate.gap)):
        scale = max(1.0, certificate.scale[c])
        here = max(abs(certificate.gap[c]), certificate.violation[c]) / scale
        if here > largest or np.isnan(certificate.gap[c]) or np.isnan(certificate.violation[c]):
            largest = here if here > largest else np.inf  # not-a-number is worse than anything
            worst = c
            gap = certificate.gap[c] / scale
            violation = certificate.violation[c] / scale
    return worst, gap, violation


@njit(cache=True)
def solve(problem: Problem, want_margins: bool) -> Solution:
    """Solve one optional assignment problem, prove it, and measure its margins if wanted."""
    components = label_components(problem.start, problem.column, len(problem.new))
    frontier = problem_frontier(problem)
    answer = assign(problem, components, frontier)
    weakest, gap, violation = worst_proof(certify(problem, components, answer))
    if want_margins:
        row_margin, column_margin = margins(problem, components, answer, frontier)
    else:
        row_margin = np.full(len(problem.miss), np.nan)
        column_margin = np.full(len(problem.new), np.nan)
    count = len(components.candidates)
    return Solution(answer, row_margin, column_margin, weakest, gap, violation, count)
