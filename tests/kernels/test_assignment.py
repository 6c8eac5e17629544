"""The optional assignment solver against textbook examples, two libraries and its own proof."""

import networkx as nx
import numpy as np
import pytest
from munkres import Munkres
from scipy.optimize import linear_sum_assignment

from tests.kernels.problems import DEGENERATE, full, random_problems, sparse
from tests.reference import assignment as twin
from tracker.kernels.assignment import assign, certify, problem_frontier
from tracker.kernels.components import label_components

FAR = 1e4  # miss and new costs at which leaving anything unpaired never pays


def solved(allowed, cost, miss, new):
    """Solve, check the proof with kernel and twin, return (total, answer)."""
    problem = sparse(allowed, cost, miss, new)
    components = label_components(problem.start, problem.column, len(problem.new))
    answer = assign(problem, components, problem_frontier(problem))
    paired = answer.row_candidate >= 0
    total = (
        problem.cost[answer.row_candidate[paired]].sum()
        + problem.miss[~paired].sum()
        + problem.new[answer.column_row < 0].sum()
    )
    proof = certify(problem, components, answer)
    scale = 1.0 + np.abs(proof.scale).sum()
    assert np.all(np.abs(proof.gap) <= 1e-12 * scale)
    assert np.all(proof.violation <= 1e-12 * scale)
    gap, violation = twin.certify(
        np.asarray(allowed), cost, miss, new, answer.row_price, answer.column_price, total
    )
    assert abs(gap) <= 1e-11 * scale
    assert violation <= 1e-12 * scale
    return total, answer


# Published examples. 'munkres' and 'scipy' are those packages' tests, 'scipy docs' and
# 'OR-Tools docs' the examples in their documentation.
EXAMPLES = {
    "munkres 3x3": ([[5, 9, 1], [10, 3, 2], [8, 7, 4]], 12),
    "munkres 5x5": (
        [
            [12, 9, 27, 10, 23],
            [7, 13, 13, 30, 19],
            [25, 18, 26, 11, 26],
            [9, 28, 26, 23, 13],
            [16, 16, 24, 6, 9],
        ],
        51,
    ),
    "scipy square": ([[400, 150, 400], [400, 450, 600], [300, 225, 300]], 850),
    "scipy rectangular": ([[400, 150, 400, 1], [400, 450, 600, 2], [300, 225, 300, 3]], 452),
    "scipy square 2": ([[10, 10, 8], [9, 8, 1], [9, 7, 4]], 18),
    "scipy rectangular 2": ([[10, 10, 8, 11], [9, 8, 1, 1], [9, 7, 4, 10]], 15),
    "scipy docs": ([[4, 1, 3], [2, 0, 5], [3, 2, 2]], 5),
    "OR-Tools docs": (
        [[90, 76, 75, 70], [35, 85, 55, 65], [125, 95, 90, 105], [45, 110, 95, 115]],
        265,
    ),
}


@pytest.mark.parametrize("name", EXAMPLES)
@pytest.mark.parametrize("turned", [False, True])
def test_published_examples(name, turned):
    cost, optimum = EXAMPLES[name]
    cost = np.array(cost, float)
    if turned:
        cost = cost.T
    allowed, cost, miss, new = full(cost, FAR, 0.0)
    n, m = cost.shape
    total, _ = solved(allowed, cost, miss, new)
    assert total - FAR * max(0, n - m) == pytest.approx(optimum, abs=1e-8)


def test_forbidden_pairs_of_the_munkres_package():
    cost = np.array([[5, 9, 1], [10, 3, 2], [8, 7, 4]], float)
    allowed = np.ones((3, 3), bool)
    allowed[[0, 1, 2], [2, 1, 1]] = False
    total, _ = solved(allowed, cost, np.full(3, FAR), np.zeros(3))
    assert total == pytest.approx(19.0, abs=1e-8)


def test_agrees_with_the_munkres_package():
    rng = np.random.default_rng(5)
    for _ in range(30):
        cost = rng.integers(0, 50, rng.integers(1, 7, 2)).astype(float)
        pairs = Munkres().compute(cost.tolist())
        optimum = sum(cost[i, j] for i, j in pairs)
        total, answer = solved(*full(cost, FAR, 0.0))
        unpaired = (answer.row_column < 0).sum()
        assert total - FAR * unpaired == pytest.approx(optimum, abs=1e-7)


def test_agrees_with_scipy_on_random_optional_problems():
    for problem in random_problems(3000, seed=1):
        total, _ = solved(*problem)
        assert total == pytest.approx(twin.assign(*problem), abs=1e-9)


@pytest.mark.parametrize("density", [0.05, 0.3, 1.0])  # heap, scan and dense searches
def test_agrees_with_scipy_on_larger_problems(density):
    rng = np.random.default_rng(int(100 * density))
    for n, m in ((60, 60), (90, 40), (40, 90)):
        allowed = rng.random((n, m)) < density
        cost = rng.normal(0.0, 1.0, (n, m))
        problem = (allowed, cost, rng.random(n), rng.random(m) - 0.5)
        total, _ = solved(*problem)
        assert total == pytest.approx(twin.assign(*problem), abs=1e-9)


def test_agrees_with_networkx_on_random_optional_problems():
    for allowed, cost, miss, new in random_problems(60, seed=2, largest=6):
        graph = nx.Graph()
        for i, j in zip(*np.nonzero(allowed), strict=True):
            worth = miss[i] + new[j] - cost[i, j]
            if worth > 0.0:
                graph.add_edge(("row", int(i)), ("column", int(j)), weight=worth)
        pairs = nx.max_weight_matching(graph)
        worth = sum(graph.edges[pair]["weight"] for pair in pairs)
        total, _ = solved(allowed, cost, miss, new)
        assert total == pytest.approx(miss.sum() + new.sum() - worth, abs=1e-9)


