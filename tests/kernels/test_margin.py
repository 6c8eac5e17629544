"""Margins and force costs against solving again with the decision forbidden or forced."""

import numpy as np
import pytest

from tests.kernels.problems import DEGENERATE, full, random_problems, sparse
from tests.reference import margin as twin
from tracker.kernels.assignment import assign, problem_frontier
from tracker.kernels.components import label_components
from tracker.kernels.margin import force_costs, hub_distances, margins


def check(allowed, cost, miss, new):
    problem = sparse(allowed, cost, miss, new)
    components = label_components(problem.start, problem.column, len(problem.new))
    answer = assign(problem, components, problem_frontier(problem))
    of_row, of_column = margins(problem, components, answer, problem_frontier(problem))
    wanted = np.ones(len(components.candidates), bool)
    forced = np.full(np.shape(allowed), np.nan)
    forced[np.asarray(allowed)] = force_costs(
        problem, components, answer, wanted, problem_frontier(problem)
    )
    expected = twin.margins(allowed, cost, miss, new, answer.row_column, answer.column_row)
    scale = 1.0 + np.abs(problem.cost).max(initial=0.0)
    np.testing.assert_allclose(of_row, expected[0], rtol=0, atol=1e-9 * scale)
    np.testing.assert_allclose(of_column, expected[1], rtol=0, atol=1e-9 * scale)
    np.testing.assert_allclose(
        forced, twin.force_costs(allowed, cost, miss, new), rtol=0, atol=1e-9 * scale
    )
    assert (of_row >= 0).all()
    assert (of_column >= 0).all()
    return of_row, of_column, forced


def test_random_components():
    for problem in random_problems(2500, seed=11, largest=6):
        check(*problem)


@pytest.mark.parametrize("name", DEGENERATE)
def test_degenerate_shapes(name):
    check(*DEGENERATE[name])


def test_large_sparse_component_uses_the_heap():
    """A chain of 40 rows and columns is one component, sparse enough for the heap."""
    rng = np.random.default_rng(12)
    n = 40
    allowed = np.eye(n, dtype=bool) | np.eye(n, k=1, dtype=bool) | np.eye(n, k=-1, dtype=bool)
    check(allowed, rng.normal(0.0, 1.0, (n, n)), np.full(n, 2.0), np.zeros(n))


def test_a_tie_shows_as_margin_zero():
    of_row, of_column, forced = check(*full(np.full((2, 2), -1.0), 1.0, 0.0))
    assert (of_row == 0.0).all()
    assert (of_column == 0.0).all()
    assert (forced == 0.0).all()


def test_margin_of_a_crossing_by_hand():
    """Two tracks, two detections: swapping costs (1 + 2) - (0 + 0) = 3, less than missing."""
    of_row, of_column, forced = check(*full([[0.0, 1.0], [2.0, 0.0]], 5.0, 5.0))
    assert of_row.tolist() == [3.0, 3.0]
    assert of_column.tolist() == [3.0, 3.0]
    assert forced.tolist() == [[0.0, 3.0], [3.0, 0.0]]


def test_what_nothing_can_replace_has_an_infinite_margin():
    of_row, of_column, _ = check(np.zeros((1, 1), bool), np.zeros((1, 1)), np.ones(1), np.ones(1))
    assert np.isinf(of_row).all()
    assert np.isinf(of_column).all()


def test_force_costs_only_where_wanted():
    allowed = np.eye(2, dtype=bool)
    problem = sparse(allowed, np.full((2, 2), 3.0), np.ones(2), np.ones(2))
    components = label_components(problem.start, problem.column, 2)
    answer = assign(problem, components, problem_frontier(problem))
    forced = force_costs(
        problem, components, answer, np.array([False, True]), problem_frontier(problem)
    )
    assert np.isnan(forced[0])
    assert forced[1] == pytest.approx(1.0)


def test_hub_distances_of_misses_and_news():
    for allowed, cost, miss, new in random_problems(150, seed=13, largest=5):
        problem = sparse(allowed, cost, miss, new)
        components = label_components(problem.start, problem.column, len(problem.new))
        answer = assign(problem, components, problem_frontier(problem))
        to_hub, from_hub = hub_distances(problem, components, answer)
        of_row, of_column = twin.hub_distances(
            allowed, cost, miss, new, answer.row_column, answer.column_row
        )
        known = ~np.isnan(of_row)
        np.testing.assert_allclose(to_hub[known], of_row[known], atol=1e-9)
        known = ~np.isnan(of_column)
        np.testing.assert_allclose(from_hub[known], of_column[known], atol=1e-9)
