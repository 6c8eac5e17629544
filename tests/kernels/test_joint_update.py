"""The joint update against mixtures, the textbook's PDA equations and the ordinary update."""

import numpy as np
import pytest

from tests.kernels.states import random_states, relative_error
from tests.reference import joint_update as twin
from tracker.kernels.joint_update import Mixture, joint_update
from tracker.kernels.kalman import UPDATE_OK, update_constant_velocity

DIMENSIONS = pytest.mark.parametrize("d", [2, 4])


@pytest.fixture(params=["compiled", "plain"])
def update(request):
    """The kernel, compiled or as plain Python (which it is under NUMBA_DISABLE_JIT=1)."""
    if request.param == "compiled":
        return joint_update
    return getattr(joint_update, "py_func", joint_update)


def mixture_of(alternatives):
    start = np.concatenate(([0], np.cumsum([len(options) for options in alternatives])))
    flat = [pair for options in alternatives for pair in options]
    return Mixture(
        start.astype(np.int64),
        np.array([j for j, _ in flat], np.int64),
        np.array([weight for _, weight in flat], float),
    )


def random_alternatives(rng, states):
    """Up to four detections a state, some states with none, some certain, some hopeless."""
    out = []
    for i in range(len(states.mean)):
        count = rng.integers(0, 5)
        detections = rng.choice(len(states.z), count, replace=False)
        weights = rng.dirichlet(np.full(count + 1, rng.choice([0.1, 1.0, 10.0])))[:count]
        if i % 7 == 0 and count:
            weights[:] = 0.0
            weights[0] = 1.0
        out.append(list(zip(detections, weights, strict=True)))
    return out


@DIMENSIONS
def test_equals_the_mixture(update, d):
    rng = np.random.default_rng(71)
    states = random_states(72, 60, d)
    alternatives = random_alternatives(rng, states)
    mean, covariance = twin.joint_update(
        states.mean, states.covariance, alternatives, states.z, states.variance
    )
    found = states.copy()
    status = update(
        found.mean, found.covariance, mixture_of(alternatives), states.z, states.variance
    )
    assert status == UPDATE_OK
    sigma = np.sqrt(np.diagonal(covariance, axis1=1, axis2=2))
    assert np.max(np.abs(found.mean - mean) / sigma) < 1e-9
    assert relative_error(found.covariance, covariance) < 1e-9


@DIMENSIONS
def test_covariances_stay_symmetric_and_positive_definite(d):
    """A thousand updates of each state, far detections and near ones, measured well or badly."""
    rng = np.random.default_rng(73)
    states = random_states(74, 20, d)
    mean, covariance = states.mean, states.covariance
    for _ in range(1000):
        z = mean[:, :d] + rng.normal(0.0, 5.0, (20, d))
        variance = 10.0 ** rng.uniform(-4, 4, (20, d))
        mixture = mixture_of(random_alternatives(rng, states))
        assert joint_update(mean, covariance, mixture, z, variance) == UPDATE_OK
        covariance[:, np.arange(2 * d), np.arange(2 * d)] += 0.1
    assert (covariance == covariance.transpose(0, 2, 1)).all()
    sigma = np.sqrt(np.diagonal(covariance, axis1=1, axis2=2))
    correlation = covariance / (sigma[:, :, None] * sigma[:, None, :])
    assert np.linalg.eigvalsh(correlation).min() > 0.0


@DIMENSIONS
@pytest.mark.parametrize("count", [1, 3])
def test_one_track_equals_the_textbook(update, d, count):
    """With a common R: Bar-Shalom and Li 1995, sec. 3.4.3 (from memory)."""
    rng = np.random.default_rng(75)
    for state in range(10):
        states = random_states(76 + state, 1, d)
        z = states.mean[:, :d] + rng.normal(0.0, 2.0, (count, d))
        variance = np.repeat(states.variance, count, axis=0)
        weights = rng.dirichlet(np.ones(count + 1))[:count]
        mean, covariance = twin.probabilistic_data_association(
            states.mean[0], states.covariance[0], z, np.diag(variance[0]), weights
        )
        update(states.mean, states.covariance, mixture_of([[*enumerate(weights)]]), z, variance)
        sigma = np.sqrt(np.diagonal(covariance))
        assert np.max(np.abs(states.mean[0] - mean) / sigma) < 1e-9
        assert relative_error(states.covariance[0], covariance) < 1e-9


@DIMENSIONS
def test_certainty_is_the_ordinary_update(update, d):
    states = random_states(77, 30, d)
    expected = states.copy()
    pairing = np.random.default_rng(78).permutation(30)
    pairing[::5] = -1
    update_constant_velocity(
        expected.mean, expected.covariance, pairing, states.z, states.variance, True
    )
    alternatives = [[(j, 1.0)] if j >= 0 else [] for j in pairing]
    update(states.mean, states.covariance, mixture_of(alternatives), states.z, states.variance)
    np.testing.assert_allclose(states.mean, expected.mean, rtol=1e-13, atol=1e-12)
    assert (states.covariance == expected.covariance).all()


def test_by_hand(update):
    """P = R = I, so K = ½ on positions. Detections at 2 and −2, ¼ each: the mean stays, positions
    have ½ · 1 + ½ · ½ for the mixture of covariances and ½ · 1² for the spread of means."""
    mean, covariance = np.zeros((1, 4)), np.eye(4)[None].copy()
    z = np.array([[2.0, 2.0], [-2.0, -2.0]])
    mixture = mixture_of([[(0, 0.25), (1, 0.25)]])
    assert update(mean, covariance, mixture, z, np.ones((2, 2))) == UPDATE_OK
    assert mean.tolist() == [[0.0, 0.0, 0.0, 0.0]]
    assert covariance[0].tolist() == [
        [1.25, 0.5, 0.0, 0.0],
        [0.5, 1.25, 0.0, 0.0],
        [0.0, 0.0, 1.0, 0.0],
        [0.0, 0.0, 0.0, 1.0],
    ]


def test_a_bad_innovation_covariance_is_reported(update):
    states = random_states(79, 3, 2)
    before = states.copy()
    mixture = mixture_of([[], [(0, 0.5), (1, 0.5)], [(2, 1.0)]])
    states.variance[1] = np.nan
    assert update(states.mean, states.covariance, mixture, states.z, states.variance) == 1
    assert (states.mean == before.mean).all()
    assert (states.covariance == before.covariance).all()
