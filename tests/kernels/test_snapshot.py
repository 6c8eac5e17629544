"""Snapshots are slices, but copies."""

import numpy as np

from tests.reference import snapshot as twin
from tracker.kernels.snapshot import measured_part


def test_measured_part_equals_slices_and_does_not_share_memory():
    rng = np.random.default_rng(1)
    mean, covariance = rng.normal(size=(5, 8)), rng.normal(size=(5, 8, 8))
    found = measured_part(mean, covariance, 4)
    for one, other in zip(found, twin.measured_part(mean, covariance, 4), strict=True):
        assert (one == other).all()
        assert not np.shares_memory(one, other)
