"""The camera's motion: against the twin, against opencv, and against what was put in."""

from typing import NamedTuple

import cv2
import numpy as np
import pytest

from tests.reference import camera as twin
from tests.reference import cholesky as cholesky_twin
from tests.reference import warp as warp_twin
from tracker.kernels.camera import CameraPrior, estimate_camera, shrink_camera
from tracker.kernels.cholesky import factorise, solve_factored
from tracker.kernels.warp import warp_states

PRIOR = CameraPrior(1.0, 0.5, 0.1, 0.3, 0.02, 0.02, 0.0)


class Scene(NamedTuple):
    mean: np.ndarray
    covariance: np.ndarray
    rows: np.ndarray
    z: np.ndarray
    variance: np.ndarray


def scene(
    seed, count=20, motion=(0.0, 0.0, 0.0, 0.0), noise=0.03, drawn=1.0, missed=0.2, false=0.5
):
    """Boxes in an image of 1000 by 600 that moves by `motion` about their mean; detections are
    `drawn` times as noisy as stated."""
    rng = np.random.default_rng(seed)
    height = rng.uniform(30.0, 120.0, count)
    box = np.column_stack((rng.uniform(0, 1000, count), rng.uniform(0, 600, count), height, height))
    box[:, 2] *= 0.4
    scale = np.sqrt(box[:, 2] * box[:, 3])
    mean = np.concatenate((box, rng.normal(0.0, 3.0, (count, 4))), axis=1)
    covariance = np.zeros((count, 8, 8))
    for a in range(8):
        covariance[:, a, a] = (noise * scale) ** 2
    offset = box[:, :2] - box[:, :2].mean(axis=0)
    z = box.copy()
    z[:, 0] += motion[0] + motion[2] * offset[:, 0] - motion[3] * offset[:, 1]
    z[:, 1] += motion[1] + motion[2] * offset[:, 1] + motion[3] * offset[:, 0]
    z += rng.normal(0.0, drawn * noise, z.shape) * scale[:, None]
    z = z[rng.random(count) >= missed]
    extra = rng.permutation(count)[: int(false * count)]
    wrong = box[extra] + rng.normal(0.0, 0.5, (len(extra), 4)) * scale[extra, None] * [1, 1, 0, 0]
    z = rng.permutation(np.concatenate((z, wrong)))
    variance = np.tile((noise * z[:, 2:3]) ** 2, (1, 4))
    return Scene(mean, covariance, np.arange(count), z, variance)


@pytest.mark.parametrize("seed", range(20))
def test_the_fit_equals_the_twin(seed):
    rng = np.random.default_rng(seed)
    motion = (*rng.normal(0, 20, 2), *rng.normal(0, 0.02, 2))
    case = scene(seed, count=int(rng.integers(3, 30)), motion=motion)
    rows = case.rows[rng.random(len(case.rows)) < 0.8]
    rows = rows if len(rows) else case.rows
    found = estimate_camera(case.mean, case.covariance, rows, case.z, case.variance, PRIOR)
    wanted = twin.estimate_camera(case.mean, case.covariance, rows, case.z, case.variance, PRIOR)
    for ours, theirs in zip(found, wanted, strict=True):
        np.testing.assert_allclose(ours, theirs, rtol=1e-7, atol=1e-9)


@pytest.mark.parametrize("seed", range(5))
def test_a_shift_that_cannot_gain_enough_is_not_looked_for(seed):
    case = scene(seed, motion=(4.0, 0.0, 0.0, 0.0))
    for jolt in (20.0, 1e6):
        prior = PRIOR._replace(jolt_nats=jolt)
        found = estimate_camera(*case, prior)
        for ours, theirs in zip(found, twin.estimate_camera(*case, prior), strict=True):
            np.testing.assert_allclose(ours, theirs, rtol=1e-7, atol=1e-9)


@pytest.mark.parametrize("seed", range(5))
def test_without_noise_it_is_opencvs_similarity(seed):
    """cv2.estimateAffinePartial2D on the true pairs; ours is not told which they are."""
    rng = np.random.default_rng(seed)
    motion = (*rng.normal(0, 10, 2), *rng.normal(0, 0.01, 2))
    case = scene(seed, motion=motion, noise=0.1, drawn=0.0, missed=0.0, false=0.0)
    wide = PRIOR._replace(shift_sigma=1e3, zoom_sigma=1e3, rotation_sigma=1e3)
    found = estimate_camera(*case, wide)
    x, y, zoom, turn = found.parameters
    source = np.ascontiguousarray(case.mean[:, :2])
    order = [int(np.argmin(np.linalg.norm(case.z[:, 2:] - box, axis=1)))
             for box in case.mean[:, 2:4]]  # fmt: skip
    seen = np.ascontiguousarray(case.z[order, :2])
    expected, _ = cv2.estimateAffinePartial2D(source, seen, ransacReprojThreshold=0.01)
    turned = np.array([[1 + zoom, -turn], [turn, 1 + zoom]])
    shift = found.centre + np.array((x, y)) - turned @ found.centre
    np.testing.assert_allclose(np.column_stack((turned, shift)), expected, rtol=1e-6, atol=1e-3)
    np.testing.assert_allclose(found.parameters, motion, rtol=1e-5, atol=1e-5)


