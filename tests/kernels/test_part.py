"""A component cut out is the same problem, and its weights are those of its events."""

import numpy as np

from tests.kernels.problems import DEGENERATE, random_problems, sparse
from tests.reference import murty as events_twin
from tests.reference import part as twin
from tracker.kernels.assignment import assign, problem_frontier
from tracker.kernels.components import label_components, members
from tracker.kernels.part import event_weights, part_of, turned

CASES = [*DEGENERATE.values(), *random_problems(150, seed=41, largest=6)]


def solved(problem):
    components = label_components(problem.start, problem.column, len(problem.new))
    return components, assign(problem, components, problem_frontier(problem))


def test_parts_equal_the_twin():
    for allowed, cost, miss, new in CASES:
        problem = sparse(allowed, cost, miss, new)
        components, _ = solved(problem)
        count = len(components.candidates)
        row_start, row = members(components.of_row, count)
        column_start, column = members(components.of_column, count)
        for c in range(count):
            rows = row[row_start[c] : row_start[c + 1]]
            columns = column[column_start[c] : column_start[c + 1]]
            part, source = part_of(problem, rows, columns)
            expected = sparse(*twin.part_of(np.asarray(allowed), cost, miss, new, rows, columns))
            for found, wanted in zip(part, expected, strict=True):
                assert (found == wanted).all()
            assert (problem.cost[source] == part.cost).all()
            assert (problem.column[source] == columns[part.column]).all()


def test_weights_equal_the_twin_and_their_products_are_those_of_the_events():
    for allowed, cost, miss, new in random_problems(100, seed=42, largest=4):
        problem = sparse(allowed, cost, miss, new)
        _, answer = solved(problem)
        weights = event_weights(problem, answer.row_price, answer.column_price)
        pair, missed, unpaired = twin.event_weights(
            allowed, cost, miss, new, answer.row_price, answer.column_price
        )
        np.testing.assert_allclose(weights.pair, pair[allowed], rtol=1e-12)
        np.testing.assert_allclose(weights.miss, missed, rtol=1e-12)
        np.testing.assert_allclose(weights.new, unpaired, rtol=1e-12)
        assert max([0.0, *weights.pair, *weights.miss, *weights.new]) <= 1.0
        costs = {e: events_twin.event_cost(cost, miss, new, e) for e in all_events(allowed)}
        for event, total in costs.items():
            product = np.prod([unpaired[j] for j in range(len(new)) if j not in event])
            for i, j in enumerate(event):
                product *= missed[i] if j < 0 else pair[i, j]
            np.testing.assert_allclose(product, np.exp(min(costs.values()) - total), rtol=1e-9)


def all_events(allowed):
    return events_twin.all_events(np.asarray(allowed))


def test_turned_exchanges_rows_and_columns():
    for allowed, cost, miss, new in CASES:
        allowed = np.asarray(allowed)
        problem = sparse(allowed, cost, miss, new)
        _, answer = solved(problem)
        weights = event_weights(problem, answer.row_price, answer.column_price)
        across, source = turned(weights)
        dense = np.zeros(allowed.shape)
        dense[allowed] = weights.pair
        pair, miss_weight, new_weight = twin.turned(dense, weights.miss, weights.new)
        assert (across.pair == pair[allowed.T]).all()
        assert (across.column == np.nonzero(allowed.T)[1]).all()
        assert (weights.pair[source] == across.pair).all()
        assert (across.miss == miss_weight).all()
        assert (across.new == new_weight).all()
