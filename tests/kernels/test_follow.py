"""Following the camera: against the twin, over several frames."""

import numpy as np
import pytest

from tests.kernels.test_camera import PRIOR, scene
from tests.reference import follow as twin
from tracker.kernels.follow import follow_camera, reliable_rows


@pytest.mark.parametrize(("seed", "count"), [(1, 2), (2, 3), (3, 12), (4, 31), (5, 33), (6, 90)])
@pytest.mark.parametrize("jolt", [0.0, 8.0])
def test_frames_equal_the_twin(seed, count, jolt):
    rng = np.random.default_rng(seed)
    prior = PRIOR._replace(jolt_nats=jolt)
    learned = np.array([1e-4, 1e-4, 4e-8, 4e-8])
    for k in range(6):
        motion = (*rng.normal(0, 6, 2), *rng.normal(0, 0.005, 2))
        case = scene(10 * seed + k, count=count, motion=motion)
        hits, seen = rng.integers(1, 4, count), rng.choice([0.0, 0.8, 1.0], count)
        mean, covariance = case.mean.copy(), case.covariance.copy()
        expected = twin.follow_camera(
            case.mean, case.covariance, hits, seen, 1.0, case.z, case.variance, prior, learned
        )
        known, fit = follow_camera(
            mean, covariance, hits, seen, 1.0, case.z, case.variance, prior, learned, True
        )
        assert known == (expected is not None)
        if not known:
            np.testing.assert_array_equal(mean, case.mean)
            continue
        for ours, theirs in zip((mean, covariance, learned, fit.parameters), expected, strict=True):
            np.testing.assert_allclose(ours, theirs, rtol=1e-6, atol=1e-8)


@pytest.mark.parametrize("count", [0, 5, 200])
def test_rows_equal_the_twin_in_whatever_order_tracks_are(count):
    rng = np.random.default_rng(count)
    mean = rng.uniform(1.0, 900.0, (count, 8))
    hits, seen = rng.integers(1, 4, count), rng.choice([0.0, 0.8, 1.0], count)
    found = reliable_rows(mean, hits, seen, 1.0)
    assert found.tolist() == twin.reliable_rows(mean, hits, seen, 1.0)
    order = rng.permutation(count)
    again = reliable_rows(mean[order], hits[order], seen[order], 1.0)
    assert order[again].tolist() == found.tolist()