@pytest.mark.parametrize("name", DEGENERATE)
def test_degenerate_shapes(name):
    problem = DEGENERATE[name]
    total, _ = solved(*problem)
    assert total == pytest.approx(twin.assign(*problem), abs=1e-9)


def test_no_assignment_beats_feasible_prices():
    """Weak duality: any feasible prices bound any assignment from below."""
    rng = np.random.default_rng(3)
    allowed, cost, miss, new = full(rng.random((4, 5)), 0.5, 0.2)
    for _ in range(50):
        row_price = np.minimum(rng.normal(0.0, 1.0, 4), miss)
        column_price = np.minimum(new, (cost - row_price[:, None]).min(axis=0))
        total, _ = solved(allowed, cost, miss, new)
        assert row_price.sum() + column_price.sum() <= total + 1e-12


def test_complementary_slackness():
    for allowed, cost, miss, new in random_problems(200, seed=4):
        _, answer = solved(allowed, cost, miss, new)
        for i, j in enumerate(answer.row_column):
            if j >= 0:
                assert answer.row_price[i] + answer.column_price[j] == pytest.approx(
                    cost[i, j], abs=1e-9
                )
            else:
                assert answer.row_price[i] == pytest.approx(miss[i], abs=1e-12)
        for j, i in enumerate(answer.column_row):
            if i < 0:
                assert answer.column_price[j] == pytest.approx(new[j], abs=1e-12)


def test_halls_condition_decides_full_matchings():
    """All rows can be paired exactly if every set of rows has as many neighbours (Hall 1935)."""
    rng = np.random.default_rng(6)
    seen = set()
    for _ in range(200):
        n = int(rng.integers(1, 6))
        allowed = rng.random((n, n)) < 0.45
        hall = all(
            allowed[[i for i in range(n) if subset >> i & 1]].any(axis=0).sum()
            >= bin(subset).count("1")
            for subset in range(1, 1 << n)
        )
        _, answer = solved(allowed, np.zeros((n, n)), np.full(n, FAR), np.full(n, FAR))
        assert bool((answer.row_column >= 0).all()) == hall
        seen.add(hall)
    assert seen == {True, False}


# Expected optimum of n x n problems with exp(1) costs: the sum of 1/k² (conjectured by Parisi;
# proved by Linusson and Wästlund, and by Nair, Prabhakar and Sharma).
@pytest.mark.parametrize(
    ("n", "expected"),
    [(2, 1.25), (3, 1.361111), (5, 1.463611), (10, 1.549768), (100, 1.634984)],
)
def test_expected_optimum_of_random_square_problems(n, expected):
    rng = np.random.default_rng(n)
    runs = 4000 if n <= 10 else 300
    totals = np.array(
        [solved(*full(rng.exponential(size=(n, n)), FAR, 0.0))[0] for _ in range(runs)]
    )
    # Four standard errors: a correct solver fails this seed with probability 6e-5.
    assert abs(totals.mean() - expected) <= 4.0 * totals.std() / np.sqrt(runs)


# k of m x n (Coppersmith and Sorkin; form from memory, confirmed by simulation).
@pytest.mark.parametrize(
    ("m", "n", "expected"), [(2, 3, 0.75), (5, 10, 0.566462), (10, 20, 0.574454)]
)
def test_expected_optimum_of_random_rectangular_problems(m, n, expected):
    rng = np.random.default_rng(m)
    runs = 4000
    totals = np.array(
        [solved(*full(rng.exponential(size=(m, n)), FAR, 0.0))[0] for _ in range(runs)]
    )
    assert abs(totals.mean() - expected) <= 4.0 * totals.std() / np.sqrt(runs)


def test_ties_fall_the_same_way_whatever_else_is_in_the_frame():
    """A component's answer does not depend on the components around it."""
    tie = np.zeros((3, 3))
    _, alone = solved(*full(tie, 1.0, 0.0))
    allowed = np.zeros((6, 6), bool)
    allowed[:3, :3] = allowed[3:, 3:] = True
    _, beside = solved(allowed, np.zeros((6, 6)), np.ones(6), np.zeros(6))
    assert beside.row_column[:3].tolist() == alone.row_column.tolist()
    assert (beside.row_column[3:] - 3).tolist() == alone.row_column.tolist()


def test_certificate_catches_a_wrong_answer():
    allowed, cost, miss, new = full([[1.0, 5.0], [5.0, 1.0]], 10.0, 10.0)
    problem = sparse(allowed, cost, miss, new)
    components = label_components(problem.start, problem.column, 2)
    answer = assign(problem, components, problem_frontier(problem))
    swapped = answer._replace(
        row_candidate=np.array([1, 2]), row_column=np.array([1, 0]), column_row=np.array([1, 0])
    )
    assert certify(problem, components, swapped).gap[0] == pytest.approx(8.0)
    twice = answer._replace(row_candidate=np.array([0, 2]), row_column=np.array([0, 0]))
    assert certify(problem, components, twice).gap[0] == np.inf
    greedy = answer._replace(row_price=answer.row_price + 1.0)
    assert certify(problem, components, greedy).violation[0] == pytest.approx(1.0)


def test_scipy_is_the_oracle_here():
    """The twin really solves with scipy (guards against a twin that echoes the kernel)."""
    cost = np.array([[4.0, 1.0], [2.0, 0.0]])
    rows, columns = linear_sum_assignment(cost)
    assert twin.assign(*full(cost, FAR, 0.0)) == cost[rows, columns].sum()
