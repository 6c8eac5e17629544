"""Gating against a dense double loop; the grid must never change what is found."""

import numpy as np
import pytest
from scipy.stats import chi2

from tests.reference import gate as twin
from tests.reference import grid as grid_twin
from tracker.association.rule import gate_threshold
from tracker.kernels import grid as kernel
from tracker.kernels.gate import GATE_NOT_POSITIVE, GATE_OK, GATE_TOO_MANY, gate_candidates
from tracker.kernels.grid import meeting_pairs, typical_extent

LIMIT = 10**6


def scene(seed, tracks, detections, d, spread=60.0):
    """Random tracks with correlated covariances, detections near some of them."""
    rng = np.random.default_rng(seed)
    mean = np.concatenate(
        (rng.uniform(0, spread, (tracks, d)), rng.normal(0, 1, (tracks, d))), axis=1
    )
    mean[:, 2:d] = rng.uniform(2, 9, (tracks, d - 2))
    root = rng.normal(0, 0.7, (tracks, 2 * d, 2 * d))
    covariance = root @ root.transpose(0, 2, 1) + 0.1 * np.eye(2 * d)
    z = rng.uniform(0, spread, (detections, d))
    z[:, 2:] = rng.uniform(2, 9, (detections, d - 2))
    near = min(tracks, detections) // 2
    z[:near] = mean[:near, :d] + rng.normal(0, 1, (near, d))
    variance = rng.uniform(0.2, 2.0, (detections, d))
    return mean, covariance, z, variance


def found(problem, threshold, floor, boxes):
    status, _, candidates = gate_candidates(*problem, threshold, floor, boxes, True, LIMIT)
    assert status == GATE_OK
    rows = np.repeat(np.arange(len(problem[0])), np.diff(candidates.start))
    return rows, candidates


@pytest.mark.parametrize(("tracks", "detections"), [(0, 5), (5, 0), (1, 1), (8, 11), (70, 75)])
@pytest.mark.parametrize(("d", "floor"), [(2, 0.0), (4, 0.0), (4, 0.2)])
@pytest.mark.parametrize("probability", [0.9, 0.999, None])
def test_same_candidates_as_the_twin(tracks, detections, d, floor, probability):
    if probability is None and floor == 0.0 and tracks * detections > 100:
        pytest.skip("no gate at all: every pair")
    threshold = np.inf if probability is None else chi2.ppf(probability, d)
    problem = scene(tracks + d, tracks, detections, d)
    rows, candidates = found(problem, threshold, floor, d == 4)
    expected = twin.gate_candidates(*problem, threshold, floor, d == 4)
    assert list(zip(rows, candidates.column, strict=True)) == [pair[:2] for pair in expected]
    for k, name in ((2, "distance"), (3, "log_volume"), (4, "overlap")):
        values = [pair[k] for pair in expected]
        np.testing.assert_allclose(getattr(candidates, name), values, rtol=1e-9, atol=1e-12)


def test_grid_with_strays_and_giants():
    """One detection far away, one huge gate: the grid must neither miss nor repeat a pair."""
    mean, covariance, z, variance = scene(3, 80, 80, 2)
    z[0] = 1e9
    covariance[1] *= 1e6
    variance[2] = 1e5
    problem = (mean, covariance, z, variance)
    threshold = gate_threshold(0.99, 2)
    expected = [pair[:2] for pair in twin.gate_candidates(*problem, threshold, 0.0, False)]
    rows, candidates = found(problem, threshold, 0.0, False)
    assert len(expected) > 100
    assert list(zip(rows, candidates.column, strict=True)) == expected
    assert kernel.SMALL_PRODUCT < 80 * 80  # the grid was in use


def test_all_at_one_place():
    problem = scene(4, 40, 40, 2, spread=0.0)
    rows, candidates = found(problem, gate_threshold(0.999, 2), 0.0, False)
    expected = twin.gate_candidates(*problem, gate_threshold(0.999, 2), 0.0, False)
    assert list(zip(rows, candidates.column, strict=True)) == [pair[:2] for pair in expected]


