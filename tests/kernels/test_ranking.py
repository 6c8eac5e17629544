"""k best assignments against a list of all events, and counts of matchings from the literature."""

import math

import numpy as np
import pytest
from numba import config

from tests.kernels.problems import DEGENERATE, full, random_problems, sparse
from tests.reference import murty as twin
from tests.reference import ranking as whole_twin
from tracker.kernels.components import label_components
from tracker.kernels.murty import event_bound, event_cost, rank_component
from tracker.kernels.ranking import k_best
from tracker.kernels.solve import solve

EVERYTHING = 10**9
PROBLEMS = 100 if config.DISABLE_JIT else 1500  # plain Python is slow


def whole(allowed, cost, miss, new, k):
    """(ranking of all components together, problem)."""
    problem = sparse(allowed, cost, miss, new)
    components = label_components(problem.start, problem.column, len(problem.new))
    return k_best(problem, components, k), problem


def one(allowed, cost, miss, new, k):
    """The same by Murty's partition of the whole, as if it were one component."""
    problem = sparse(allowed, cost, miss, new)
    return rank_component(problem, k), problem


def check(ranking, problem, expected, k):
    """Costs in order, events distinct, feasible and with the costs stated, the rest bounded."""
    wanted, costs, total = expected
    tolerance = 1e-12 * (1.0 + sum(np.abs(part).sum() for part in problem[2:]))
    assert len(ranking.cost) == min(k, len(costs))
    np.testing.assert_allclose(ranking.cost, wanted, rtol=0, atol=tolerance)
    assert (np.diff(ranking.cost) >= 0).all()
    seen = set()
    for r, candidates in enumerate(ranking.row_candidate):
        event = tuple(int(problem.column[e]) if e >= 0 else -1 for e in candidates)
        for i, e in enumerate(candidates):
            assert e < 0 or problem.start[i] <= e < problem.start[i + 1]
        assert abs(costs[event] - ranking.cost[r]) <= tolerance
        assert event_cost(problem, ranking.row_candidate, r) == ranking.cost[r]
        seen.add(event)
    assert len(seen) == len(ranking.cost)
    listed = np.exp(ranking.cost[0] - ranking.cost).sum()
    slack = 1e-9 * total + 2 * tolerance
    assert total - listed <= ranking.rest + slack
    if k >= len(costs):
        assert ranking.rest <= slack


@pytest.mark.parametrize("rank", [whole, one])
def test_random_problems(rank):
    for allowed, cost, miss, new in random_problems(PROBLEMS, seed=51, largest=5):
        for k in (1, 2, 7, 40, EVERYTHING):
            expected = whole_twin.k_best(allowed, cost, miss, new, k)
            check(*rank(allowed, cost, miss, new, k), expected, k)


@pytest.mark.parametrize("rank", [whole, one])
@pytest.mark.parametrize("name", DEGENERATE)
def test_degenerate_shapes(rank, name):
    allowed, cost, miss, new = DEGENERATE[name]
    for k in (1, 3, EVERYTHING):
        expected = twin.rank_component(np.asarray(allowed), cost, miss, new, k)
        check(*rank(allowed, cost, miss, new, k), expected, k)


def test_event_bound_is_not_below_the_count():
    for allowed, cost, miss, new in random_problems(200, seed=52, largest=5):
        bound = event_bound(sparse(allowed, cost, miss, new))
        assert bound >= twin.event_bound(allowed)
        assert min(allowed.sum(axis=0).max(initial=0), allowed.sum(axis=1).max(initial=0)) > 1 or (
            bound == twin.event_bound(allowed)
        )


@pytest.mark.parametrize(("size", "events"), [(1, 2), (2, 7), (3, 34), (4, 209), (5, 1546)])
def test_number_of_partial_matchings(size, events):
    """All matchings of the complete bipartite graph: OEIS A002720."""
    problem = full(np.zeros((size, size)), 0.0, 0.0)
    ranking, _ = whole(*problem, EVERYTHING)
    assert len(ranking.cost) == events
    assert ranking.rest == pytest.approx(0.0, abs=1e-12)


def test_two_tracks_three_detections_have_eight_events():
    """The validation matrix of Bar-Shalom and Fortmann 1988, ch. 9 (from memory): detection 1 in
    the gate of track 1, detection 2 in both, detection 3 in that of track 2; eight events."""
    allowed = np.array([[1, 1, 0], [0, 1, 1]], bool)
    ranking, _ = whole(allowed, np.zeros((2, 3)), np.zeros(2), np.zeros(3), EVERYTHING)
    assert len(ranking.cost) == 8


def test_a_single_row_lists_its_options_in_order():
    allowed, cost, miss, new = full([[3.0, -1.0, 2.0, 0.5]], 1.0, 0.0)
    ranking, _ = whole(allowed, cost, miss, new, 10)
    assert ranking.cost.tolist() == [-1.0, 0.5, 1.0, 2.0, 3.0]
    assert ranking.row_candidate[:, 0].tolist() == [1, 3, -1, 2, 0]


def test_equal_costs_come_in_the_same_order_every_time():
    problem = full(np.zeros((4, 4)), 0.0, 0.0)
    first, _ = whole(*problem, 60)
    again, _ = whole(*problem, 60)
    assert (first.row_candidate == again.row_candidate).all()
    shorter, _ = whole(*problem, 20)
    assert len({tuple(event) for event in shorter.row_candidate}) == 20


def test_best_of_a_large_component_by_independent_pairs():
    """Twelve independent choices of cost 2^k against 0: the r-th best costs r."""
    n = 12
    rng = np.random.default_rng(53)
    order = rng.permutation(n)
    allowed = np.eye(n, dtype=bool)
    cost = np.diag(2.0 ** order.astype(float))
    problem = sparse(allowed, cost, np.zeros(n), np.zeros(n))
    assert rank_component(problem, 500).cost.tolist() == list(range(500))
    components = label_components(problem.start, problem.column, n)
    assert k_best(problem, components, 500).cost.tolist() == list(range(500))


def test_fifty_rows_agree_with_solving_each_neighbour():
    """The second best of a large component is the smallest margin above the best."""
    rng = np.random.default_rng(54)
    n = 50
    allowed = rng.random((n, n)) < 0.2
    problem = sparse(allowed, rng.normal(0.0, 3.0, (n, n)), np.ones(n), np.zeros(n))
    solution = solve(problem, True)
    ranking = rank_component(problem, 300)
    assert len({tuple(event) for event in ranking.row_candidate}) == 300
    assert ranking.cost[1] - ranking.cost[0] == pytest.approx(
        min(solution.row_margin.min(), solution.column_margin.min()), abs=1e-9
    )
    assert math.isfinite(ranking.rest)
