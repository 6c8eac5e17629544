"""Noise levels against plain loops."""

import numpy as np
import pytest

from tests.reference import noise as twin
from tracker.kernels.noise import SIGMAS_OK, axis_squares, overwrite_variances


@pytest.mark.parametrize(("d", "scaled"), [(2, False), (4, False), (4, True)])
@pytest.mark.parametrize("columns", ["measurements", "states"])
def test_squares_equal_the_twin(d, scaled, columns):
    rng = np.random.default_rng(d)
    objects = rng.uniform(-2.0, 9.0, (50, d if columns == "measurements" else 2 * d))
    found = axis_squares(objects, d, 0.3, 0.7, scaled)
    np.testing.assert_allclose(found, twin.axis_squares(objects, d, 0.3, 0.7, scaled), rtol=1e-14)
    assert (found > 0).all()  # sides below zero included


def test_given_sigmas_replace_variances():
    rng = np.random.default_rng(1)
    variance = rng.uniform(1.0, 2.0, (30, 4))
    sigma = np.where(rng.random((30, 4)) < 0.5, np.nan, rng.uniform(0.1, 3.0, (30, 4)))
    expected = twin.overwrite_variances(variance, sigma)
    assert overwrite_variances(variance, sigma) == SIGMAS_OK
    np.testing.assert_allclose(variance, expected, rtol=1e-15)


@pytest.mark.parametrize("unusable", [0.0, -1.0, 1e-200, 1e200, np.inf])
def test_an_unusable_sigma_is_a_status(unusable):
    sigma = np.ones((5, 2))
    sigma[3, 1] = unusable
    assert overwrite_variances(np.ones((5, 2)), sigma) == 3
