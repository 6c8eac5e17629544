"""Random filter states and measurements for the Kalman and motion tests."""

from typing import NamedTuple

import numpy as np


class States(NamedTuple):
    """A batch of states, one measurement for each, and their noise."""

    mean: np.ndarray
    covariance: np.ndarray
    z: np.ndarray
    variance: np.ndarray
    density: np.ndarray

    def copy(self):
        return States(*(array.copy() for array in self))


def random_states(seed, n, d):
    """Fully correlated covariances whose variances differ by up to a million."""
    rng = np.random.default_rng(seed)
    root = rng.normal(0.0, 1.0, (n, 2 * d, 2 * d))
    covariance = root @ root.transpose(0, 2, 1) + 0.05 * np.eye(2 * d)
    size = 10.0 ** rng.uniform(-1.5, 1.5, (n, 2 * d))
    covariance *= size[:, :, None] * size[:, None, :]
    covariance = 0.5 * (covariance + covariance.transpose(0, 2, 1))
    mean = np.concatenate((rng.uniform(-90, 90, (n, d)), rng.normal(0, 9, (n, d))), axis=1)
    z = mean[:, :d] + rng.normal(0.0, 3.0, (n, d))
    return States(
        mean, covariance, z, 10.0 ** rng.uniform(-2, 2, (n, d)), 10.0 ** rng.uniform(-2, 2, (n, d))
    )


def relative_error(covariance, expected):
    """Largest error of (…, s, s) covariances, each element in units of √(P_aa P_bb)."""
    sigma = np.sqrt(np.diagonal(expected, axis1=-2, axis2=-1))
    return np.max(np.abs(covariance - expected) / (sigma[..., :, None] * sigma[..., None, :]))
