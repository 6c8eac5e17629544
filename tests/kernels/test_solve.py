"""The fused frame solver equals its parts."""

import numpy as np
import pytest

from tests.kernels.problems import random_problems, sparse
from tests.reference import solve as twin
from tracker.kernels.assignment import Certificate
from tracker.kernels.solve import solve, worst_proof


def test_solution_equals_the_twin():
    for allowed, cost, miss, new in random_problems(150, seed=31, largest=5):
        problem = sparse(allowed, cost, miss, new)
        solution = solve(problem, True)
        answer = solution.answer
        optimum, (of_row, of_column) = twin.solve(
            allowed, cost, miss, new, answer.row_column, answer.column_row
        )
        assert answer.row_price.sum() + answer.column_price.sum() == pytest.approx(
            optimum, abs=1e-9
        )
        np.testing.assert_allclose(solution.row_margin, of_row, atol=1e-9)
        np.testing.assert_allclose(solution.column_margin, of_column, atol=1e-9)


def test_margins_are_nan_when_not_wanted():
    problem = sparse(np.ones((2, 2), bool), np.zeros((2, 2)), np.ones(2), np.ones(2))
    assert np.isnan(solve(problem, False).row_margin).all()


def test_worst_proof():
    gap = np.array([0.0, -3.0, 1.0])
    violation = np.array([0.5, 0.0, 0.0])
    scale = np.array([1.0, 100.0, 4.0])
    assert worst_proof(Certificate(gap, violation, scale)) == (0, 0.0, 0.5)
    assert twin.worst_proof(gap, violation, scale) == 0
    gap[1] = np.nan
    assert worst_proof(Certificate(gap, violation, scale))[0] == 1  # not-a-number is the worst
    assert worst_proof(Certificate(gap[:0], gap[:0], gap[:0])) == (-1, 0.0, 0.0)
