"""Pairs that are close enough, against plain loops."""

from __future__ import annotations

import numpy as np
import pytest

from tests.reference import pairing as reference
from tracker.kernels import pairing


def frames(seed, dimension, most):
    """Row starts and rows of two sets over four frames, up to `most` rows a frame."""
    rng = np.random.default_rng(seed)
    out = []
    for _ in range(2):
        start = np.concatenate(([0], np.cumsum(rng.integers(0, most + 1, 4))))
        z = rng.uniform(0, 6 * np.sqrt(most), (start[-1], dimension))
        if dimension == 4:
            z[:, 2:] = rng.uniform(4, 20, (len(z), 2))
        out += [start, z]
    return out


# 90 rows a frame go through the grid, 5 through the double loop.
@pytest.mark.parametrize("seed", range(10))
@pytest.mark.parametrize("most", [5, 90])
def test_boxes(seed, most):
    given = frames(seed, 4, most)
    found = pairing.pair_boxes(*given, 0.05)
    wanted = reference.pair_boxes(*given, 0.05)
    assert found[0].tolist() == wanted[0]
    assert found[1].tolist() == wanted[1]
    np.testing.assert_allclose(found[2], wanted[2], rtol=1e-12)


@pytest.mark.parametrize("seed", range(10))
@pytest.mark.parametrize("most", [5, 90])
def test_points(seed, most):
    given = frames(seed, 2, most)
    found = pairing.pair_points(*given, 9.0)
    wanted = reference.pair_points(*given, 9.0)
    assert found[0].tolist() == wanted[0]
    assert found[1].tolist() == wanted[1]
    np.testing.assert_allclose(found[2], wanted[2], rtol=1e-12)


def test_the_border_of_the_reach_belongs_to_it():
    start = np.array([0, 1])
    for place in ([0.3, 0.0], [0.0, -0.3]):
        zero = np.zeros((1, 2))
        assert len(pairing.pair_points(start, zero, start, np.array([place]), 0.3)[1]) == 1


def test_nothing_is_paired_with_nothing():
    start, none = np.array([0, 0]), np.zeros((0, 4))
    found = pairing.pair_boxes(start, none, start, none, 0.5)
    assert [len(part) for part in found] == [1, 0, 0]
