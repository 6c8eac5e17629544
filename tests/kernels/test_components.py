"""Component labels against networkx."""

import numpy as np
import pytest

from tests.kernels.problems import DEGENERATE, random_problems, sparse
from tests.reference import components as twin
from tracker.kernels.components import label_components, members

CASES = [*DEGENERATE.values(), *random_problems(300, seed=21, largest=12)]


@pytest.mark.parametrize("chunk", range(4))
def test_same_components_as_networkx(chunk):
    for allowed, cost, miss, new in CASES[chunk::4]:
        problem = sparse(allowed, cost, miss, new)
        found = label_components(problem.start, problem.column, len(new))
        count = len(found.candidates)
        parts = [set() for _ in range(count)]
        for i, c in enumerate(found.of_row):
            parts[c].add(("row", i))
        for j, c in enumerate(found.of_column):
            parts[c].add(("column", j))
        pairs = [(int(i), int(j)) for i, j in zip(*np.nonzero(allowed), strict=True)]
        expected = twin.label_components(len(miss), len(new), pairs)
        assert {frozenset(part) for part in parts} == expected
        for c in range(count):
            assert found.rows[c] == (found.of_row == c).sum()
            assert found.columns[c] == (found.of_column == c).sum()
            assert found.candidates[c] == sum(found.of_row[i] == c for i, _ in pairs)


def test_numbered_by_first_row_then_lone_columns():
    problem = sparse(np.array([[0, 0, 1], [0, 0, 0]], bool), np.zeros((2, 3)), [0, 0], [0, 0, 0])
    found = label_components(problem.start, problem.column, 3)
    assert found.of_row.tolist() == [0, 1]
    assert found.of_column.tolist() == [2, 3, 0]


def test_members_by_label():
    label = np.array([2, 0, -1, 2, 1])
    start, member = members(label, 4)
    assert [member[start[k] : start[k + 1]].tolist() for k in range(4)] == twin.members(label, 4)
