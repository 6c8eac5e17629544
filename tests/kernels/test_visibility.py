"""Who hides whom, against shapely."""

import numpy as np
import pytest

from tests.reference import visibility as twin
from tracker.kernels.visibility import visible_shares


@pytest.mark.parametrize("count", [0, 1, 30, 120])
def test_shares_equal_the_twin(count):
    rng = np.random.default_rng(count)
    mean = np.column_stack((rng.uniform(0, 300, (count, 2)), rng.uniform(10, 80, (count, 2))))
    hides = rng.random(count) < 0.6
    found = visible_shares(mean, hides, 1_000_000)
    np.testing.assert_allclose(found, twin.visible_shares(mean, hides), atol=1e-12)
    assert count < 30 or (found < 0.5).any()


def test_by_hand():
    """A box of 20 by 40 behind one of equal size that stands 10 lower and 5 beside: 15 by 30
    of 800 are covered."""
    mean = np.array([[50.0, 50.0, 20.0, 40.0], [55.0, 60.0, 20.0, 40.0]])
    both = np.array([True, True])
    assert visible_shares(mean, both, 99).tolist() == [1.0 - 450.0 / 800.0, 1.0]
    assert visible_shares(mean, np.array([True, False]), 99).tolist() == [1.0, 1.0]


def test_a_box_without_a_size_is_seen():
    mean = np.array([[50.0, 50.0, -3.0, 40.0], [50.0, 60.0, 20.0, 40.0]])
    assert visible_shares(mean, np.array([True, True]), 99).tolist() == [1.0, 1.0]
