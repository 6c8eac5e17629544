"""Complete and cheapest matchings, against trying them all and against scipy."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import linear_sum_assignment

from tests.reference import matching as reference
from tracker.kernels.matching import cheapest_matching


def problem(seed, rows, columns, share, ties):
    rng = np.random.default_rng(seed)
    there = rng.random((rows, columns)) < share
    start = np.concatenate(([0], np.cumsum(there.sum(axis=1))))
    cost = rng.uniform(0, 1, int(there.sum()))
    if ties:
        cost = np.round(cost * 3) / 3
    return start.astype(np.int64), np.nonzero(there)[1].astype(np.int64), cost, there


@pytest.mark.parametrize("ties", [False, True])
@pytest.mark.parametrize("seed", range(40))
def test_against_all_matchings(seed, ties):
    rng = np.random.default_rng(1000 + seed)
    rows, columns = rng.integers(0, 5, 2)
    start, column, cost, _ = problem(seed, rows, columns, 0.6, ties)
    chosen, tied = cheapest_matching(start, column, cost, columns, 20.0, 1e-9)
    wanted, wanted_tie = reference.cheapest_matching(start, column, cost, columns, 20.0, 1e-9)
    assert tied == wanted_tie

    def total(picks):
        return sum(cost[e] - 20.0 for e in picks if e >= 0)

    assert total(chosen) == pytest.approx(total(wanted), abs=1e-9)
    if not tied:
        assert chosen.tolist() == wanted


@pytest.mark.parametrize("seed", range(10))
def test_against_scipy(seed):
    start, column, cost, there = problem(seed, 40, 35, 0.08, False)
    chosen, tied = cheapest_matching(start, column, cost, 35, 200.0, 1e-9)
    dense = np.full(there.shape, 200.0)
    dense[there] = cost
    rows, columns = linear_sum_assignment(dense)
    good = there[rows, columns]
    assert not tied
    assert {(i, int(column[e])) for i, e in enumerate(chosen) if e >= 0} == set(
        zip(rows[good].tolist(), columns[good].tolist(), strict=True)
    )
