"""Process noise and the gains that it leads to, against published forms and values."""

import numpy as np
import pytest
from filterpy.common import Q_discrete_white_noise
from scipy.linalg import solve_discrete_are

from tests.reference import kalman as twin
from tracker.kernels.kalman import (
    UPDATE_OK,
    predict_constant_velocity,
    update_constant_velocity,
)


def noise_of(step, density):
    """The kernel's Q: what a prediction makes of a state known exactly."""
    d = len(density)
    covariance = np.zeros((1, 2 * d, 2 * d))
    predict_constant_velocity(np.zeros((1, 2 * d)), covariance, step, np.array([density]), False)
    return covariance[0]


def discrete_noise(step):
    """[T⁴/4, T³/2; T³/2, T²]: an acceleration that is constant in each step."""
    return Q_discrete_white_noise(2, step, 1.0)


@pytest.mark.parametrize("step", [0.01, 0.3, 4.0])
def test_continuous_form(step):
    # Bar-Shalom, Li and Kirubarajan 2001, ch. 6: [T³/3, T²/2; T²/2, T] q.
    expected = 2.5 * np.array([[step**3 / 3, step**2 / 2], [step**2 / 2, step]])
    np.testing.assert_allclose(noise_of(step, [2.5]), expected, rtol=1e-13)


@pytest.mark.parametrize("step", [0.01, 0.3, 4.0])
def test_one_double_step_is_two_steps(step):
    """Q(2T) = F Q(T) Fᵀ + Q(T) for continuous noise; not for discrete noise, which we do not use.

    So a dropped frame or a jittering clock does not change the model.
    """
    f = twin.transition(1, step)
    q, double = noise_of(step, [1.0]), noise_of(2 * step, [1.0])
    np.testing.assert_allclose(f @ q @ f.T + q, double, rtol=1e-13)
    q, double = discrete_noise(step), discrete_noise(2 * step)
    assert not np.allclose(f @ q @ f.T + q, double, rtol=0.1)


def test_any_split_of_a_step_gives_the_same_prediction():
    rng = np.random.default_rng(1)
    root = rng.normal(size=(4, 4))
    start = (root @ root.T)[None]
    start = 0.5 * (start + start.transpose(0, 2, 1))
    density = np.array([[0.7, 3.0]])
    whole_mean, whole = np.array([[1.0, 2.0, -3.0, 0.5]]), start.copy()
    split_mean, split = whole_mean.copy(), start.copy()
    for step in (0.04, 0.001, 0.5, 0.259):
        predict_constant_velocity(split_mean, split, step, density, True)
    predict_constant_velocity(whole_mean, whole, 0.8, density, True)
    np.testing.assert_allclose(split_mean, whole_mean, rtol=1e-13)
    np.testing.assert_allclose(split, whole, rtol=1e-12)


def settled_gain(noise, step, sigma):
    """Gains of position and velocity once a filter with this Q has settled."""
    covariance = np.eye(2)[None].copy()
    nothing = np.zeros((1, 1))
    first = np.zeros(1, np.int64)
    for _ in range(2_000):
        mean = np.zeros((1, 2))
        predict_constant_velocity(mean, covariance, step, nothing, False)
        covariance += noise
        # From rest at 0, a measurement of 1 moves the state by the gain.
        status = update_constant_velocity(
            mean, covariance, first, np.ones((1, 1)), np.full((1, 1), sigma**2), False
        )
        assert status == UPDATE_OK
    return mean[0]


# Kalata 1984 (from memory; the formula and the Riccati equation give the same values).
@pytest.mark.parametrize(
    ("index", "alpha", "beta"),
    [
        (0.1, 0.36, 0.08),
        (0.5, 0.628373457, 0.304805898),
        (1.0, 0.75, 0.5),
        (2.0, 0.854101966, 0.763932023),
    ],
)
@pytest.mark.parametrize(("step", "sigma"), [(1.0, 1.0), (0.04, 3.0)])
def test_alpha_beta_gains_of_the_tracking_index(index, alpha, beta, step, sigma):
    """λ = σ_w T² / σ_v belongs to discrete white acceleration, so that is put in here."""
    acceleration = index * sigma / step**2
    gain = settled_gain(acceleration**2 * discrete_noise(step), step, sigma)
    assert gain[0] == pytest.approx(alpha, abs=1e-9)
    assert gain[1] * step == pytest.approx(beta, abs=1e-9)


def test_random_walk_gain_is_the_golden_ratio():
    # Scalar Riccati equation with q = r: (√5 − 1) / 2.
    covariance = np.diag([1.0, 0.0])[None].copy()
    for _ in range(100):
        mean = np.zeros((1, 2))
        covariance[0, 0, 0] += 1.0
        update_constant_velocity(
            mean, covariance, np.zeros(1, np.int64), np.ones((1, 1)), np.ones((1, 1)), False
        )
    assert mean[0, 0] == pytest.approx(0.618033989, abs=1e-9)


@pytest.mark.parametrize("d", [1, 2, 4])
def test_settles_where_the_riccati_equation_says(d):
    """With our own, continuous noise; scipy solves P = F (P − P Hᵀ S⁻¹ H P) Fᵀ + Q directly."""
    rng = np.random.default_rng(d)
    density, variance = 10.0 ** rng.uniform(-1, 1, (2, 1, d))
    step = 0.1
    covariance = np.eye(2 * d)[None].copy()
    first = np.zeros(1, np.int64)
    for _ in range(2_000):
        mean = np.zeros((1, 2 * d))
        predict_constant_velocity(mean, covariance, step, density, False)
        predicted = covariance[0].copy()
        update_constant_velocity(mean, covariance, first, np.zeros((1, d)), variance, False)
    f, h = twin.transition(d, step), np.eye(d, 2 * d)
    q = twin.process_noise(density[0], step)
    expected = solve_discrete_are(f.T, h.T, q, np.diag(variance[0]))
    np.testing.assert_allclose(predicted, expected, rtol=1e-8, atol=1e-10)