def test_too_many_candidates_is_a_status():
    problem = scene(5, 40, 40, 2, spread=1.0)
    status, row, candidates = gate_candidates(*problem, 1e6, 0.0, False, True, 100)
    assert status == GATE_TOO_MANY
    assert row >= 0
    assert len(candidates.column) == 0


def test_a_broken_covariance_is_a_status():
    mean, covariance, z, variance = scene(6, 1, 1, 2, spread=0.0)
    covariance[0] = -np.eye(4) * 100
    status, row, _ = gate_candidates(mean, covariance, z, variance, np.inf, 0.0, False, True, LIMIT)
    assert (status, row) == (GATE_NOT_POSITIVE, 0)


# NIST/SEMATECH e-Handbook 1.3.6.7.4: upper 0.95, 0.99 and 0.999 points for 1 to 4 degrees.
@pytest.mark.parametrize(
    ("probability", "points"),
    [
        (0.95, (3.841, 5.991, 7.815, 9.488)),
        (0.99, (6.635, 9.210, 11.345, 13.277)),
        (0.999, (10.828, 13.816, 16.266, 18.467)),
    ],
)
def test_gate_thresholds_are_the_published_chi_square_points(probability, points):
    for degrees, point in enumerate(points, start=1):
        assert gate_threshold(probability, degrees) == pytest.approx(point, abs=5e-4)


def test_the_gate_admits_its_probability():
    rng = np.random.default_rng(7)
    count = 20_000
    covariance = np.diag([4.0, 1.0, 1.0, 1.0])[None]
    variance = np.full((count, 2), 0.5)
    spread = np.sqrt(np.array([4.5, 1.5]))
    z = rng.normal(0.0, 1.0, (count, 2)) * spread
    _, candidates = found(
        (np.zeros((1, 4)), covariance, z, variance), gate_threshold(0.9, 2), 0.0, False
    )
    # Binomial: four standard deviations of 20,000 draws at 0.9.
    assert abs(len(candidates.column) / count - 0.9) < 4 * np.sqrt(0.09 / count)


@pytest.mark.parametrize("seed", range(5))
@pytest.mark.parametrize("count", [20, 200])  # double loop, grid
def test_meeting_rectangles(seed, count):
    rng = np.random.default_rng(seed)

    def rectangles():
        low = rng.uniform(-50, 50, (count, 2))
        return low, low + rng.exponential(4.0, (count, 2)) * rng.choice(
            [0.0, 1.0, 30.0], (count, 1)
        )

    (low, high), (other_low, other_high) = rectangles(), rectangles()
    start, found = meeting_pairs(low, high, other_low, other_high, LIMIT)
    lists = [found[start[k] : start[k + 1]].tolist() for k in range(count)]
    assert lists == grid_twin.meeting_pairs(low, high, other_low, other_high)


def test_meeting_stops_at_the_limit():
    low, high = np.zeros((100, 2)), np.ones((100, 2))
    start, found = meeting_pairs(low, high, low, high, 250)
    assert 250 <= len(found) < 100 * 100
    assert start[-1] == len(found)


def test_axes_that_are_not_coupled_give_the_same_bits():
    mean, covariance, z, variance = scene(8, 60, 60, 4)
    for a in range(8):
        for b in range(8):
            if a % 4 != b % 4:
                covariance[:, a, b] = 0.0
    general = gate_candidates(mean, covariance, z, variance, 20.0, 0.0, True, True, LIMIT)[2]
    special = gate_candidates(mean, covariance, z, variance, 20.0, 0.0, True, False, LIMIT)[2]
    assert len(general.column) > 10
    for one, other in zip(general, special, strict=True):
        assert (one == other).all()


def test_typical_extent_is_the_median():
    low = np.zeros((17, 2))
    high = np.column_stack((np.random.default_rng(1).permutation(17), np.ones(17)))
    assert typical_extent(low, high, 0) == grid_twin.typical_extent(low, high, 0) == 8.0
    assert typical_extent(low[:0], high[:0], 0) == 0.0