def test_misses_and_false_detections_do_not_mislead():
    """A third of the detections false, a fifth of the true ones missing: the stated variances are
    those observed (200 scenes: a median of absolute errors to 8%), and where a wrong pairing is
    kept, which no sigma knows of, in few scenes."""
    errors = []
    for seed in range(200):
        rng = np.random.default_rng(1000 + seed)
        motion = np.array([*rng.normal(0, 15, 2), *rng.normal(0, 0.01, 2)])
        case = scene(seed, count=30, motion=motion)
        found = estimate_camera(*case, PRIOR)
        assert found.evidence > 0.0 or np.abs(motion[:2]).max() < 4.0
        unit = np.array([0.3 * found.scale, 0.3 * found.scale, 0.02, 0.02])
        posterior = np.linalg.inv(found.information + np.diag(unit**-2.0))
        errors.append((found.parameters - motion) / np.sqrt(np.diag(posterior)))
    size = np.abs(errors)
    assert np.median(size, axis=0) / 0.6745 == pytest.approx(1.0, abs=0.25)  # normal: 0.6745 sigma
    assert np.mean(size.max(axis=1) < 5.0) >= 0.95


def test_a_still_camera_gives_no_evidence():
    """A Bayes factor above e^4 against the truth comes once in e^4 cases at most, whatever the
    prior (Markov's inequality)."""
    evidence = np.array([estimate_camera(*scene(seed), PRIOR).evidence for seed in range(200)])
    assert np.mean(evidence > 4.0) <= np.exp(-4.0)
    assert np.mean(evidence) < 0.0


def test_nothing_near_says_nothing():
    case = scene(1)
    far = case._replace(z=case.z + np.array([5000.0, 0.0, 0.0, 0.0]))
    for lonely in (far, case._replace(z=case.z[:0], variance=case.variance[:0])):
        found = estimate_camera(*lonely, PRIOR)
        assert found.parameters.tolist() == [0.0] * 4
        assert found.support == 0.0
        assert found.evidence == pytest.approx(0.0, abs=1e-12)


def test_shrinking_equals_the_twin_and_does_what_it_says():
    case = scene(3, motion=(12.0, -5.0, 0.01, 0.005))
    found = estimate_camera(*case, PRIOR)
    wide = np.array([0.3 * found.scale, 0.3 * found.scale, 0.02, 0.02]) ** -2.0
    for precision in (wide, 100.0 * wide, 1e12 * wide):
        ours = shrink_camera(found.parameters, found.information, precision, wide)
        theirs = twin.shrink_camera(found.parameters, found.information, precision, wide)
        np.testing.assert_allclose(ours[0], theirs[0], rtol=1e-9)
        np.testing.assert_allclose(ours[1], theirs[1], rtol=1e-9)
    assert np.abs(ours[0]).max() < 1e-3
    same, _ = shrink_camera(found.parameters, found.information, wide, wide)
    np.testing.assert_allclose(same, found.parameters, rtol=1e-9)


def test_states_move_with_the_image():
    rng = np.random.default_rng(4)
    mean = rng.normal(0.0, 50.0, (10, 8))
    root = rng.normal(0.0, 1.0, (10, 8, 8))
    covariance = root @ root.transpose(0, 2, 1)
    parameters, centre = np.array([3.0, -2.0, 0.05, 0.1]), np.array([7.0, 9.0])
    wanted = warp_twin.warp_states(mean, covariance, parameters, centre)
    warp_states(mean, covariance, parameters, centre, True)
    np.testing.assert_allclose(mean, wanted[0], rtol=1e-12, atol=1e-10)
    np.testing.assert_allclose(covariance, wanted[1], rtol=1e-12, atol=1e-12)


def test_axes_kept_apart_stay_apart():
    """Equal noise in x and y: the whole transform grows by zoom² + rotation², ours by zoom²."""
    mean = np.tile(np.arange(8.0) + 1.0, (3, 1))
    covariance = np.zeros((3, 8, 8))
    for a, v in ((0, 2.0), (1, 2.0), (2, 1.0), (3, 1.0)):
        covariance[:, a, a], covariance[:, a + 4, a + 4] = v, 3.0 * v
        covariance[:, a, a + 4] = covariance[:, a + 4, a] = 0.5 * v
    parameters, centre = np.array([1.0, 1.0, 0.02, 0.01]), np.zeros(2)
    wanted = warp_twin.warp_states(mean, covariance, parameters, centre)
    warp_states(mean, covariance, parameters, centre, False)
    np.testing.assert_allclose(mean, wanted[0], rtol=1e-12)
    np.testing.assert_allclose(covariance, wanted[1], rtol=2 * 0.01**2, atol=1e-15)


def test_cholesky_equals_numpys():
    root = np.random.default_rng(5).normal(size=(6, 6))
    matrix, right = root @ root.T + np.eye(6), np.arange(6.0)
    factor = factorise(matrix)
    np.testing.assert_allclose(factor, cholesky_twin.factorise(matrix), rtol=1e-10, atol=1e-12)
    np.testing.assert_allclose(
        solve_factored(factor, right), cholesky_twin.solve_factored(factor, right), rtol=1e-9
    )
