"""Marginal probabilities against sums over all events, and against counts of matchings."""

import math

import numpy as np
import pytest
from numba import config

from tests.kernels.problems import DEGENERATE, full, random_problems, sparse
from tests.reference import elimination as exact_twin
from tests.reference import marginals as twin
from tracker.kernels.components import label_components
from tracker.kernels.elimination import exact_marginals
from tracker.kernels.marginals import marginals, ranked_marginals
from tracker.kernels.part import event_weights
from tracker.kernels.solve import solve

PROBLEMS = 60 if config.DISABLE_JIT else 600  # plain Python is slow


def exact(allowed, cost, miss, new, limit=12):
    """(width, pair, miss, new) by the recursion, over the whole problem at once."""
    problem = sparse(allowed, cost, miss, new)
    answer = solve(problem, False).answer
    return exact_marginals(event_weights(problem, answer.row_price, answer.column_price), limit)


def whole(allowed, cost, miss, new, limit=12, ranked=100):
    """Marginals component by component."""
    problem = sparse(allowed, cost, miss, new)
    answer = solve(problem, False).answer
    components = label_components(problem.start, problem.column, len(problem.new))
    return marginals(problem, components, answer.row_price, answer.column_price, limit, ranked)


def check(allowed, found, expected, tolerance):
    allowed = np.asarray(allowed)
    pair, miss, new = found
    np.testing.assert_allclose(pair, expected[0][allowed], rtol=0, atol=tolerance)
    np.testing.assert_allclose(miss, expected[1], rtol=0, atol=tolerance)
    np.testing.assert_allclose(new, expected[2], rtol=0, atol=tolerance)
    dense = np.zeros(allowed.shape)
    dense[allowed] = pair
    np.testing.assert_allclose(dense.sum(axis=1) + miss, 1.0, rtol=0, atol=1e-12)
    np.testing.assert_allclose(dense.sum(axis=0) + new, 1.0, rtol=0, atol=1e-9)


def scaled(cost):
    """1e-9, more where the costs' own last digits weigh more."""
    return max(1e-9, 1e-14 * np.abs(cost).max(initial=0.0))


def test_random_problems():
    for problem in random_problems(2500, seed=61, largest=5):
        check(problem[0], exact(*problem)[1:], exact_twin.exact_marginals(*problem), 1e-9)
        found = whole(*problem)
        check(problem[0], found[:3], twin.marginals(*problem), 1e-9)
        assert (found.left_out == 0.0).all()


@pytest.mark.parametrize("name", DEGENERATE)
def test_degenerate_shapes(name):
    allowed, cost, miss, new = DEGENERATE[name]
    expected = twin.marginals(np.asarray(allowed), cost, miss, new)
    check(allowed, exact(allowed, cost, miss, new)[1:], expected, scaled(cost))
    check(allowed, whole(allowed, cost, miss, new)[:3], expected, scaled(cost))


def test_far_from_the_optimum_nothing_overflows_or_vanishes():
    allowed, cost, miss, new = full([[-900.0, 0.0], [0.0, 900.0]], 900.0, -900.0)
    check(
        allowed, exact(allowed, cost, miss, new)[1:], twin.marginals(*full(cost, 900, -900)), 1e-9
    )
    assert whole(*full([[-2000.0]], 0.0, 0.0)).pair.tolist() == [1.0]
    assert whole(*full([[2000.0]], 0.0, 0.0)).pair.tolist() == [0.0]


def events(rows, columns):
    """Matchings of the complete bipartite graph: rook polynomial of a board at 1."""
    return sum(
        math.comb(rows, k) * math.comb(columns, k) * math.factorial(k)
        for k in range(min(rows, columns) + 1)
    )


@pytest.mark.parametrize(("rows", "columns"), [(3, 3), (10, 10), (12, 5), (5, 12), (40, 9)])
def test_equal_costs_count_rook_placements(rows, columns):
    """P(row missed) = R(n − 1, m) / R(n, m) (Riordan 1958, ch. 7); R(10, 10) = 234662231."""
    assert events(10, 10) == 234662231  # OEIS A002720
    width, pair, miss, new = exact(*full(np.zeros((rows, columns)), 0.0, 0.0))
    assert width == min(rows, columns)
    total = events(rows, columns)
    np.testing.assert_allclose(pair, events(rows - 1, columns - 1) / total, rtol=1e-11)
    np.testing.assert_allclose(miss, events(rows - 1, columns) / total, rtol=1e-11)
    np.testing.assert_allclose(new, events(rows, columns - 1) / total, rtol=1e-11)


@pytest.mark.parametrize("length", [3, 50, 1000])
def test_a_chain_of_tracks_counts_fibonacci_numbers(length):
    """A path of N nodes has F(N + 1) matchings (Hosoya 1971); its end is free in F(N) of them.

    The longest has more events than the largest float; width does not grow with length.
    """
    allowed = np.eye(length, dtype=bool) | np.eye(length, k=1, dtype=bool)
    rng = np.random.default_rng(62)
    rows, columns = rng.permutation(length), rng.permutation(length)
    width, _, miss, new = exact(
        allowed[rows][:, columns], np.zeros((length, length)), np.zeros(length), np.zeros(length)
    )
    assert width <= 3
    before, total = 1, 1
    for _ in range(2 * length - 1):
        before, total = total, before + total
    assert new[np.flatnonzero(columns == 0)[0]] == pytest.approx(before / total, abs=1e-12)
    assert miss[np.flatnonzero(rows == length - 1)[0]] == pytest.approx(before / total, abs=1e-12)


def test_above_the_limit_the_recursion_says_so():
    width, *_ = exact(*full(np.zeros((6, 6)), 0.0, 0.0), limit=5)
    assert width == 6


def test_ranked_equals_the_twin_where_there_are_no_ties():
    for k, problem in enumerate(random_problems(300, seed=63, largest=4)):
        if k % 3 == 0:
            continue  # rounded costs tie
        allowed, cost, miss, new = problem
        left_out, *found = ranked_marginals(sparse(*problem), 5)
        check(allowed, found, twin.ranked_marginals(allowed, cost, miss, new, 5), 1e-9)
        assert 0.0 <= left_out < 1.0


def test_ranked_is_off_by_no_more_than_its_bound():
    """All of them, ties included; with all events listed the bound closes."""
    largest = 0.0
    for problem in random_problems(PROBLEMS, seed=64, largest=5):
        expected = twin.marginals(*problem)
        for ranked in (1, 10, 100, 10_000):
            left_out, pair, miss, new = ranked_marginals(sparse(*problem), ranked)
            bound = left_out + 1e-12
            assert (np.abs(pair - expected[0][problem[0]]) <= bound).all()
            assert (np.abs(miss - expected[1]) <= bound).all()
            assert (np.abs(new - expected[2]) <= bound).all()
        largest = max(largest, left_out)
    assert largest <= 1e-12


def test_only_components_above_the_limit_are_ranked():
    """A block of 4 × 4 with a clear optimum, and a pair of its own."""
    allowed = np.zeros((5, 5), bool)
    allowed[:4, :4] = True
    allowed[4, 4] = True
    cost = np.where(np.eye(5, dtype=bool), -9.0, 3.0)
    problem = allowed, cost, np.full(5, 4.0), np.zeros(5)
    found = whole(*problem, limit=3, ranked=50)
    assert found.left_out[1] == 0.0
    assert 0.0 < found.left_out[0] < 1e-2
    expected = twin.marginals(*problem)
    assert np.abs(found.pair - expected[0][allowed]).max() <= found.left_out[0]
    check(allowed, whole(*problem)[:3], expected, 1e-9)
