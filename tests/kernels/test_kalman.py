"""Predict, update, d² and birth against the textbook's matrices and filterpy."""

import numpy as np
import pytest
from filterpy.common import Q_continuous_white_noise
from filterpy.kalman import KalmanFilter
from scipy.stats import multivariate_normal

from tests.kernels.states import States, random_states, relative_error
from tests.reference import kalman as twin
from tracker.kernels import kalman
from tracker.kernels.kalman import UPDATE_OK

# Two ways to the same numbers in double precision; an update shrinks variances by up to 1e5.
ROUNDING = 1e-11


class Kernels:
    """The kernels, compiled or as plain Python (which they are under NUMBA_DISABLE_JIT=1)."""

    def __init__(self, compiled):
        self.compiled = compiled

    def _kernel(self, name):
        kernel = getattr(kalman, name)
        return kernel if self.compiled else getattr(kernel, "py_func", kernel)

    def predict(self, states, step, coupled=True):
        predict = self._kernel("predict_constant_velocity")
        predict(states.mean, states.covariance, step, states.density, coupled)

    def update(self, states, pairing=None, coupled=True):
        """Each state by its own measurement, if not told otherwise."""
        pairing = np.arange(len(states.z)) if pairing is None else np.asarray(pairing)
        update = self._kernel("update_constant_velocity")
        return update(states.mean, states.covariance, pairing, states.z, states.variance, coupled)

    def distance(self, states, i, j, coupled=True):
        d = states.z.shape[1]
        distance = self._kernel("squared_mahalanobis")
        scratch = np.full((d + 2, d), np.nan)
        return distance(
            states.mean, states.covariance, i, states.z, states.variance, j, scratch, coupled
        )

    def initiate(self, states):
        n, s = states.mean.shape
        mean, covariance = np.full((n, s), np.nan), np.full((n, s, s), np.nan)
        initiate = self._kernel("initiate_constant_velocity")
        initiate(states.z, states.variance, states.density, mean, covariance)
        return mean, covariance


@pytest.fixture(params=["compiled", "plain"])
def kernels(request):
    return Kernels(request.param == "compiled")


def assert_same_states(states, mean, covariance):
    sigma = np.sqrt(np.diagonal(covariance, axis1=1, axis2=2))
    np.testing.assert_allclose(states.mean, mean, rtol=ROUNDING, atol=ROUNDING * sigma.max())
    assert relative_error(states.covariance, covariance) < ROUNDING
    assert np.array_equal(states.covariance, states.covariance.transpose(0, 2, 1))


def log_density(d2, log_determinant, d):
    """ln N(z; H x, S) = −½ (d² + ln det S + d ln 2π)."""
    return -0.5 * (d2 + log_determinant + d * np.log(2 * np.pi))


@pytest.mark.parametrize("d", [1, 2, 3, 4])
@pytest.mark.parametrize("step", [0.0, 1e-3, 0.04, 1.0, 30.0])
def test_predict_equals_the_twin(kernels, d, step):
    states = random_states(d, 40, d)
    expected = twin.predict_constant_velocity(states.mean, states.covariance, step, states.density)
    kernels.predict(states, step)
    assert_same_states(states, *expected)


@pytest.mark.parametrize("d", [1, 2, 3, 4])
def test_update_equals_the_twin(kernels, d):
    states = random_states(10 + d, 40, d)
    expected = twin.update_constant_velocity(
        states.mean, states.covariance, np.arange(40), states.z, states.variance
    )
    assert kernels.update(states) == UPDATE_OK
    assert_same_states(states, *expected)


def test_each_state_takes_the_measurement_it_is_paired_with(kernels):
    before = random_states(20, 6, 2)
    after = before.copy()
    pairing = np.array([-1, 4, -1, 0, 5, -1])
    assert kernels.update(after, pairing) == UPDATE_OK
    unpaired = pairing < 0
    assert np.array_equal(after.mean[unpaired], before.mean[unpaired])
    assert np.array_equal(after.covariance[unpaired], before.covariance[unpaired])
    expected = twin.update_constant_velocity(
        before.mean, before.covariance, pairing, after.z, after.variance
    )
    assert_same_states(after, *expected)


@pytest.mark.parametrize("d", [1, 2, 3, 4])
def test_distance_equals_the_twin_and_scipy(kernels, d):
    states = random_states(30 + d, 12, d)
    mean, covariance, z, variance, _ = states
    for i in range(12):
        normals = [
            multivariate_normal(mean[i, :d], covariance[i, :d, :d] + np.diag(r)) for r in variance
        ]
        for j in range(12):
            found = kernels.distance(states, i, j)
            expected = twin.squared_mahalanobis(mean, covariance, i, z, variance, j)
            assert found == pytest.approx(expected, rel=1e-9)
            assert log_density(*found, d) == pytest.approx(normals[j].logpdf(z[j]), rel=1e-9)


def test_log_determinant_where_the_determinant_is_no_number(kernels):
    for variance in (1e-100, 1e100):
        states = random_states(40, 1, 4)
        states.covariance[:] *= 1e-300
        states.variance[:] = variance
        assert kernels.distance(states, 0, 0)[1] == pytest.approx(4 * np.log(variance))


@pytest.mark.parametrize("d", [1, 2, 4])
def test_birth_equals_the_twin(kernels, d):
    states = random_states(50 + d, 5, d)
    expected = twin.initiate_constant_velocity(states.z, states.variance, states.density)
    for found, wanted in zip(kernels.initiate(states), expected, strict=True):
        assert np.array_equal(found, wanted)


