"""The covariance stays symmetric positive definite, whatever the settings and for how long."""

import numpy as np
import pytest
from numba import njit
from numba.core import config

from tests.kernels.states import random_states
from tests.reference import kalman as twin
from tracker.kernels.kalman import (
    UPDATE_OK,
    predict_constant_velocity,
    update_constant_velocity,
)


def affordable(steps):
    """Plain Python, which NUMBA_DISABLE_JIT=1 asks for, does not get through as many."""
    return min(steps, 300) if config.DISABLE_JIT else steps


@njit
def smallest_pivot(p):
    """Least pivot of P's correlation matrix, below 0 if P is not positive definite or symmetric."""
    lower = np.zeros_like(p)
    least = np.inf
    for a in range(len(p)):
        for b in range(a + 1):
            if p[a, b] != p[b, a] or not p[a, a] > 0.0:
                return -1.0
            value = p[a, b] / (np.sqrt(p[a, a]) * np.sqrt(p[b, b]))
            for k in range(b):
                value -= lower[a, k] * lower[b, k]
            if a != b:
                lower[a, b] = value / lower[b, b]
            elif value > 0.0:
                least = min(least, value)
                lower[a, a] = np.sqrt(value)
            else:
                return -1.0
    return least


@njit
def worst_pivot(mean, covariance, density, variance, times, seen, steps, coupled=True):
    """Run all objects through the time steps and misses, in turn; the least pivot met.

    A number of steps between checks that shares no factor with the patterns checks all phases.
    """
    pairing = np.arange(len(mean))
    z = np.zeros((len(mean), mean.shape[1] // 2))
    least = np.inf
    for k in range(steps):
        predict_constant_velocity(mean, covariance, times[k % len(times)], density, coupled)
        if seen[k % len(seen)] and (
            update_constant_velocity(mean, covariance, pairing, z, variance, coupled) != UPDATE_OK
        ):
            return -2.0
        if k < 1000 or k % 13 == 0:
            for i in range(len(mean)):
                least = min(least, smallest_pivot(covariance[i]))
            if least <= 0.0:
                return least
    return least


# (variance of the first position and speed, q, r) of each object.
EXTREMES = (
    (1.0, 1.0, 1.0, 0.01),
    (1e-16, 1.0, 1.0, 1e-16),  # hardly any measurement noise
    (1e-12, 1.0, 0.0, 1e-12),  # and none in the motion
    (1e-12, 1.0, 1e-20, 1e-12),
    (1.0, 1e8, 0.0, 1e-10),
    (1e12, 1e-12, 1e-9, 1e12),  # hardly any information
    (1e-6, 1e6, 1e-6, 1e6),
)
PATTERNS = {
    "regular": ([0.04], [True]),
    "irregular": ([0.033, 0.2, 1e-6, 0.04, 7.7], [True]),
    "long gaps": ([1000.3, 0.1, 0.01, 3e5, 0.001], [True, False]),
    "long coasts": ([0.04, 0.05], [True] * 50 + [False] * 250),
}


def extreme_states(d):
    """Each extreme with independent axes, with correlated ones, with noise mixed over axes."""
    count = len(EXTREMES)
    settings = np.array(EXTREMES)
    sigma = np.sqrt(np.repeat(settings[:, :2], d, axis=1))
    random = random_states(5, count, d).covariance
    own = np.sqrt(np.diagonal(random, axis1=1, axis2=2))
    correlation = random / (own[:, :, None] * own[:, None, :])
    independent = np.broadcast_to(np.eye(2 * d), correlation.shape)
    covariance = np.concatenate((independent, correlation, correlation))
    sigma = np.tile(sigma, (3, 1))
    covariance = covariance * (sigma[:, :, None] * sigma[:, None, :])
    covariance = 0.5 * (covariance + covariance.transpose(0, 2, 1))
    density = np.tile(np.repeat(settings[:, 2:3], d, axis=1), (3, 1))
    variance = np.tile(np.repeat(settings[:, 3:], d, axis=1), (3, 1))
    variance[-count:] *= 10.0 ** np.linspace(-3, 6, d)
    return np.zeros((3 * count, 2 * d)), covariance, density, variance


@pytest.mark.parametrize("pattern", PATTERNS)
@pytest.mark.parametrize(("d", "steps"), [(2, 1_000_000), (4, 100_000)])
def test_positive_definite_over_a_million_steps(d, steps, pattern):
    times, seen = PATTERNS[pattern]
    mean, covariance, density, variance = extreme_states(d)
    assert (
        worst_pivot(
            mean, covariance, density, variance, np.array(times), np.array(seen), affordable(steps)
        )
        > 0.0
    )
    sigma = np.sqrt(np.diagonal(covariance, axis1=1, axis2=2))
    assert np.linalg.eigvalsh(covariance / (sigma[:, :, None] * sigma[:, None, :])).min() > 0.0


def test_rounding_breaks_the_textbook_where_it_cannot_break_the_kernel():
    """A position known to 1e-6, then a coast of 1000.3 s at a speed known to 1."""
    mean, density = np.zeros((1, 2)), np.zeros((1, 1))
    start = np.diag([1e-12, 1.0])[None]
    _, textbook = twin.predict_constant_velocity(mean, start, 1000.3, density)
    assert smallest_pivot(textbook[0]) <= 0.0
    predict_constant_velocity(mean, start, 1000.3, density, False)
    assert smallest_pivot(start[0]) > 0.0


def test_many_small_steps_are_one_large_step():
    """The allowance for rounding does not add up to anything: 1.4e-14 in each of 100,000 steps."""
    steps = affordable(100_000)
    many, one = (random_states(3, 1, 2) for _ in range(2))
    unseen = np.array([False])
    times = np.array([1.0 / steps])
    worst_pivot(many.mean, many.covariance, many.density, many.variance, times, unseen, steps)
    predict_constant_velocity(one.mean, one.covariance, 1.0, one.density, True)
    np.testing.assert_allclose(many.mean, one.mean, rtol=1e-9)
    np.testing.assert_allclose(many.covariance, one.covariance, rtol=1e-8)


def test_covariances_that_die_away_do_not_become_subnormal():
    """Subnormal numbers would make an update fifty times slower, for good."""
    states = random_states(4, 6, 4)
    states.density[:] = 1.0
    states.variance[:] = 1.0
    worst_pivot(
        states.mean,
        states.covariance,
        states.density,
        states.variance,
        np.array([0.04]),
        np.array([True]),
        affordable(5_000),
    )
    size = np.abs(states.covariance)
    assert size[size > 0.0].min() > 1e-200
