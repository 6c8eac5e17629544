"""Random and degenerate optional assignment problems for the kernel tests."""

import numpy as np

from tracker.kernels.assignment import Problem


def sparse(allowed, cost, miss, new):
    """Dense arrays as the kernels take them."""
    allowed = np.asarray(allowed, bool)
    start = np.concatenate(([0], np.cumsum(allowed.sum(axis=1)))).astype(np.int64)
    column = np.nonzero(allowed)[1].astype(np.int64)
    return Problem(
        start,
        column,
        np.ascontiguousarray(np.asarray(cost, float)[allowed]),
        np.asarray(miss, float),
        np.asarray(new, float),
    )


def full(cost, miss, new):
    """A problem without forbidden pairs."""
    cost = np.asarray(cost, float)
    n, m = cost.shape
    return np.ones((n, m), bool), cost, np.full(n, float(miss)), np.full(m, float(new))


def random_problems(count, seed, largest=7):
    """Yield (allowed, cost, miss, new): sparse to dense, signs mixed, every third with ties."""
    rng = np.random.default_rng(seed)
    for k in range(count):
        n, m = rng.integers(0, largest + 1, 2)
        allowed = rng.random((n, m)) < rng.choice([0.1, 0.3, 0.6, 1.0])
        cost = rng.normal(0.0, 3.0, (n, m))
        miss = rng.normal(1.0, 2.0, n)
        new = rng.normal(0.0, 2.0, m)
        if k % 3 == 0:
            cost, miss, new = np.round(cost), np.round(miss), np.round(new)
        yield allowed, cost, miss, new


DEGENERATE = {
    "nothing": full(np.empty((0, 0)), 1, 0),
    "tracks only": full(np.empty((3, 0)), 1, 0),
    "detections only": full(np.empty((0, 3)), 1, 0),
    "no candidates": (np.zeros((2, 3), bool), np.zeros((2, 3)), np.ones(2), np.zeros(3)),
    "all equal": full(np.zeros((4, 4)), 0, 0),
    "all equal, pairs worth it": full(np.full((4, 3), -1.0), 0, 0),
    "one row": full([[3.0, -1.0, -1.0]], 0, 0),
    "one column": full([[3.0], [-1.0], [-1.0]], 0, 0),
    "break-even": full([[2.0]], 1, 1),
    "huge and tiny": full([[1e9, 1e-9], [1e-9, -1e9]], 0, 0),
}