@pytest.mark.parametrize("spoilt", [-1e9, np.nan, np.inf])
@pytest.mark.parametrize("component", [0, 3])
@pytest.mark.parametrize("coupled", [True, False])
def test_an_indefinite_innovation_is_a_status(kernels, spoilt, component, coupled):
    states = random_states(60, 6, 4)
    states.covariance[4, component, component] = spoilt
    before = states.copy()
    assert kernels.distance(states, 4, 0, coupled) == (np.inf, np.inf)
    assert kernels.update(states, coupled=coupled) == 4
    assert np.array_equal(states.mean[5], before.mean[5])


def test_nothing_to_do(kernels):
    states = random_states(70, 0, 4)
    kernels.predict(states, 1.0)
    assert kernels.update(states) == UPDATE_OK


@pytest.mark.parametrize("d", [1, 2, 4])
def test_equals_filterpy_on_irregular_steps(kernels, d):
    """A filter of another project (dense matrices, all components at once) sees the same data.

    It gets our rounding allowance too: 1.4e-14 of a variance weighs 1e5 times more where an
    update shrinks that variance by 1e5, and would drown the comparison.
    """
    n = 4
    states = random_states(80 + d, n, d)
    rng = np.random.default_rng(d)
    oracles = []
    for i in range(n):
        oracle = KalmanFilter(dim_x=2 * d, dim_z=d)
        oracle.x, oracle.P = states.mean[i].copy(), states.covariance[i].copy()
        oracle.H = np.eye(d, 2 * d)
        oracles.append(oracle)
    for _ in range(30):
        step = rng.choice([0.02, 0.04, 0.5]) * rng.uniform(0.5, 1.5)
        kernels.predict(states, step)
        for i, oracle in enumerate(oracles):
            noise = np.zeros((2 * d, 2 * d))
            for a in range(d):
                noise[a::d, a::d] = Q_continuous_white_noise(2, step, states.density[i, a])
            oracle.predict(F=twin.transition(d, step), Q=noise)
            oracle.P = oracle.P + kalman.ROUNDING_ALLOWANCE * np.diag(np.diag(oracle.P))
        order = rng.permutation(n)
        z = np.empty((n, d))
        z[order] = states.mean[:, :d] + rng.normal(0.0, 1.0, (n, d))
        measured = states._replace(z=z, variance=10.0 ** rng.uniform(-2, 2, (n, d)))
        seen = np.where(rng.random(n) < 0.7, order, -1)
        for i in np.flatnonzero(seen >= 0):
            oracles[i].update(measured.z[seen[i]], R=np.diag(measured.variance[seen[i]]))
            found = kernels.distance(measured, i, seen[i])
            assert found[0] == pytest.approx(oracles[i].mahalanobis ** 2, rel=1e-10)
            assert log_density(*found, d) == pytest.approx(oracles[i].log_likelihood, rel=1e-10)
        assert kernels.update(measured, seen) == UPDATE_OK
        mean = np.array([oracle.x for oracle in oracles])
        covariance = np.array([oracle.P for oracle in oracles])
        np.testing.assert_allclose(states.mean, mean, rtol=1e-10, atol=1e-10)
        assert relative_error(states.covariance, covariance) < 1e-10


@pytest.mark.parametrize("d", [2, 4])
@pytest.mark.parametrize("coupled", [True, False])
def test_order_and_company_do_not_change_a_bit(kernels, d, coupled):
    together = random_states(90 + d, 25, d)
    order = np.random.default_rng(d).permutation(25)
    shuffled = States(*(array[order] for array in together))
    alone = together.copy()
    singles = [States(*(array[i : i + 1] for array in alone)) for i in range(25)]
    for states in (together, shuffled, *singles):
        kernels.predict(states, 0.04, coupled)
        assert kernels.update(states, coupled=coupled) == UPDATE_OK
    for other in (alone, States(*(array[np.argsort(order)] for array in shuffled))):
        assert np.array_equal(together.mean, other.mean)
        assert np.array_equal(together.covariance, other.covariance)


@pytest.mark.parametrize("d", [1, 2, 4])
def test_uncoupled_axes_give_the_same_bits_either_way(kernels, d):
    short = random_states(95 + d, 30, d)
    short.covariance[:] *= np.tile(np.eye(d), (2, 2))
    full = short.copy()
    for step in (0.04, 0.2, 1e-3):
        for states, coupled in ((short, False), (full, True)):
            kernels.predict(states, step, coupled)
            assert kernels.update(states, coupled=coupled) == UPDATE_OK
        assert np.array_equal(short.mean, full.mean)
        assert np.array_equal(short.covariance, full.covariance)
        assert kernels.distance(short, 3, 4, coupled=False) == kernels.distance(full, 3, 4)


def test_sizes_shrink_by_half_at_most():
    states = random_states(9, 60, 4)
    mean = states.mean.copy()
    mean[:, 2:4] = np.abs(mean[:, 2:4])  # sizes before the step
    kalman.predict_constant_velocity(mean, states.covariance.copy(), 3.0, states.density, True)
    expected = twin.bound_shrinking(mean, 2, 3.0)
    assert (expected != mean).any()
    kalman.bound_shrinking(mean, 2, 3.0)
    np.testing.assert_array_equal(mean, expected)
    assert (mean[:, 2:4] > 0.0).all()
