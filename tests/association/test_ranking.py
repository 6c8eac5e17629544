"""The public k_best: what it accepts, what it returns, what it refuses."""

import numpy as np
import pytest

from tests.kernels.problems import full, random_problems, sparse
from tests.reference.ranking import k_best as twin
from tracker.association.marginals import marginals
from tracker.association.ranking import k_best
from tracker.errors import UsageError
from tracker.kernels.assignment import Problem
from tracker.kernels.components import label_components


def small(**changes):
    fields = {
        "start": [0, 2, 3],
        "column": [0, 1, 1],
        "cost": [0.0, 1.0, 0.5],
        "miss": [2.0, 2.0],
        "new": [0.0, 0.0],
    }
    return Problem(**{name: np.array(value) for name, value in (fields | changes).items()})


def test_whole_problem_and_component():
    for allowed, cost, miss, new in random_problems(200, seed=81, largest=5):
        problem = sparse(allowed, cost, miss, new)
        found = k_best(problem, 5)
        np.testing.assert_allclose(found.cost, twin(allowed, cost, miss, new, 5)[0], atol=1e-9)
        assert found.row_column.shape == (len(found), len(miss))
        components = label_components(problem.start, problem.column, len(new))
        for c in range(len(components.candidates)):
            part = k_best(problem, 5, component=c)
            assert (components.of_row[part.row] == c).all()
            assert (components.of_column[part.column] == c).all()
            block = np.ix_(part.row, part.column)
            expected = twin(allowed[block], cost[block], miss[part.row], new[part.column], 5)
            np.testing.assert_allclose(part.cost, expected[0], atol=1e-9)
            assert np.isin(part.row_column, [-1, *part.column]).all()


def test_left_out_is_what_the_rest_weighs_at_most():
    for allowed, cost, miss, new in random_problems(300, seed=82, largest=4):
        for k in (1, 4, 10_000):
            found = k_best(sparse(allowed, cost, miss, new), k)
            _, costs, total = twin(allowed, cost, miss, new, k)
            listed = np.exp(found.cost[0] - found.cost).sum()
            assert 1.0 - listed / total <= found.left_out + 1e-9
            assert found.left_out < 1.0
            if k >= len(costs):
                assert found.left_out == pytest.approx(0.0, abs=1e-12)


def test_lists_and_whole_numbers_are_taken():
    found = k_best(Problem([0, 1], [0], [1], [3], [0]), 5)
    assert found.cost.tolist() == [1.0, 3.0]
    assert found.row_column.tolist() == [[0], [-1]]


def test_a_frame_of_many_components_is_fast_enough_to_rank():
    n = 400
    problem = sparse(np.eye(n, dtype=bool), np.diag(np.arange(n) / n), np.ones(n), np.zeros(n))
    found = k_best(problem, 200)
    assert found.cost[0] == pytest.approx(np.arange(n).sum() / n)
    assert len({tuple(event) for event in found.row_column}) == 200


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"start": [0, 2]}, "one entry more"),
        ({"start": [0, 4, 3]}, "must rise"),
        ({"start": [1, 2, 3]}, "must rise"),
        ({"start": [0, 1, 2]}, "must rise"),
        ({"column": [0, 2, 1]}, "candidate 1 has column 2"),
        ({"column": [-1, 1, 1]}, "candidate 0 has column -1"),
        ({"column": [1, 0, 1]}, "candidate 1 does not"),
        ({"column": [1, 1, 1]}, "candidate 1 does not"),
        ({"column": [0.0, 1.0, 1.0]}, "int64"),
        ({"cost": [0.0, 1.0]}, "one column and one cost"),
        ({"cost": [[0.0, 1.0, 2.0]]}, "one row of numbers"),
        ({"cost": [0.0, np.inf, 2.0]}, r"cost\[1\] is inf"),
        ({"miss": [0.0, np.nan]}, r"miss\[1\] is nan"),
        ({"new": [-np.inf, 0.0]}, r"new\[0\] is -inf"),
    ],
)
@pytest.mark.parametrize("call", [lambda problem: k_best(problem, 3), marginals])
def test_a_problem_that_is_none_is_refused(call, changes, words):
    with pytest.raises(UsageError, match=words):
        call(small(**changes))


@pytest.mark.parametrize("k", [0, -1, 1.5, True, "3"])
def test_k_must_be_a_positive_whole_number(k):
    with pytest.raises(UsageError, match="k must be a whole number of at least 1"):
        k_best(small(), k)


@pytest.mark.parametrize("component", [-1, 1])
def test_a_component_must_exist(component):
    with pytest.raises(UsageError, match="no component"):
        k_best(small(), 3, component=component)


def test_empty_problems():
    for shape in ((0, 0), (3, 0), (0, 3)):
        found = k_best(sparse(*full(np.empty(shape), 2.0, 1.0)), 4)
        assert found.cost.tolist() == [2.0 * shape[0] + shape[1]]
        assert (found.row_column == -1).all()
        assert found.left_out == 0.0
