"""One smoothing step against the textbook's matrices."""

import numpy as np
import pytest

from tests.kernels.states import random_states, relative_error
from tests.reference import smooth as twin
from tests.reference.kalman import predict_constant_velocity, transition
from tracker.kernels import smooth
from tracker.kernels.smooth import SMOOTH_OK

# Two ways to the same numbers; the inverse of a prediction loses some digits (condition 1e6).
ROUNDING = 1e-8


@pytest.fixture(params=["compiled", "plain"])
def smooth_step(request):
    kernel = smooth.smooth_step
    return kernel if request.param == "compiled" else getattr(kernel, "py_func", kernel)


def problem(seed, d, step=0.7):
    """Filtered states, their prediction, F, and something known of the next scan."""
    now = random_states(seed, 20, d)
    ahead = predict_constant_velocity(now.mean, now.covariance, step, now.density)
    later_mean = ahead[0] + np.random.default_rng(seed).normal(0.0, 1.0, now.mean.shape)
    matrices = np.repeat(transition(d, step)[None], 20, axis=0)
    return now, ahead, matrices, (later_mean, 0.3 * ahead[1])


@pytest.mark.parametrize("d", [1, 2, 4])
def test_a_step_equals_the_twin(smooth_step, d):
    now, ahead, matrices, later = problem(d, d)
    expected = twin.smooth_step(now.mean, now.covariance, *ahead, matrices, later)
    status = smooth_step(now.mean, now.covariance, *ahead, matrices, *later)
    assert status == SMOOTH_OK
    sigma = np.sqrt(np.diagonal(expected[1], axis1=1, axis2=2))
    assert np.max(np.abs(now.mean - expected[0]) / sigma) < ROUNDING
    assert relative_error(now.covariance, expected[1]) < ROUNDING
    assert np.array_equal(now.covariance, now.covariance.transpose(0, 2, 1))


def test_nothing_new_later_leaves_the_filtered_state(smooth_step):
    now, ahead, matrices, _ = problem(5, 2)
    before = now.copy()
    smooth_step(now.mean, now.covariance, *ahead, matrices, *ahead)
    assert np.allclose(now.mean, before.mean, rtol=0, atol=1e-9)
    assert relative_error(now.covariance, before.covariance) < 1e-12


@pytest.mark.parametrize("bad", [0.0, -1.0, np.nan, np.inf])
def test_a_prediction_that_is_no_covariance_is_named(smooth_step, bad):
    now, ahead, matrices, later = problem(6, 2)
    before = now.copy()
    ahead[1][3, 1, 1] = bad
    status = smooth_step(now.mean, now.covariance, *ahead, matrices, *later)
    assert status == 3
    assert np.array_equal(now.mean[3:], before.mean[3:])
    assert np.array_equal(now.covariance[3:], before.covariance[3:])


def test_no_states(smooth_step):
    empty = np.empty((0, 4)), np.empty((0, 4, 4))
    assert smooth_step(*empty, *empty, empty[1], *empty) == SMOOTH_OK
